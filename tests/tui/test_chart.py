"""The convergence chart and the solve log's words."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core.result import Iteration
from kingpost.tui.models.chart import Series, chart
from kingpost.tui.models.solvelog import (
    Sweeps,
    expected_factor,
    observed_factor,
    series_of,
    why_stopped,
)
from kingpost.tui.terminal import ASCII, UNICODE


def text(grid):
    return ["".join(char for char, _ in row) for row in grid]


def falling(count, factor=0.1, proven=None):
    return [
        Iteration(i, factor**i, 5 * factor**i, i * 100, i / 10, proven=proven and proven(i))
        for i in range(1, count + 1)
    ]


@pytest.mark.parametrize("glyphs", [UNICODE, ASCII])
@pytest.mark.parametrize("size", [(60, 12), (80, 8), (30, 6), (5, 2), (0, 0)])
def test_the_grid_has_the_size_asked_for(size, glyphs):
    grid = chart(series_of(falling(12), 1e-9, 100), *size, glyphs)
    assert [len(row) for row in grid] == [size[0]] * size[1]


def test_a_geometric_decay_is_a_straight_line_down():
    rows = text(chart(series_of(falling(10), None, 100), 70, 14))
    # The plot begins behind the left axis, at cell 10.
    marks = sorted((row.index("•", 10) if "•" in row else -1, y) for y, row in enumerate(rows))
    ys = [y for x, y in marks if x >= 0]
    assert ys == sorted(ys)
    assert len(ys) >= 8


def test_both_curves_the_tolerance_and_the_proven_order_are_told_apart_by_glyph():
    rows = "\n".join(
        text(chart(series_of(falling(9, proven=lambda i: 10**i), 1e-6, 10**9), 70, 20))
    )
    assert all(glyph in rows for glyph in "•○┈▁")
    assert " 1,000,0" in rows


def test_where_both_curves_meet_one_glyph_says_so():
    log = [Iteration(i, 10.0**-i, 10.0**-i, i, 0.0) for i in range(1, 6)]
    rows = "\n".join(text(chart(series_of(log, None, 10), 60, 12)))
    assert "◉" in rows
    assert "•" not in rows


def test_unknown_values_are_left_out():
    log = [Iteration(i, math.nan, math.nan, i, 0.0) for i in range(1, 4)]
    rows = "\n".join(text(chart(series_of(log, None, 10), 60, 12)))
    assert not set("•○◉") & set(rows)
    assert isinstance(series_of([], None, 10), Series)
    assert "".join(text(chart(series_of([], None, 10), 20, 5))).strip() == ""


def test_a_long_log_is_thinned_but_keeps_its_end():
    series = series_of(falling(20_000, 0.999), 1e-9, 10)
    assert len(series.sweeps) < 1_100
    assert series.sweeps[-1] == 20_000


def test_observed_factor_is_the_geometric_mean():
    assert observed_factor(falling(20, 0.7)) == pytest.approx(0.7)
    assert math.isnan(observed_factor(falling(1)))


def test_expected_factor_of_the_surfer_is_its_damping(graph, make_result):
    # Haveliwala and Kamvar 2003: the second eigenvalue is at most the damping.
    result = make_result(graph, [1] * 6, measure="surfer", damping=0.85)
    assert expected_factor(result) == (0.85, "the damping")
    katz = make_result(graph, [1] * 6, measure="katz", alpha=0.1, rho=5.0)
    assert expected_factor(katz)[0] == pytest.approx(0.5)
    assert "by hand" in why_stopped(katz)


def test_the_table_of_sweeps(graph):
    sweeps = Sweeps(falling(3, proven=lambda i: i))
    text = {column.key: [column.text(row) for row in range(3)] for column in sweeps.head}
    assert text["residual"] == ["1.0e-01", "1.0e-02", "1.0e-03"]
    assert text["factor"] == ["", "0.100", "0.100"]
    assert text["proven"] == ["1", "2", "3"]


@given(
    st.lists(
        st.tuples(
            st.integers(0, 10_000),
            st.floats(allow_nan=True, allow_infinity=True),
            st.floats(allow_nan=True, allow_infinity=True),
            st.one_of(st.none(), st.integers(0, 10**9)),
        ),
        max_size=30,
    ),
    st.integers(0, 90),
    st.integers(0, 30),
    st.sampled_from([None, 1e-10, 0.5]),
)
def test_any_log_can_be_drawn(lines, width, height, tolerance):
    log = [Iteration(i, residual, bound, i, 0.0, proven) for i, residual, bound, proven in lines]
    grid = chart(series_of(log, tolerance, 1000), width, height)
    assert [len(row) for row in grid] == [width] * height
    sweeps = Sweeps(log)
    for column in sweeps.head:
        for row in range(sweeps.count):
            assert isinstance(column.text(row), str)
    observed_factor(log)
