"""The standings: order, filter, find, rail, against plain Python over the same rows."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core.errors import SettingsError
from kingpost.core.standing import OPEN, PROVEN, TIED
from kingpost.tui.models.standings import Found, arrange, prepare, search

SCORES = [0.1, 0.4, 0.9, 0.4, 0.2, 0.1]


@pytest.fixture
def table(graph, make_result):
    other = make_result(graph, [6, 5, 4, 3, 2, 1], measure="mirror")
    return prepare(graph, make_result(graph, SCORES), [other])


def names(table, arrangement):
    return [table.graph.label(int(node)) for node in arrangement.rows]


def test_ranked_by_score_then_by_id(table):
    assert names(table, table.arrangement) == ["gate", "fare", "kiosk", "quay", "berth", "ticket"]


def test_columns_in_order(table):
    assert [column.key for column in table.head] == [
        "rank", "node", "score", "rank:mirror", "in", "out", "attribute:team", "attribute:tier",
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("key", "turned", "expected"),
    [
        ("node", False, ["berth", "fare", "gate", "kiosk", "quay", "ticket"]),
        ("node", True, ["ticket", "quay", "kiosk", "gate", "fare", "berth"]),
        ("rank", True, ["ticket", "berth", "quay", "kiosk", "fare", "gate"]),
        ("rank:mirror", False, ["berth", "fare", "gate", "kiosk", "quay", "ticket"]),
        # In-degrees 1 2 4 1 0 0; equal ones in the order of the standing.
        ("in", False, ["gate", "fare", "kiosk", "berth", "quay", "ticket"]),
        # Nulls stand last whichever way the column is turned.
        ("attribute:team", False, ["ticket", "gate", "quay", "kiosk", "berth", "fare"]),
        ("attribute:team", True, ["kiosk", "berth", "gate", "quay", "ticket", "fare"]),
        ("attribute:tier", False, ["berth", "gate", "ticket", "fare", "quay", "kiosk"]),
    ],
)
def test_sorting(table, key, turned, expected):
    assert names(table, arrange(table, key, turned)) == expected


def test_the_line_stands_under_what_is_proven(graph, make_result):
    every = prepare(graph, make_result(graph, [6, 5, 4, 3, 2, 1]))
    assert every.result.standing.proven == 6
    assert every.settled == -1
    some = prepare(graph, make_result(graph, [6, 5, 4.001, 4, 2, 1], error=0.01))
    assert some.result.standing.proven == 2
    assert some.settled == 1
    some.adopt(arrange(some, "rank", True))
    assert some.settled == -1
    some.adopt(arrange(some, "rank", where="node ilike '%E%'"))
    assert some.settled == -1


def test_filter_keeps_the_order(table):
    arranged = arrange(table, "rank", where="node ilike '%E%'")
    assert names(table, arranged) == ["gate", "fare", "berth", "ticket"]
    table.adopt(arranged)
    assert table.row_of(3) is None
    assert table.count == 4


def test_the_cursor_follows_its_node(table):
    table.cursor = 3
    node = table.node
    table.adopt(arrange(table, "node"))
    assert table.node == node == 4
    table.adopt(arrange(table, "node", where="false"))
    assert table.node is None


def test_find_goes_round(table):
    found = search(table, table.arrangement, "k")
    assert [table.graph.label(table.item(int(row))) for row in found.rows] == ["kiosk", "ticket"]
    assert found.after(2) == 5
    assert found.after(5) == 2
    assert found.before(2) == 5
    assert found.holds(2)
    assert not found.holds(3)
    assert found.place(5) == 2
    assert Found("x", np.empty(0, np.int64)).after(0) is None


def test_rail_of_the_standing(table):
    # The two at 0.4 are equal under an exact bound, so are the two at 0.1.
    assert [table.rail(row) for row in range(6)] == [PROVEN, TIED, PROVEN, PROVEN, TIED, PROVEN]


def test_ranks_as_ranges(table):
    rank = table.head[0]
    assert [rank.text(table.item(row)) for row in range(6)] == [
        "1",
        "2-3",
        "2-3",
        "4",
        "5-6",
        "5-6",
    ]


@given(
    st.lists(st.integers(0, 4), min_size=2, max_size=12), st.randoms(), st.sampled_from([0, 0.6])
)
def test_rail_in_any_arrangement_says_what_the_intervals_say(
    make_graph, make_result, scores, random, error
):
    graph = make_graph([f"n{i:02d}" for i in range(len(scores))], [])
    table = prepare(graph, make_result(graph, scores, error=error))
    rows = list(range(len(scores)))
    random.shuffle(rows)
    arrangement = table.arrangement
    table.arrangement = type(arrangement)(np.array(rows), arrangement.row_of)
    position = table.result.standing.position
    for row in range(len(rows) - 1):
        a, b = sorted((rows[row], rows[row + 1]), key=lambda node: position[node])
        if table.rail(row) == PROVEN:
            assert scores[a] - error > scores[b] + error
        elif table.rail(row) == TIED:
            assert scores[a] == scores[b]
        elif table.rail(row) == OPEN:
            assert error > 0


def test_wishes_survive_a_new_result(graph, make_result, table):
    table.adopt(arrange(table, "in", where="node like '%t%'"))
    table.cursor = 1
    fresh = prepare(graph, make_result(graph, SCORES[::-1]), after=table)
    assert (fresh.arrangement.sort, fresh.arrangement.where) == ("in", "node like '%t%'")
    assert fresh.node == table.node


@pytest.mark.parametrize(
    ("where", "expected"),
    [
        ("rank <= 2", ["gate", "fare", "kiosk"]),  # the two at rank 2-3 may both be second
        ("plain_rank = 1 or plain_score = 0.2", ["gate", "quay"]),
        ("mirror_rank < 3", ["fare", "berth"]),
        # In-degrees 1 2 4 1 0 0, out-degrees 2 1 1 1 2 1.
        ("in_degree = 0", ["quay", "ticket"]),
        ("in_degree > out_degree", ["gate", "fare"]),
        ("team = 'red' and tier is not null", ["berth"]),
        ("score > mirror_score", []),
    ],
)
def test_conditions_over_ranks_scores_degrees_and_attributes(table, where, expected):
    assert names(table, arrange(table, "rank", where=where)) == expected


def test_a_condition_sorts_and_filters_at_once(table):
    arranged = arrange(table, "node", where="tier >= 1")
    assert names(table, arranged) == ["berth", "fare", "gate", "quay", "ticket"]


def test_what_a_name_or_an_unsolved_measure_is_told(table):
    with pytest.raises(SettingsError, match=r"for names: node like '%quay%'"):
        arrange(table, "rank", where="quay")
    with pytest.raises(SettingsError, match="katz is not solved yet"):
        arrange(table, "rank", where="katz_rank < 4")


def test_attributes_that_take_a_column_s_name_stay_reachable(make_graph, make_result):
    graph = make_graph(["a", "b"], [(0, 1, 1.0)], {"rank": ["low", "high"], "In_Degree": [7, 8]})
    table = prepare(graph, make_result(graph, [1.0, 2.0]))
    assert names(table, arrange(table, "rank", where="attribute_rank = 'low'")) == ["a"]
    assert names(table, arrange(table, "rank", where="attribute_in_degree = 8")) == ["b"]
    assert names(table, arrange(table, "rank", where="rank = 1")) == ["b"]
