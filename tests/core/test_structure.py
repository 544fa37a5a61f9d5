"""Components, their order, periods and reach, against networkx and scipy."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
import scipy.sparse as sp
from graphs import build, classics, dense, graphs, of, to_networkx
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.sparse.csgraph import connected_components

from kingpost.core import gallery, structure
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Graph
from kingpost.core.measures import measure
from kingpost.core.result import Stop
from kingpost.core.structure import analyse, reachable, row_pieces, structure_of, weak_components
from kingpost.core.watch import Watch

examples = settings(deadline=None, max_examples=150)


def confirm(graph: Graph) -> None:
    """Everything a Structure says, against networkx and scipy."""
    found, other = analyse(graph), to_networkx(graph).to_directed()
    parts = {frozenset(part) for part in nx.strongly_connected_components(other)}
    mine = {frozenset(found.members(c).tolist()) for c in range(found.count)}
    assert mine == parts
    count, labels = connected_components(sp.csr_array(dense(graph)), connection="strong")
    assert found.count == count
    assert len(set(zip(labels.tolist(), found.component.tolist(), strict=True))) == count
    assert sorted(found.order.tolist()) == list(range(graph.n))
    assert (np.diff(found.component[found.order].astype(np.int64)) >= 0).all()
    assert found.sizes.tolist() == [len(found.members(c)) for c in range(found.count)]
    for u, v in other.edges:  # along an edge the number stays or grows
        assert found.component[u] <= found.component[v]
    cyclic = {part for part in parts if other.subgraph(part).number_of_edges()}
    assert {frozenset(found.members(int(c)).tolist()) for c in found.cyclic} == cyclic
    assert found.acyclic == nx.is_directed_acyclic_graph(other)
    inner = {int(c): other.subgraph(found.members(int(c)).tolist()) for c in found.cyclic}
    assert found.inner.tolist() == [inner[int(c)].number_of_edges() for c in found.cyclic]
    for c, part in inner.items():
        lengths = [len(cycle) for cycle in nx.simple_cycles(part)] if len(part) < 7 else None
        if lengths is not None:  # the period by its definition
            assert found.period(c) == np.gcd.reduce(lengths)
        assert (found.period(c) == 1) == nx.is_aperiodic(part)
    weak = weak_components(graph)
    for part in nx.weakly_connected_components(other):
        assert {int(weak[i]) for i in part} == {min(part)}


@examples
@given(graphs(most=10))
def test_random_graphs(graph: Graph) -> None:
    confirm(graph)


@pytest.mark.parametrize("name", ["karate", "davis", "florentine"])
def test_small_real_networks(name: str) -> None:
    confirm(classics()[name])


@settings(deadline=None, max_examples=60)
@given(graphs(most=10), st.integers(1, 5))
def test_searches_go_on_where_their_budget_ended(graph: Graph, budget: int) -> None:
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(structure, "_PIECE", budget)
        confirm(graph)
        seen = reachable(graph.outward, np.array([0], np.uint32))
        below = nx.descendants(to_networkx(graph), 0) | {0}
        assert set(np.flatnonzero(seen).tolist()) == below


@pytest.mark.parametrize("budget", [1, 7, 4_000_000])
def test_a_larger_graph_in_small_pieces(budget: int, monkeypatch: pytest.MonkeyPatch) -> None:
    graph = of(gallery.rmat(9, 1_500, seed=4))
    monkeypatch.setattr(structure, "_PIECE", budget)
    confirm(graph)


@pytest.mark.parametrize("length", [1, 2, 3, 12])
def test_the_period_of_a_cycle_is_its_length(length: int) -> None:
    found = of(gallery.cycle(length)).structure
    assert [found.period(int(c)) for c in found.cyclic] == [length]


def test_a_long_path_does_not_recurse() -> None:
    # Numbered so that neither direction is a topological order: the depth-first search must run.
    n = 50_000
    graph = build(n, [((7 * i) % n, (7 * (i + 1)) % n) for i in range(n - 1) if i % n != 3])
    found = analyse(graph)
    assert found.count == n
    assert found.acyclic
    assert (found.component[graph.outward.neighbours] > np.repeat(
        found.component, graph.outward.degrees
    )).all()  # fmt: skip


@given(st.lists(st.integers(0, 9), min_size=1, max_size=12), st.integers(1, 6))
def test_pieces_cover_all_rows_once(degrees: list[int], edges: int) -> None:
    offsets = np.concatenate(([0], np.cumsum(degrees))).astype(np.int64)
    pieces = list(row_pieces(offsets, edges))
    assert [low for low, _ in pieces] == [0, *(high for _, high in pieces[:-1])]
    assert pieces[-1][1] == len(degrees)
    for low, high in pieces:
        assert high == low + 1 or offsets[high] - offsets[low] <= edges


def test_cancelling_stops_the_search() -> None:
    watch = Watch()
    watch.cancel()
    graph = of(gallery.cycle(5))
    with pytest.raises(Interrupted):
        analyse(graph, watch)
    with pytest.raises(Interrupted):
        weak_components(graph, watch)
    with pytest.raises(Interrupted):
        reachable(graph.outward, np.array([0], np.uint32), watch)


@pytest.mark.parametrize("n", [0, 1, 4])
def test_graphs_without_edges(n: int) -> None:
    found = analyse(build(n, []))
    assert (found.count, found.acyclic, found.share_iterated) == (n, True, 0.0)
    assert weak_components(build(n, [])).tolist() == list(range(n))


def test_structure_is_looked_for_where_that_can_be_cancelled(monkeypatch) -> None:
    graph = build(4, [(0, 1), (1, 2), (2, 0), (2, 3)])
    watch = Watch(threads=1)
    watch.cancel()
    # Small: found anyhow, and the solver returns what it has.
    small = measure("surfer").rank(build(4, [(0, 1), (1, 2), (2, 0), (2, 3)]), None, watch)
    assert small.stop is Stop.CANCELLED
    monkeypatch.setattr("kingpost.core.measures.base._PROMPT", 3)
    with pytest.raises(Interrupted):
        measure("surfer").rank(graph, None, watch)
    assert "structure" not in graph.__dict__
    assert measure("surfer").rank(graph).seconds.prepare > 0
    assert structure_of(graph, watch) is graph.structure
