"""Graphs for tests: built by hand, so that a solver's test does not rest on ingest."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import networkx as nx
import numpy as np
import pyarrow as pa
from hypothesis import strategies as st

from kingpost.core.gallery import EdgeList
from kingpost.core.graph import Adjacency, Graph


def _rows(n: int, rows: Any, columns: Any, weights: Any) -> Adjacency:
    order = np.lexsort((columns, rows))
    offsets = np.zeros(n + 1, np.int64)
    np.cumsum(np.bincount(rows, minlength=n), out=offsets[1:])
    kept = None if weights is None else np.ascontiguousarray(weights[order], dtype=np.float64)
    return Adjacency(offsets, np.ascontiguousarray(columns[order], dtype=np.uint32), kept)


def build(
    n: int, edges: Iterable[tuple[int, int] | tuple[int, int, float]], directed: bool = True
) -> Graph:
    """A graph of nodes 0..n-1 from distinct (u, v) or (u, v, weight); isolated nodes may be."""
    listed = [(*edge, 1.0)[:3] for edge in edges]
    source = np.array([u for u, _, _ in listed], np.int64)
    target = np.array([v for _, v, _ in listed], np.int64)
    weight = np.array([w for _, _, w in listed], np.float64)
    plain = bool((weight == 1).all())
    return from_arrays(n, source, target, None if plain else weight, directed)


def from_arrays(n: int, source: Any, target: Any, weight: Any = None, directed: bool = True):
    """As :func:`build`, from arrays; no edge may be listed twice."""
    labels = pa.array(np.arange(n))
    if directed:
        return Graph(
            labels, _rows(n, source, target, weight), _rows(n, target, source, weight), True
        )
    loop = source == target
    both = np.concatenate((source, target[~loop])), np.concatenate((target, source[~loop]))
    weights = None if weight is None else np.concatenate((weight, weight[~loop]))
    rows = _rows(n, *both, weights)
    return Graph(labels, rows, rows, False)


def of(edges: EdgeList) -> Graph:
    """A gallery graph; repeated edges are dropped."""
    edges = edges.distinct()
    return from_arrays(edges.n, edges.source, edges.target, edges.weight, edges.directed)


def from_networkx(graph: nx.Graph, weight: str | None = None) -> Graph:
    """Nodes in networkx's own order; every edge weighs 1 where ``weight`` is None."""
    place = {node: i for i, node in enumerate(graph)}
    edges = [
        (place[u], place[v], 1.0 if weight is None else float(data.get(weight, 1.0)))
        for u, v, data in graph.edges(data=True)
    ]
    return build(len(place), edges, graph.is_directed())


def to_networkx(graph: Graph) -> nx.Graph:
    """The same graph for networkx, weights as ``weight``."""
    other = nx.DiGraph() if graph.directed else nx.Graph()
    other.add_nodes_from(range(graph.n))
    for u in range(graph.n):
        near, weights = graph.outward.row(u)
        other.add_weighted_edges_from(
            (u, int(v), float(w)) for v, w in zip(near, weights, strict=True)
        )
    return other


def dense(graph: Graph) -> np.ndarray:
    """``A[u, v]`` as a float array of shape (n, n)."""
    matrix = np.zeros((graph.n, graph.n))
    for u in range(graph.n):
        near, weights = graph.outward.row(u)
        matrix[u, near] = weights
    return matrix


def classics() -> dict[str, Graph]:
    """Small real networks that networkx carries (BSD-3), plain and weighted."""
    return {
        "karate": from_networkx(nx.karate_club_graph()),
        "karate weighted": from_networkx(nx.karate_club_graph(), "weight"),
        "les miserables": from_networkx(nx.les_miserables_graph(), "weight"),
        "florentine": from_networkx(nx.florentine_families_graph()),
        "davis": from_networkx(nx.davis_southern_women_graph()),
    }


_PLAIN = st.just(1.0)
_TAME = st.integers(1, 9).map(float)
_WILD = st.floats(-6, 6).map(lambda power: float(10.0**power))  # twelve decades


@st.composite
def graphs(
    draw: st.DrawFn,
    most: int = 9,
    directed: bool | None = None,
    weights: tuple[str, ...] = ("plain", "tame", "wild"),
) -> Graph:
    """Small graphs of every kind: weighted, dangling, disconnected, periodic, with self-loops."""
    n = draw(st.integers(1, most))
    pairs = st.tuples(st.integers(0, n - 1), st.integers(0, n - 1))
    found = draw(st.sets(pairs, max_size=3 * n))
    way = draw(st.booleans()) if directed is None else directed
    if draw(st.integers(0, 4)) == 0:  # periodic: only from one half to the other
        found = {(u, v) for u, v in found if (u + v) % 2}
    if not way:
        found = {(min(u, v), max(u, v)) for u, v in found}
    kind = {"plain": _PLAIN, "tame": _TAME, "wild": _WILD}[draw(st.sampled_from(weights))]
    return build(n, [(u, v, draw(kind)) for u, v in sorted(found)], way)
