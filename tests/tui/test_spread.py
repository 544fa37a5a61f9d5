"""The histogram of scores and the choice of columns, without a screen."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.tui.models.columns import Column
from kingpost.tui.models.headings import Choice, choice_of, shown
from kingpost.tui.models.spread import FINE, spread_of
from kingpost.tui.terminal import ASCII, UNICODE


@pytest.fixture
def spread(graph, make_result):
    return lambda scores: spread_of(make_result(graph, scores))


def test_counts_by_the_logarithm(spread):
    # Powers of ten stand at equal distances: thirds of the line.
    found = spread([1e-3, 1e-2, 1e-2, 1e-1, 1.0, 0.0])
    assert (found.low, found.high, found.zeros) == (1e-3, 1.0, 1)
    assert found.counts.sum() == 5
    assert [found.cell(10.0**-k, 30) for k in (3, 1.5, 0)] == [0, 15, 29]
    bars = found.bars(30)
    assert bars[0] == bars[29]
    assert bars[10] == "█"
    assert bars[1:9].isspace()
    assert found.bars(30, ASCII).isascii()


def test_no_score_at_all(spread):
    for scores in ([0.0, 0.0], [math.nan, math.nan]):
        found = spread(scores)
        assert found.zeros == 2
        assert found.cell(0.0) is None
        assert found.cell(1.0) is None


@given(st.lists(st.floats(1e-300, 1e300), min_size=1, max_size=40), st.integers(1, 60))
def test_every_positive_score_is_counted_where_it_is_found(make_graph, make_result, scores, width):
    found = spread_of(make_result(make_graph(["a"], []), scores))
    assert found.counts.sum() == len(scores)
    assert len(found.counts) == FINE
    bars = found.bars(width)
    assert len(bars) == width
    for score in scores:
        assert 0 <= found.cell(score, width) < width
    highest = found.cell(max(scores), width)
    assert bars[highest] in UNICODE.levels


def columns(*keys, optional=()):
    return [
        Column(key, key, 4, str, frozen=key == "node", optional=key in optional) for key in keys
    ]


def test_the_frozen_stand_first_and_optional_ones_wait_to_be_chosen():
    every = columns("node", "a", "b", "c", optional=("b",))
    assert [column.key for column in shown(every)] == ["node", "a", "c"]
    choice = choice_of(every).switched("b").moved("c", -2)
    assert [column.key for column in shown(every, choice)] == ["node", "c", "a", "b"]


def test_a_choice_survives_columns_that_go_and_come():
    choice = choice_of(columns("node", "a", "b", "c")).switched("a").moved("c", -1)
    fewer = columns("node", "b", "d")
    later = choice_of(fewer, choice)
    assert [column.key for column in shown(fewer, later)] == ["node", "b", "d"]
    every = columns("node", "a", "b", "c", "d")
    assert [column.key for column in shown(every, later)] == ["node", "c", "b", "d"]


@given(st.permutations("abcd"), st.sampled_from("abcd"), st.integers(-6, 6))
def test_moving_keeps_every_column(order, key, step):
    moved = Choice(tuple(order)).moved(key, step)
    assert sorted(moved.order) == sorted(order)
    at = list(order).index(key)
    assert moved.order.index(key) == np.clip(at + step, 0, 3)
