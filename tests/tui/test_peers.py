"""Columns of ranks and scores among peers."""

from __future__ import annotations

import numpy as np

from kingpost.tui.models import peers
from kingpost.tui.models.standings import arrange, prepare

SCORES = [6.0, 5.0, 4.0, 3.0, 2.0, 1.0]
# team: red, none, blue, red, blue, amber
BY_TEAM = {0: ("1", "+1.00"), 2: ("1", "+1.00"), 3: ("2", "-1.00"), 4: ("2", "-1.00")}


def test_each_is_compared_with_those_of_its_team(graph, make_result):
    found, words = peers.peers_of(graph, make_result(graph, SCORES), "team")
    rank, z = peers.peers_columns(found)
    assert (rank.title, z.title) == ("in team", "z")
    # Two peers are always one deviation above and below their mean.
    told = {node: (rank.text(node), z.text(node)) for node in range(6)}
    assert {node: told[node] for node in BY_TEAM} == BY_TEAM
    assert told[1] == ("-", "-")  # without a team
    assert told[5][1] == "-"  # alone in its team
    assert "arXiv 1509.01476" in words
    assert "1 without a value" in words


def test_they_sort_with_the_valueless_last(graph, make_result):
    result = make_result(graph, SCORES)
    found, _ = peers.peers_of(graph, result, "team")
    table = prepare(graph, result, more=peers.peers_columns(found))
    assert [column.title for column in table.head][:5] == ["rank", "node", "plain", "in team", "z"]
    made = arrange(table, "peers:z")
    assert made.rows[:4].tolist() == [0, 2, 3, 4]
    assert set(made.rows[4:].tolist()) == {1, 5}
    assert np.isnan(table.column("peers:rank").keys()[1])


def test_what_cannot_be_grouped_by_is_a_sentence(graph, make_result):
    found, words = peers.peers_of(graph, make_result(graph, SCORES), "year")
    assert found is None
    assert words.startswith("not rescaled among peers: year: no node attribute is called so")
    assert "--" not in words


def test_attributes_offered(graph, make_graph):
    assert peers.attributes_of(graph) == [
        ("team", "nodes of the same value"),
        ("tier", "nodes near in it"),
    ]
    assert peers.attributes_of(make_graph(["a"], [])) == []
