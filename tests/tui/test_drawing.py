"""Fitting text into cells, bars, rulers.  Widths are those of Unicode's East Asian Width table
(UAX 11), as implemented by the wcwidth package where it is at hand."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from kingpost.core.text import visible
from kingpost.tui.models.drawing import bar, cut, fit, ruler, tame, wrap
from kingpost.tui.terminal import ASCII, UNICODE


@given(st.text(max_size=60), st.integers(0, 40), st.booleans(), st.sampled_from([UNICODE, ASCII]))
def test_fit_takes_exactly_its_width(text, width, right, glyphs):
    assert cell_len(fit(visible(text), width, right, glyphs)) == width


@pytest.mark.parametrize(
    ("text", "cells"), [("abc", 3), ("日本", 4), ("é", 1), ("🚢", 2), ("ｆ", 2), ("", 0)]
)
def test_widths_agree_with_wcwidth(text, cells):
    wcwidth = pytest.importorskip("wcwidth")
    assert wcwidth.wcswidth(text) == cells == cell_len(tame(text))


def test_a_wide_character_is_not_cut_in_half():
    assert fit("日本語", 5) == "日本…"
    assert fit("日本語", 4) == "日… "
    assert cut("日本", 3) == "日"


def test_piled_marks_are_limited():
    assert len(tame("a" + "́" * 500 + "b")) <= 4


def test_ascii_writes_other_characters_out():
    assert tame("Kai-Straße", ASCII) == "Kai-Stra\\xdfe"
    assert fit("long name", 6, glyphs=ASCII) == "long ~"


def test_bar_grows_with_the_share_and_shows_the_least():
    lengths = [len(bar(share / 64, 8)) for share in range(1, 65)]
    assert lengths == sorted(lengths)
    assert bar(1.0, 8) == "████████"
    assert bar(1e-9, 8) == "▏"
    assert bar(0.0, 8) == bar(float("nan"), 8) == ""
    assert bar(0.5, 8, ASCII) == "####"


def test_ruler_is_logarithmic():
    marks = ruler({"A": 1, "B": 100, "C": 10_000}, 10_000, 21)
    assert (marks[0], marks[10], marks[20]) == ("A", "B", "C")
    assert set(marks) == {"A", "B", "C", "·"}


@given(
    st.dictionaries(st.sampled_from("DEKSHV"), st.integers(1, 1000), max_size=6),
    st.integers(1, 60),
)
def test_every_letter_stands_on_the_ruler_once(ranks, width):
    marks = ruler(ranks, 1000, width)
    assert len(marks) == max(width, len(ranks))
    assert sorted(marks.replace("·", "")) == sorted(ranks)


@given(st.text(alphabet="ab 日", max_size=80), st.integers(2, 20))
def test_wrap_keeps_every_letter_and_no_line_is_too_long(text, width):
    lines = wrap(text, width)
    assert "".join(lines).replace(" ", "") == text.replace(" ", "")
    assert all(cell_len(line) <= width for line in lines)
