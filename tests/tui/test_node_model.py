"""The node view's model and the way walked."""

from __future__ import annotations

import pytest

from kingpost.tui.models.node import Trail, centre


def test_feeders_by_share_with_their_running_sum(graph, make_result):
    result = make_result(graph, graph.inward.strengths(), measure="degree")
    model = centre(graph, result, 2)
    feeders = model.feeders
    assert [graph.label(feeders.node(row)) for row in range(feeders.count)] == [
        "kiosk", "fare", "berth", "quay",
    ]  # fmt: skip
    text = {column.key: [column.text(row) for row in range(4)] for column in feeders.head}
    assert text["share"] == ["50%", "25%", "17%", "8%"]
    assert text["cum"] == ["50%", "75%", "92%", "100%"]
    assert text["weight"] == ["6", "3", "2", "1"]
    assert text["rank"][0] == "4"  # in-strengths 2 9 12 1 0 0: kiosk is fourth
    assert model.given.parts == pytest.approx({"feeders": 1.0})


def test_receivers_by_share_of_what_is_given_away(graph, make_result):
    model = centre(graph, make_result(graph, [1] * 6), 4)
    receivers = model.receivers
    assert [graph.label(receivers.node(row)) for row in range(receivers.count)] == ["fare", "gate"]
    share = next(column for column in receivers.head if column.key == "share")
    assert [share.text(0), share.text(1)] == ["83%", "17%"]


def test_a_node_without_neighbours(make_graph, make_result):
    graph = make_graph(["alone", "other"], [])
    model = centre(graph, make_result(graph, [1, 1]), 0)
    assert model.feeders.count == model.receivers.count == 0


def test_trail_goes_back_and_forth():
    trail = Trail()
    for node in (4, 7, 2):
        trail.walk(node)
    assert (trail.back(), trail.back(), trail.back()) == (7, 4, None)
    assert (trail.on(), trail.before) == (7, [4])
    trail.walk(9)
    assert trail.on() is None
    assert trail.nodes == [4, 7, 9]
    trail.walk(9)
    assert trail.nodes == [4, 7, 9]
