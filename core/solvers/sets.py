"""Who reaches whom, counted exactly: sets of nodes as bits, 512 members at a time.

Two methods.  On the condensation, which has no cycles, one pass in its order finds which of 512
components lead to each component: a row of bits is the union of its givers' rows and itself.
Where distances matter, a breadth-first search runs from 512 sources at once (Then et al., "The
more the merrier: efficient multi-source graph traversal", PVLDB 8, 2014).

Blocks are shared out over a fixed number of lanes, so that sums have the same bits for any
number of threads.
"""

from __future__ import annotations

import time
from collections.abc import Generator, Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Floats, Flow, Graph
from kingpost.core.operators import cut
from kingpost.core.parallel import each
from kingpost.core.result import Iteration
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

LANES = 2
_PIECE = 2_000_000  # edges between two looks whether the work was cancelled
_VISITS = 1_000_000  # the same for visits that read whole rows of bits
_CANCELLED, _OVER = -1, -2  # instead of a number of edge visits


@dataclass(frozen=True)
class Condensation:
    """Strong components as the nodes of an acyclic graph, numbered so that score flows upwards.

    Attributes:
        group: number of each node's component, shape (n,), uint32.
        order: nodes component by component, and ``begins``, where each begins in it.
        starts, givers: the distinct components that give to component g, all lower than g, are
            ``givers[starts[g]:starts[g + 1]]``.
        feeds: whether a component gives to any other.
    """

    group: NDArray[np.uint32]
    order: NDArray[np.uint32]
    begins: NDArray[np.int64]
    starts: NDArray[np.int64]
    givers: NDArray[np.uint32]
    feeds: NDArray[np.bool_]

    @property
    def count(self) -> int:
        """Number of components."""
        return len(self.starts) - 1

    @property
    def edges(self) -> int:
        """Number of pairs of components joined by an edge."""
        return len(self.givers)


def separate(graph: Graph, flow: Flow) -> Condensation:
    """The components of ``graph`` in the order of score that flows ``flow``, not yet joined."""
    structure, n = graph.structure, graph.n
    count = structure.count
    starts, givers = np.zeros(count + 1, dtype=np.int64), np.empty(0, dtype=np.uint32)
    feeds = np.zeros(count, dtype=bool)
    if flow == "along":
        whole = structure.component, structure.order, structure.starts
    else:
        group = np.uint32(count - 1) - structure.component
        order = np.ascontiguousarray(structure.order[::-1])
        whole = group, order, np.ascontiguousarray(n - structure.starts[::-1])
    return Condensation(*whole, starts, givers, feeds)


def condense(graph: Graph, flow: Flow, watch: Watch) -> Condensation:
    """The condensation of ``graph`` for score that flows ``flow``.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    from kingpost.core.kernels.reach import condense as kernel

    rows, n, apart = graph.pull(flow), graph.n, separate(graph, flow)
    group, order, starts, givers = apart.group, apart.order, apart.starts, apart.givers
    for write in (False, True):
        if write:
            givers = np.empty(int(starts[-1]), dtype=np.uint32)
            if len(givers) == 0:
                break
        mark = np.full(apart.count, 0xFFFFFFFF, dtype=np.uint32)
        at = 0
        for low, high in cut(rows, order, 0, n, _PIECE):
            watch.check()
            at = kernel(
                rows.offsets, rows.neighbours, group, order, low, high, at, mark, starts, givers
            )
            watch.report("joining components", high + n * write, 2 * n, "nodes")
    apart.feeds[givers] = True
    return replace(apart, givers=givers)


@dataclass
class Gathered:
    """What has been found so far of the weight upstream of every component.

    ``found`` (components,) is complete for the members in ``done`` of ``blocks`` blocks;
    ``missing`` is the weight of all the others.
    """

    found: Floats
    blocks: int
    done: int = 0
    visits: int = 0
    missing: float = 0.0

    @property
    def cancelled(self) -> bool:
        """Whether it ended before its end."""
        return self.done < self.blocks


def gather_visits(joined: Condensation) -> int:
    """Edges and rows that :func:`gather` will read: what is compared with a budget."""
    firsts = np.flatnonzero(joined.feeds)[:: _width()]
    rows = len(firsts) * joined.count - int(firsts.sum())
    return rows + len(firsts) * joined.edges - int(joined.starts[firsts].sum())


def _width() -> int:
    from kingpost.core.kernels.reach import WIDTH

    return WIDTH


def gather(
    joined: Condensation, weights: Floats, watch: Watch
) -> Generator[Iteration, None, Gathered]:
    """Weight of all components upstream of each, itself left out.

    ``weights`` has shape (components,), nonnegative.  Each sum is over bytes, rows of bytes and
    blocks: at most ``8 + 64 + blocks`` additions deep.  Cancelled, it returns what it has: every
    sum is then too small by at most ``missing``.
    """
    from kingpost.core.kernels.reach import WIDTH, WORDS
    from kingpost.core.kernels.reach import gather as kernel

    began = time.perf_counter()
    members = np.flatnonzero(joined.feeds)
    column = np.full(joined.count, -1, dtype=np.int64)
    column[members] = np.arange(len(members))
    blocks = -(-len(members) // WIDTH)
    lanes = max(1, min(LANES, blocks))
    found = [np.zeros(joined.count) for _ in range(lanes)]
    bits = [np.empty((joined.count, WORDS), dtype=np.uint64) for _ in range(lanes)]
    live = [np.zeros(joined.count, dtype=bool) for _ in range(lanes)]
    total = float(weights[members].sum())
    kept = Gathered(np.zeros(joined.count), blocks, missing=total)

    def block(number: int) -> int:
        lane = number % lanes
        inside = members[number * WIDTH : (number + 1) * WIDTH]
        table = _table(weights[inside])
        first = int(inside[0])
        for low, high in row_pieces(joined.starts[first:] - joined.starts[first], _VISITS):
            if watch.cancelled:
                return _CANCELLED
            kernel(
                joined.starts, joined.givers, first + low, first + high, np.uint64(first), column,
                number * WIDTH, table, bits[lane], live[lane], found[lane],
            )  # fmt: skip
        return joined.count - first + joined.edges - int(joined.starts[first])

    for number in range(0, blocks, lanes):
        some = range(number, min(number + lanes, blocks))
        visits = each(block, some, watch.threads)
        if _CANCELLED in visits:
            break
        kept.visits += sum(visits)
        kept.done = some.stop
        kept.missing = float(weights[members[kept.done * WIDTH :]].sum())
        watch.report("gathering what leads to what", kept.done, blocks, "blocks")
        share = kept.missing / total if total > 0 else 0.0
        yield Iteration(
            kept.done, float("nan") if share else 0.0, float("nan") if share else 0.0,
            kept.visits, time.perf_counter() - began,
            part=f"members {some.start * WIDTH + 1:,} to {min(some.stop * WIDTH, len(members)):,}"
            f" of {len(members):,}",
        )  # fmt: skip
    for part in found:
        kept.found += part
    return kept


def _table(weights: Floats) -> Floats:
    """Weight of every set of eight members, (bytes of a row, 256); empty where all weigh 1."""
    from kingpost.core.kernels.reach import WIDTH

    if (weights == 1.0).all():
        return np.empty((0, 256))
    padded = np.zeros(WIDTH)
    padded[: len(weights)] = weights
    table = np.zeros((WIDTH // 8, 256))
    for bit in range(8):
        table[:, 1 << bit : 2 << bit] = table[:, : 1 << bit] + padded[bit::8, None]
    return table


@dataclass
class Searched:
    """Sums of 1/distance, as far as they have been found.

    ``score`` (n,) is correct to two roundings of each term and sum; ``residue`` is
    :data:`COMMON` times the exact sum, modulo 2^64, meaningless where ``levels`` is beyond
    :data:`LEVELS`.
    """

    score: Floats
    residue: NDArray[np.uint64]
    blocks: int
    done: int = 0
    visits: int = 0
    levels: int = 0
    over_budget: bool = False

    @property
    def cancelled(self) -> bool:
        """Whether it ended before its end, by request."""
        return self.done < self.blocks and not self.over_budget


LEVELS = 46  # greatest L for which the least common multiple of 1..L is below 2^64
COMMON = int(np.lcm.reduce(np.arange(1, LEVELS + 1, dtype=object)))


class _Lane:
    """Memory of one search, reused block after block."""

    def __init__(self, n: int) -> None:
        from kingpost.core.kernels.reach import WORDS

        self.seen, self.wave, self.fresh = (np.zeros((n, WORDS), np.uint64) for _ in range(3))
        self.front, self.near = np.empty(n, np.uint32), np.empty(n, np.uint32)
        self.marked = np.zeros(n, dtype=bool)
        self.score, self.lost = np.zeros(n), np.zeros(n)
        self.residue = np.zeros(n, dtype=np.uint64)
        self.levels = 0

    def sources(self, low: int, high: int) -> NDArray[np.int64]:
        """Start from the nodes ``low..high``; returns the state of the search."""
        from kingpost.core.kernels.reach import WAVE

        self.seen[:] = 0
        nodes = np.arange(low, high)
        place = nodes - low
        bit = np.uint64(1) << (place & 63).astype(np.uint64)
        self.seen[nodes, place >> 6] = bit
        self.wave[nodes, place >> 6] = bit
        self.front[: high - low] = nodes
        state = np.zeros(6, dtype=np.int64)
        state[WAVE] = high - low
        return state


def search(push: Adjacency, budget: float, watch: Watch) -> Generator[Iteration, None, Searched]:
    """Sum of ``1 / d(u, v)`` over all u other than v, along ``push``, for every v.

    Ends early, ``over_budget``, when the edge visits of the first blocks, scaled to all sources,
    exceed ``budget``, or those made exceed it twice.  Cancelled, it returns what it has: lower
    bounds of every sum.
    """
    from kingpost.core.kernels.reach import LEVEL, VISITS, WIDTH
    from kingpost.core.kernels.reach import search as kernel

    began, n = time.perf_counter(), len(push.offsets) - 1
    blocks = -(-n // WIDTH)
    lanes = [_Lane(n) for _ in range(max(1, min(LANES, blocks)))]
    units = np.array([0, *(COMMON // level for level in range(1, LEVELS + 1))], dtype=np.uint64)
    kept = Searched(np.zeros(n), np.zeros(n, dtype=np.uint64), blocks)

    def block(number: int) -> int:
        lane = lanes[number % len(lanes)]
        state = lane.sources(number * WIDTH, min((number + 1) * WIDTH, n))
        through, first = False, number < len(lanes)
        spare = budget * len(lanes) / blocks if first else 2 * budget - kept.visits
        while not through:
            if watch.cancelled:
                return _CANCELLED
            through = kernel(
                push.offsets, push.neighbours, state, _VISITS, lane.seen, lane.wave, lane.fresh,
                lane.front, lane.near, lane.marked, units, lane.score, lane.lost, lane.residue,
            )  # fmt: skip
            lane.levels = max(lane.levels, int(state[LEVEL]))
            if state[VISITS] > spare:
                return _OVER
        return int(state[VISITS])

    for number in range(0, blocks, len(lanes)):
        some = range(number, min(number + len(lanes), blocks))
        visits = each(block, some, watch.threads)
        if _CANCELLED in visits:
            break
        kept.visits += sum(max(0, visit) for visit in visits)
        if _OVER in visits or (number == 0 and kept.visits / some.stop * blocks > budget):
            kept.over_budget = True
            break
        kept.done = some.stop
        watch.report("searching from every node", min(some.stop * WIDTH, n), n, "sources")
        last = 0.0 if kept.done == blocks else float("nan")
        yield Iteration(
            kept.done, last, last, kept.visits, time.perf_counter() - began,
            part=f"sources {number * WIDTH + 1:,} to {min(some.stop * WIDTH, n):,} of {n:,}",
        )  # fmt: skip
    kept.levels = max(lane.levels for lane in lanes)
    lost = np.zeros(n)
    for lane in lanes:
        lost += lane.lost
        grown = kept.score + lane.score
        # The greater of the two first: what the sum rounds off is found exactly (Dekker 1971).
        big, small = np.maximum(kept.score, lane.score), np.minimum(kept.score, lane.score)
        lost += (big - grown) + small
        kept.score = grown
        kept.residue += lane.residue
    kept.score += lost
    return kept


def same_sums(found: Searched) -> NDArray[np.int64] | None:
    """Classes of nodes whose exact sums of 1/distance are equal, (n,); None beyond LEVELS.

    Sums with the same residue differ by a multiple of 2^64 / COMMON, which is more than 1.9:
    if their scores are closer than that they are equal.
    """
    if found.levels > LEVELS + 1:  # the last level of a search meets nobody
        return None
    order = np.lexsort((found.score, found.residue))
    score, residue = found.score[order], found.residue[order]
    fresh = np.ones(len(order), dtype=bool)
    fresh[1:] = (residue[1:] != residue[:-1]) | (np.diff(score) > 0.5)
    classes = np.empty(len(order), dtype=np.int64)
    classes[order] = np.cumsum(fresh) - 1
    return classes


def pieces(offsets: NDArray[np.int64]) -> Iterator[tuple[int, int]]:
    """Row ranges that are short enough to be cancelled between."""
    return row_pieces(offsets, _VISITS)
