"""What a trial takes away or reweights, and the graph that is left: a new one, made by masks."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Adjacency, Floats, Graph

Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Edit:
    """Changes to a graph: nodes taken out, and factors for the weights of edges (0: taken out).

    ``nodes`` ascending; ``sources``, ``targets`` and ``factors`` have one entry an edge, ascending
    by source and target, no edge twice.  In an undirected graph each edge stands both ways.
    """

    nodes: tuple[int, ...] = ()
    sources: tuple[int, ...] = ()
    targets: tuple[int, ...] = ()
    factors: tuple[float, ...] = ()

    @property
    def empty(self) -> bool:
        """Whether nothing changes."""
        return not self.nodes and not self.sources

    def keys(self) -> Ints:
        """``source << 32 | target`` of every edge named, ascending."""
        sources, targets = (np.array(side, dtype=np.int64) for side in (self.sources, self.targets))
        packed: Ints = (sources << 32) | targets
        return packed

    def stay(self, n: int) -> Ints:
        """Numbers of the nodes that are left of ``n``, ascending."""
        kept = np.ones(n, dtype=bool)
        kept[list(self.nodes)] = False
        return np.flatnonzero(kept)


def edit_of(
    graph: Graph, nodes: Iterable[int] = (), edges: Iterable[tuple[int, int, float]] = ()
) -> Edit:
    """An Edit of node numbers, and of (source, target, factor) for edges the graph holds.

    Raises:
        SettingsError: for a factor that is negative or not finite or takes a weight beyond
            double precision, an edge that is not there or is named twice, or when no node would
            be left.
    """
    gone = tuple(sorted(set(nodes)))
    if gone and len(gone) >= graph.n:
        raise SettingsError("the trial takes out every node; leave at least one")
    found: dict[tuple[int, int], float] = {}
    for source, target, factor in edges:
        words = f"the edge from {graph.name(source, 60)} to {graph.name(target, 60)}"
        if not (np.isfinite(factor) and factor >= 0):
            raise SettingsError(f"the factor of {words} is {factor:g}; it takes a number from 0")
        near, weights = graph.outward.row(source)
        at = np.flatnonzero(near == target)
        if len(at) == 0:
            raise SettingsError(f"{words} is not in the graph; see kingpost node for its edges")
        after = float(weights[at[0]]) * factor
        if factor > 0 and not 0 < after < np.inf:
            raise SettingsError(f"the factor {factor:g} takes {words} beyond double precision")
        ways = {(source, target)} if graph.directed else {(source, target), (target, source)}
        if ways & found.keys():
            raise SettingsError(f"{words} is named twice; name it once")
        found |= dict.fromkeys(ways, float(factor))
    ends = sorted(found)
    return Edit(
        gone,
        tuple(source for source, _ in ends),
        tuple(target for _, target in ends),
        tuple(found[end] for end in ends),
    )


def edit_named(
    graph: Graph,
    without: Iterable[str] = (),
    without_edges: Iterable[tuple[str, str]] = (),
    scaled: Iterable[tuple[str, str, float]] = (),
) -> Edit:
    """An Edit from the ids of nodes, as they are written.

    Raises:
        NodeNotFound: for an id the graph does not hold.
        SettingsError: as :func:`edit_of`.
    """
    edges = [(graph.find(source), graph.find(target), 0.0) for source, target in without_edges]
    edges += [(graph.find(source), graph.find(target), factor) for source, target, factor in scaled]
    return edit_of(graph, [graph.find(name) for name in without], edges)


def edited(graph: Graph, edit: Edit) -> tuple[Graph, Ints]:
    """The graph after an edit, and the old number of each of its nodes, shape (n - gone,).

    A node that loses its last edge stays, as an isolated one.  The account stays that of the
    table read.  O(n + m), without reading any table again.
    """
    old = edit.stay(graph.n)
    kept = np.zeros(graph.n, dtype=bool)
    kept[old] = True
    number = (np.cumsum(kept) - 1).astype(np.uint32)
    keys, factors = edit.keys(), np.array(edit.factors, dtype=np.float64)
    outward = _masked(graph.outward, kept, number, keys, factors)
    inward = outward
    if graph.directed:
        turned = ((keys & 0xFFFFFFFF) << 32) | (keys >> 32)
        inward = _masked(graph.inward, kept, number, turned, factors)
    taken = pa.array(old)
    attributes = None if graph.attributes is None else graph.attributes.take(taken)
    labels = graph.labels.take(taken)
    made = replace(graph, labels=labels, outward=outward, inward=inward, attributes=attributes)
    return made, old


def _masked(
    side: Adjacency,
    kept: NDArray[np.bool_],
    number: NDArray[np.uint32],
    keys: Ints,
    factors: Floats,
) -> Adjacency:
    """One direction without what is gone; ``keys`` are ``row << 32 | neighbour``."""
    stay = kept[side.neighbours]
    for node in np.flatnonzero(~kept):
        stay[side.offsets[node] : side.offsets[node + 1]] = False
    weights = side.weights
    if len(keys):
        at = np.array([_place(side, int(key >> 32), int(key & 0xFFFFFFFF)) for key in keys])
        stay[at[factors == 0]] = False
        if ((factors > 0) & (factors != 1)).any():
            weights = np.ones(len(stay)) if weights is None else weights.copy()
            weights[at] *= factors
    # Entries left before each offset; a row's length is the difference of two.
    before = np.zeros(len(stay) + 1, np.int64)
    np.cumsum(stay, out=before[1:])
    lengths = np.diff(before[side.offsets])[kept]
    offsets = np.zeros(len(lengths) + 1, np.int64)
    np.cumsum(lengths, out=offsets[1:])
    neighbours = number[side.neighbours[stay]]
    return Adjacency(offsets, neighbours, None if weights is None else weights[stay])


def _place(side: Adjacency, row: int, neighbour: int) -> int:
    start, end = int(side.offsets[row]), int(side.offsets[row + 1])
    return start + int(np.searchsorted(side.neighbours[start:end], neighbour))
