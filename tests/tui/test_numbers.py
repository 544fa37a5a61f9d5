"""Numbers as written: digits follow the bound."""

from __future__ import annotations

import numpy as np
import pytest

from kingpost.core.result import Bound, BoundKind
from kingpost.tui.models.numbers import compact, percent, rank_range, score_format, small


def bound(error: float) -> Bound:
    return Bound(BoundKind.COMPONENTWISE, error, absolute=error)


@pytest.mark.parametrize(
    ("number", "text"),
    [(0, "0"), (950, "950"), (12_345, "12.3k"), (4_990_000, "4.99M"), (7.5e9, "7.50G")],
)
def test_compact(number, text):
    assert compact(number) == text


def test_percent():
    assert [percent(x) for x in (0.314, 0.001, 0.0, float("nan"))] == ["31%", "<1%", "0%", "-"]


def test_rank_ranges_shrink_to_their_column():
    assert rank_range(4, 4) == "4"
    assert rank_range(4, 9) == "4-9"
    assert rank_range(1_234_567, 2_345_678, 11) == "1.23M-2.35M"


def test_no_more_decimals_than_the_bound_justifies():
    scores = np.array([0.5, 0.3, 0.2])
    assert score_format(scores, bound(1e-12)).text(0.3) == "0.300"
    assert score_format(scores, bound(0.004)).text(0.3) == "0.30"
    rough = score_format(scores, bound(0.2))
    assert (rough.text(0.3), rough.unit) == ("0.30", " ~")


def test_tiny_scores_take_out_a_power_of_a_thousand():
    form = score_format(np.array([3.21e-7, 2.5e-7, 1e-7]), bound(1e-15))
    assert form.unit == " 1e-9"
    assert form.text(3.21e-7) == "321"


def test_whole_scores_have_no_decimals():
    form = score_format(np.array([12_345.0, 7.0, 0.0]), bound(0.0))
    assert [form.text(x) for x in (12_345.0, 0.0)] == ["12,345", "0"]


def test_what_is_not_known_is_a_dash():
    assert small(float("nan")) == "-"
    assert score_format(np.array([np.nan]), bound(0)).text(float("nan")) == "-"


def test_steep_scores_carry_their_own_power():
    form = score_format(np.array([0.7, 1e-9, 2e-9, 3e-9]), bound(1e-15))
    assert [form.text(x) for x in (0.7, 2e-9)] == ["7.00e-01", "2.00e-09"]
    assert form.unit == ""
