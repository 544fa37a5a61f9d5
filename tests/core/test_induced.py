"""Induced subgraphs against networkx's own."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pyarrow as pa
import pytest
from graphs import build
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Graph
from kingpost.core.subgraph import induced
from kingpost.core.watch import Watch


def pairs(graph, side):
    return [
        (graph.label(u), graph.label(int(v)), float(w))
        for u in range(graph.n)
        for v, w in zip(*side.row(u), strict=True)
    ]


@settings(deadline=None)  # compiling the loops takes its time
@given(st.data(), st.booleans(), st.booleans())
def test_the_same_edges_as_networkx(data, directed, weighted):
    n = data.draw(st.integers(1, 10))
    ends = st.integers(0, n - 1)
    listed = data.draw(st.sets(st.tuples(ends, ends), max_size=20))
    if not directed:
        listed = {(min(edge), max(edge)) for edge in listed}
    edges = [(u, v, 1.0 + (u + v) * weighted) for u, v in sorted(listed)]
    graph = build(n, edges, directed)
    nodes = data.draw(st.lists(ends, unique=True))
    part = induced(graph, np.array(nodes, dtype=np.uint32))
    other = nx.DiGraph() if directed else nx.Graph()
    other.add_nodes_from(range(n))
    other.add_weighted_edges_from(edges)
    other = nx.subgraph(other, nodes)
    assert part.labels.to_pylist() == sorted(nodes)
    assert part.m == other.number_of_edges()
    expected = [(u, v, d["weight"]) for u in sorted(other) for v, d in sorted(other[u].items())]
    assert pairs(part, part.outward) == expected
    if directed:
        turned = other.reverse()
        expected = [
            (u, v, d["weight"]) for u in sorted(turned) for v, d in sorted(turned[u].items())
        ]
        assert pairs(part, part.inward) == expected
    assert part.account.rows_kept == len(part.outward.neighbours)


def test_attributes_and_types_of_ids_stay():
    whole = build(4, [(0, 1), (1, 2), (2, 0), (2, 3)])
    whole = Graph(
        pa.array(["a", "b", "c", "d"]),
        whole.outward,
        whole.inward,
        attributes=pa.table({"tier": [1, None, 3, 4]}),
        origin=whole.origin,
    )
    part = induced(whole, np.array([2, 0]))
    assert part.labels.to_pylist() == ["a", "c"]
    assert part.attributes.to_pydict() == {"tier": [1, 3]}
    assert part.account.notes == ("a part of 2 of the 4 nodes, with every edge among them",)
    assert part.structure.acyclic


def test_what_are_no_nodes():
    graph = build(2, [(0, 1)])
    for nodes in ([0, 0], [2], [-1]):
        with pytest.raises(ValueError, match="distinct"):
            induced(graph, np.array(nodes))


def test_ends_when_asked():
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        induced(build(2, [(0, 1)]), np.array([0, 1]), watch)
