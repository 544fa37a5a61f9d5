"""What is meant to be read: tables and Markdown."""

from __future__ import annotations

import math
import re
from collections.abc import Callable

import numpy as np
import pyarrow as pa
import pytest
from handmade import HOSTILE, make_graph, make_result
from markdown_it import MarkdownIt

from kingpost.core.export.cells import cut, plain_ascii, width, wrap
from kingpost.core.export.digits import on_the_point, score_texts, small
from kingpost.core.export.layout import escaped
from kingpost.core.export.rows import Ranking
from kingpost.core.export.table import markdown, table
from kingpost.core.result import Bound, BoundKind
from kingpost.core.text import visible

SNAPSHOT = """\
calls.parquet  5 nodes  4 edges  score flows along caller -> callee
made  tol=1e-10, stop=bound, max-sweeps=10000  weight: load
converged: the bound fell below what was asked for
error at most 0.001 of the sum of the scores (componentwise: a bound for each
  score by itself)
order proven to 1 of 5
conventions  dangling: no node is
────────────────────────────────────────────────────────────────────────────────
   rank  node   made  in  out  team      seats
┃     1  b     0.50    0    1  boats         1
╎   2-3  a     0.200   4    0  pier        1.5
┃   2-3  c     0.200   0    1
=   4-5  d     0       0    1  [b]x[/b]    400
┃   4-5  e     0       0    1  \\e[31m        5
────────────────────────────────────────────────────────────────────────────────
┃ proven above the next  ╎ not proven yet  = tied  blank: not told from zero
"""


@pytest.fixture
def small_ranking() -> Ranking:
    extra = pa.table(
        {
            "team": ["pier", "boats", None, "[b]x[/b]", "\x1b[31m"],
            "seats": [1.5, 1, None, 400, 5],
        }
    )
    graph = make_graph(pa.array(list("abcde")), [(i, 0) for i in range(1, 5)], None, extra)
    result = make_result(
        [0.2, 0.5, 0.2, 0, 0],
        bound=Bound(BoundKind.COMPONENTWISE, 1e-3, relative=2e-3),
        exact_zero=np.array([False, False, False, True, True]),
    )
    return Ranking(graph, result)


def test_table_at_80_columns(small_ranking: Ranking) -> None:
    assert table(small_ranking, 80) == SNAPSHOT


def test_table_in_ascii_has_nothing_else(small_ranking: Ranking) -> None:
    text = table(small_ranking, 80, ascii_only=True)
    assert text.isascii()
    assert text.count("\n") == SNAPSHOT.count("\n")
    assert "\n|     1  b" in text
    assert "\n:   2-3  a" in text


@pytest.mark.parametrize("columns", [40, 60, 80, 200])
def test_table_never_outgrows_its_width(hostile: Ranking, columns: int) -> None:
    for line in table(hostile, columns).splitlines():
        assert width(line) <= columns


def test_table_of_hostile_names_is_inert(hostile: Ranking) -> None:
    for text in (table(hostile, 120), markdown(hostile)):
        assert "\x1b" not in text
        assert "\N{RIGHT-TO-LEFT OVERRIDE}" not in text
        assert all(char.isprintable() for char in text.replace("\n", ""))


def test_table_says_what_it_leaves_out(ranking: Callable[..., Ranking]) -> None:
    text = table(ranking([5.0, 4.0, 3.0, 2.0], top=2), 80)
    assert "2 more below" in text
    assert " c " not in text


@pytest.mark.parametrize("name", HOSTILE)
def test_markdown_reads_as_the_visible_name(name: str) -> None:
    # Rendered by markdown-it-py, a CommonMark implementation, with GFM tables and autolinks.
    # Characters a renderer normalises (blanks at the ends) are compared stripped.
    graph = make_graph(pa.array([name]), [])
    html = MarkdownIt("gfm-like").render(markdown(Ranking(graph, make_result([1.0]))))
    cells = re.findall(r"<t[dh].*?>(.*?)</t[dh]>", html)
    assert len(cells) == 12
    shown = visible(name, 200) or '""'
    plain = shown.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    assert cells[8] == plain.replace('"', "&quot;").strip()


@pytest.mark.parametrize(
    "text", ["http://example.org/a", "www.example.org", "me@example.org", "&lt;b&gt;", "a&b"]
)
def test_markdown_makes_no_links_or_entities_of_data(text: str) -> None:
    html = MarkdownIt("gfm-like").render(escaped(text))
    assert "<a" not in html
    assert html == "<p>" + text.replace("&", "&amp;") + "</p>\n"


def texts(scores: list[float], error: float) -> list[str]:
    values = np.array(scores)
    return score_texts(values, values - error, values + error)


def test_exact_whole_numbers_read_as_counts() -> None:
    assert texts([1234567, 12, 0], 0.0) == ["1,234,567", "12", "0"]


def test_digits_stop_where_the_bound_does() -> None:
    assert texts([0.123456789], 3e-4) == ["0.123"]
    assert texts([0.123456789], 1e-12) == ["0.1234568"]
    assert texts([123456.0], 40.0) == ["123,500"]
    assert texts([0.2], 0.15) == ["~0.2"]
    assert texts([1.5], math.inf) == ["~1.5"]
    assert texts([1.23456789e-7], 1e-12) == ["1.2346e-07"]
    assert texts([math.nan, 1.0], 0.25) == ["-", "1"]


def test_last_digit_printed_is_off_by_at_most_one() -> None:
    rng = np.random.default_rng(3)
    for _ in range(400):
        score = rng.random() * 10.0 ** rng.integers(-6, 8)
        error = score * 10.0 ** -rng.uniform(0.5, 9)
        text = texts([score], error)[0].replace(",", "")
        if text.startswith("~"):
            continue
        mantissa, _, power = text.partition("e")
        decimals = len(mantissa.partition(".")[2])
        trailing = len(mantissa) - len(mantissa.rstrip("0")) if "." not in mantissa else 0
        unit = 10.0 ** (int(power or 0) - decimals + trailing)
        worst = abs(float(text) - score) + error
        assert worst <= unit * (1 + 1e-9), (score, error, text)


def test_points_stand_under_each_other() -> None:
    assert on_the_point(["1.25", "10", "0.125"]) == [" 1.25 ", "10    ", " 0.125"]


def test_bounds_are_rounded_up() -> None:
    assert small(1.01e-11) == "1.1e-11"
    assert small(1e-10) == "1.0e-10"
    assert small(0.0) == "0"
    assert small(math.inf) == "none known"
    assert small(math.nan) == "unknown"


def test_widths_of_wide_and_combining_characters() -> None:
    # Unicode Standard Annex 11: CJK ideographs are wide, combining marks take no room.
    assert width("\N{CJK UNIFIED IDEOGRAPH-6E2F}a") == 3
    assert width("e\N{COMBINING ACUTE ACCENT}") == 1
    assert cut("\N{CJK UNIFIED IDEOGRAPH-6E2F}" * 3, 4) == "\N{CJK UNIFIED IDEOGRAPH-6E2F}…"
    assert wrap("one two three", 7, "  ") == ["one two", "  three"]
    assert plain_ascii("\N{LATIN SMALL LETTER E WITH ACUTE}…") == "\\u{e9}~"
