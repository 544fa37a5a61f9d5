"""What a trial takes away or reweights, and the graph that is left: a new one, made by masks."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Adjacency, Floats, Graph
from kingpost.core.parallel import each
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

Ints = NDArray[np.int64]
_LOW = 0xFFFFFFFF
_PIECE = 1_000_000  # edges copied between two looks at the watch


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


def edited(graph: Graph, edit: Edit, watch: Watch | None = None) -> tuple[Graph, Ints]:
    """The graph after an edit, and the old number of each of its nodes, shape (n - gone,).

    A node that loses its last edge stays, as an isolated one.  The account stays that of the
    table read.  O(n + m), without reading any table again.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    old = edit.stay(graph.n)
    kept = np.zeros(graph.n, dtype=bool)
    kept[old] = True
    number = (np.cumsum(kept) - 1).astype(np.uint32)
    keys, factors = edit.keys(), np.array(edit.factors, dtype=np.float64)
    outward = _masked(graph.outward, kept, number, keys, factors, watch)
    inward = outward
    if graph.directed:
        turned = ((keys & _LOW) << 32) | (keys >> 32)
        inward = _masked(graph.inward, kept, number, turned, factors, watch)
    watch.check()
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
    watch: Watch,
) -> Adjacency:
    """One direction without what is gone; ``keys`` are ``row << 32 | neighbour``."""
    from kingpost.core.kernels.mask import copy_kept, count_kept

    n = len(kept)
    gone = np.sort(np.array([_place(side, key) for key in keys[factors == 0]], dtype=np.int64))
    pieces = list(row_pieces(side.offsets, _PIECE))
    lengths = np.zeros(n, dtype=np.int64)

    def counted(piece: tuple[int, int]) -> None:
        watch.check()
        at = int(np.searchsorted(gone, side.offsets[piece[0]]))
        count_kept(side.offsets, side.neighbours, *piece, kept, gone, at, lengths)

    each(counted, pieces, watch.threads)
    starts = np.zeros(n + 1, dtype=np.int64)
    np.cumsum(lengths, out=starts[1:])
    near = np.empty(int(starts[-1]), dtype=np.uint32)
    heavy = np.empty(0 if side.weights is None else len(near))

    def copied(piece: tuple[int, int]) -> None:
        watch.check()
        at = int(np.searchsorted(gone, side.offsets[piece[0]]))
        copy_kept(
            side.offsets, side.neighbours, side.weights, *piece, kept, number, gone, at, starts,
            near, heavy,
        )  # fmt: skip

    each(copied, pieces, watch.threads)
    offsets = np.append(starts[:-1][kept], starts[-1])
    weights = None if side.weights is None else heavy
    scaled = np.flatnonzero((factors != 0) & (factors != 1))
    if len(scaled) and weights is None:
        weights = np.ones(len(near))
    made = Adjacency(offsets, near, None)
    for which in scaled.tolist():
        source, target = int(keys[which] >> 32), int(keys[which] & _LOW)
        if weights is not None and kept[source] and kept[target]:
            key = (int(number[source]) << 32) | int(number[target])
            weights[_place(made, key)] *= factors[which]
    return Adjacency(offsets, near, weights)


def _place(side: Adjacency, key: int) -> int:
    """Where the entry of ``row << 32 | neighbour`` stands."""
    row, neighbour = int(key) >> 32, int(key) & _LOW
    start, end = int(side.offsets[row]), int(side.offsets[row + 1])
    return start + int(np.searchsorted(side.neighbours[start:end], neighbour))
