"""Shortest ways against networkx's own breadth-first search."""

from __future__ import annotations

import networkx as nx
import pytest
from graphs import build
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import Interrupted
from kingpost.core.insight import way as module
from kingpost.core.insight.way import COURSES, shortest_way
from kingpost.core.watch import Watch


@st.composite
def digraphs(draw):
    n = draw(st.integers(1, 12))
    ends = st.integers(0, n - 1)
    edges = sorted(draw(st.sets(st.tuples(ends, ends), max_size=24)))
    weights = [draw(st.sampled_from([1.0, 2.5])) for _ in edges]
    return n, [(u, v, w) for (u, v), w in zip(edges, weights, strict=True)]


@settings(deadline=None)  # compiling the loops takes its time
@given(digraphs(), st.data())
def test_as_long_as_networkx_says(made, data):
    n, edges = made
    graph = build(n, edges)
    start, goal = data.draw(st.integers(0, n - 1)), data.draw(st.integers(0, n - 1))
    other = nx.DiGraph()
    other.add_nodes_from(range(n))
    other.add_weighted_edges_from(edges)
    views = {"along": other, "against": other.reverse(), "either": other.to_undirected()}
    for course in COURSES:
        found = shortest_way(graph, start, goal, course)
        try:
            length = nx.shortest_path_length(views[course], start, goal)
        except nx.NetworkXNoPath:
            assert found is None
            continue
        assert found.edges == length
        assert (found.nodes[0], found.nodes[-1]) == (start, goal)
        steps = zip(found.nodes[:-1], found.nodes[1:], found.weights, found.along, strict=True)
        for u, v, weight, along in steps:
            tail, head = (u, v) if along else (v, u)
            assert other[tail][head]["weight"] == weight
            assert along or course != "along"
            assert not along or course != "against"


def test_of_two_ways_the_one_through_the_lower_number():
    graph = build(4, [(0, 1), (0, 2), (1, 3), (2, 3)])
    assert shortest_way(graph, 0, 3).nodes == (0, 1, 3)


def test_undirected_edges_lead_both_ways():
    graph = build(3, [(0, 1), (1, 2)], directed=False)
    assert shortest_way(graph, 2, 0, "along").nodes == (2, 1, 0)
    assert shortest_way(graph, 2, 0, "against").nodes == (2, 1, 0)


def test_pieces_of_one_edge_find_the_same(monkeypatch):
    monkeypatch.setattr(module, "_PIECE", 1)
    graph = build(50, [(i, i + 1) for i in range(49)])
    assert shortest_way(graph, 0, 49).nodes == tuple(range(50))
    assert shortest_way(graph, 49, 0, "either").nodes == tuple(range(50))[::-1]
    assert shortest_way(graph, 49, 0) is None


def test_ends_when_asked():
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        shortest_way(build(3, [(0, 1), (1, 2)]), 0, 2, "along", watch)
