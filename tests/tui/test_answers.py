"""Answers on the screen, as models: agreement and its scatter, why, one node against another."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import kendalltau, spearmanr

from kingpost.core.errors import SettingsError
from kingpost.core.insight.agree import agree
from kingpost.core.measures import measure
from kingpost.core.watch import Watch
from kingpost.tui.models import agreement, whys
from kingpost.tui.models.answers import NOWHERE
from kingpost.tui.terminal import ASCII

FIRST = [6.0, 5.0, 4.0, 3.0, 2.0, 1.0]
SECOND = [5.0, 6.0, 4.0, 1.0, 2.0, 3.0]


def solved(graph, name, **settings):
    chosen = measure(name)
    return chosen.rank(graph, chosen.settings(**settings), Watch())


def cells(page, row):
    return [column.text(row) for column in page.listing.head]


def lines(grid):
    return ["".join(char for char, _ in row) for row in grid]


@pytest.fixture
def two(graph, make_result):
    results = {
        "first": make_result(graph, FIRST, measure="first"),
        "second": make_result(graph, SECOND, measure="second"),
    }
    return agreement.compared(graph, results)


def test_a_scatter_counts_every_node_once_where_its_ranks_are(make_graph, make_result):
    # 300 nodes on the diagonal but for the first and the last, which change places.
    graph = make_graph([f"n{i:03}" for i in range(300)], [])
    scores = np.arange(300.0, 0.0, -1.0)
    other = scores.copy()
    other[[0, 299]] = other[[299, 0]]
    found = agree(graph, {"a": make_result(graph, scores), "b": make_result(graph, other)})
    drawn = agreement.scatter(found, "a", "b")
    assert drawn.counts.sum() == 300
    assert drawn.counts[agreement.FINE - 1, 0] == 1  # rank 1 across, rank 300 down
    assert drawn.counts[0, agreement.FINE - 1] == 1
    rest = drawn.counts.copy()
    rest[agreement.FINE - 1, 0] = rest[0, agreement.FINE - 1] = 0
    assert not (rest - np.diag(np.diag(rest))).any()
    assert agreement.merged(drawn.counts, 40, 10).sum() == 300
    grid = lines(agreement.scatter_chart(drawn, (1.0, 300.0), 50, 14, ASCII))
    assert len(grid) == 14
    assert {len(line) for line in grid} == {50}
    assert grid[0][8] == " "  # nobody is first in both
    assert grid[0][49] == "."
    assert grid[10][8] == "^"  # the node that is marked
    assert grid[12].split() == ["1", "10", "100", "300"]


def test_glyphs_of_density_go_up_with_the_logarithm():
    shown = [agreement.density(count, 100_000, ASCII) for count in (0, 1, 10, 100, 10_000, 100_000)]
    assert shown == [" ", ".", ":", "+", "#", "#"]
    assert agreement.density(1, 1, ASCII) == "."
    assert agreement.density_words(100_000, ASCII) == ". 1+  : 10+  + 100+  % 1.00k+  # 10.0k+"
    assert agreement.density_words(1, ASCII) == ". 1+"


@pytest.mark.parametrize("size", [(0, 0), (10, 3), (80, 2)])
def test_no_room_for_a_scatter(two, size):
    grid = agreement.scatter_chart(two.drawn, None, *size)
    assert [len(row) for row in grid] == [size[0]] * size[1]


def test_the_matrix_has_the_coefficients_scipy_has(two):
    page = agreement.agreement_answer(two).pages[1]
    rows = [cells(page, row) for row in range(page.listing.count)]
    tau, rho = kendalltau(FIRST, SECOND).statistic, spearmanr(FIRST, SECOND).statistic
    assert rows[1] == ["first", ".", f"{rho:.4f}"]
    assert rows[2] == ["second", f"{tau:.4f}", "."]
    assert rows[4][0] == "overlap, first 6"
    assert rows[5] == ["first", ".", "1.0000"]  # all six nodes are among the first six of both
    assert page.listing.node(1) == NOWHERE


def test_nodes_apart_with_ranks_and_reasons(two):
    page = agreement.agreement_answer(two).pages[0]
    # Ranks 1..6 against 2 1 3 6 5 4: quotients 2, 2, 1, 1.5, 1, 1.5.
    assert [cells(page, row) for row in range(page.listing.count)] == [
        ["berth", "2.0x", "1", "2"],
        ["fare", "2.0x", "2", "1"],
        ["kiosk", "1.5x", "4", "6"],
        ["ticket", "1.5x", "6", "4"],
    ]
    assert page.words(0) == "berth: first 1, second 2. 1 node points at it (rank 3 by that count)"
    assert "^" in "".join(lines(page.draw(40, 12, ASCII, 0)))


def test_ties_throughout_are_no_number(graph, make_result):
    results = {
        "level": make_result(graph, [1.0] * 6, measure="level"),
        "first": make_result(graph, FIRST, measure="first"),
        "second": make_result(graph, SECOND, measure="second"),
    }
    found = agreement.compared(graph, results)
    assert (found.drawn.across, found.drawn.down) == ("first", "second")
    assert agreement.couples(found.agreement)[0][2].startswith("tau-b -,")


def test_agreement_takes_two(graph, make_result):
    with pytest.raises(SettingsError, match="takes two measures"):
        agreement.compared(graph, {"first": make_result(graph, FIRST)})


@pytest.mark.parametrize("name", ["surfer", "katz", "degree"])
def test_terms_shown_sum_to_the_score(graph, name):
    result = solved(graph, name)
    for node in range(graph.n):
        page = whys.why_answer(graph, result, node).pages[0]
        if not page.listing.count:
            continue
        last = cells(page, page.listing.count - 1)
        assert last[3] == "100%"  # of the score, added up
        shares = [float(cells(page, row)[2].strip("<%")) for row in range(page.listing.count)]
        assert shares == sorted(shares, reverse=True)
        fed = [page.listing.node(row) for row in range(page.listing.count)]
        assert sorted(n for n in fed if n >= 0) == sorted(graph.inward.row(node)[0].tolist())


def test_why_in_words_and_paths(graph):
    result = solved(graph, "surfer", damping=0.85)
    answer = whys.why_answer(graph, result, 3)  # kiosk, fed by gate alone
    terms, paths = answer.pages
    assert answer.head == "why kiosk has its surfer score"
    assert terms.words(0).startswith("rank 2 of 6, score 0.3")
    assert "feeders 9" in terms.words(0)
    assert "The terms sum to the score but for" in terms.words(0)
    assert cells(terms, 0)[0] == "gate"
    assert cells(terms, 1)[0] == "(jumps that land here)"
    assert terms.listing.node(1) == NOWHERE
    assert all("gate > kiosk" in cells(paths, row)[2] for row in range(paths.listing.count))


def test_one_against_another_adds_up(graph):
    result = solved(graph, "katz")
    answer = whys.than_answer(graph, result, 2, 0)  # gate against berth
    page, words = answer.pages
    assert page.words(0).startswith("gate (rank 1) and berth (rank 4): gate leads by")
    parts = [float(cells(page, row)[4].strip("%")) for row in range(page.listing.count)]
    assert sum(parts) == pytest.approx(100, abs=3)  # each is rounded
    assert words.rows[0].text == page.words(0)
    other = whys.than_answer(graph, result, 0, 2).pages[0]
    assert cells(other, 0)[3] == cells(page, 0)[3]  # the difference is for the one ahead


def test_a_measure_without_terms_is_refused(graph, make_result):
    with pytest.raises(SettingsError, match="terms of plain are not known"):
        whys.why_answer(graph, make_result(graph, FIRST), 0)
