"""The matrices of this package as mathematical objects, apart from the methods that use them.

All have the form ``(B x)[i] = sum over edges j -> i of weight(j, i) * scale[j] * x[j]``: the
adjacency itself (scale 1), alpha times it (Katz), the damped walk of the random surfer
(scale = damping / out-strength, zero for dangling nodes).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Floats, Flow, Graph
from kingpost.core.parallel import each
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

Order = NDArray[np.uint32]

ROW = 8  # entries that take as long as coming to another row, measured on rows of 1 to 10,000
_LANES = 2  # vectors a transposed product is added up in; fixed, for the sake of the bits
_PIECE = 2_000_000  # edges in one piece of a product; also how soon a cancel is noticed


@dataclass(frozen=True)
class Pull:
    """A nonnegative matrix B given by rows: whom each node's score comes from.

    Attributes:
        rows: adjacency whose row i lists the nodes j that give to i.
        scale: factor of every giver, shape (n,), nonnegative.
    """

    rows: Adjacency
    scale: Floats

    @property
    def n(self) -> int:
        """Number of nodes."""
        return len(self.scale)

    @property
    def stored(self) -> int:
        """Number of stored entries: the edge visits of one product."""
        return len(self.rows.neighbours)

    @cached_property
    def loops(self) -> Floats:
        """Diagonal of B, shape (n,); an empty array where the diagonal is zero."""
        return self.rows.loops * self.scale if len(self.rows.loops) else self.rows.loops

    @cached_property
    def pieces(self) -> list[tuple[int, int]]:
        """Row ranges of about two million edges: the fixed blocks of every product."""
        return list(row_pieces(self.rows.offsets, _PIECE))

    def apply(self, x: Floats, watch: Watch) -> Floats:
        """``B x``, shape (n,).  Raises Interrupted if ``watch`` is cancelled on the way."""
        from kingpost.core.kernels.sweep import pull

        z, y, rows = self.scale * x, np.empty(self.n), self.rows

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            pull(rows.offsets, rows.neighbours, rows.weights, *part, z, y)

        each(piece, self.pieces, watch.threads)
        return y

    def apply_exactly(
        self, x: Floats, order: Order, low: int, high: int, watch: Watch
    ) -> tuple[Floats, Floats]:
        """``B x`` by compensated sums, and ``|B| |x|``, in the rows ``order[low:high]``.

        Both have shape (n,) and are zero in all other rows.
        """
        from kingpost.core.kernels.sweep import pull_exactly

        z, y, size = self.scale * x, np.zeros(self.n), np.zeros(self.n)
        rows = self.rows

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            pull_exactly(rows.offsets, rows.neighbours, rows.weights, order, *part, z, y, size)

        each(piece, cut(rows, order, low, high, _PIECE // 2), watch.threads)
        return y, size

    def edges_of(self, nodes: Order) -> int:
        """Number of stored entries in the rows of ``nodes``."""
        return entries_of(self.rows, nodes, 0, len(nodes))


def given_back(
    rows: Adjacency, order: Order, low: int, high: int, values: Floats, watch: Watch
) -> Floats:
    """``sum_i weight(j -> i) values[i]`` over the rows i of ``order[low:high]``, for every j.

    The transposed product, by the same rows; ``values`` has shape (n,), or (1,) for a constant.
    Raises Interrupted if ``watch`` is cancelled on the way.
    """
    from kingpost.core.kernels.rows import given_to

    n = len(rows.offsets) - 1
    pieces = cut(rows, order, low, high, _PIECE // 2)
    half = -(-len(pieces) // _LANES)
    lanes = [pieces[at : at + half] for at in range(0, len(pieces), max(half, 1))]

    def lane(blocks: list[tuple[int, int]]) -> Floats:
        totals = np.zeros(n)
        for block in blocks:
            watch.check()
            given_to(rows.offsets, rows.neighbours, rows.weights, order, *block, values, totals)
        return totals

    parts = each(lane, lanes, watch.threads)
    return parts[0] if len(parts) == 1 else np.sum(parts, axis=0)


def entries_of(rows: Adjacency, order: Order, low: int, high: int) -> int:
    """Number of entries in the rows ``order[low:high]``."""
    from kingpost.core.kernels.rows import entries

    return int(entries(rows.offsets, order, low, high))


def cut(rows: Adjacency, order: Order, low: int, high: int, edges: int) -> list[tuple[int, int]]:
    """Cut ``order[low:high]`` into consecutive ranges that cost as much as ``edges`` entries."""
    from kingpost.core.kernels.rows import cuts

    most = (len(rows.neighbours) + ROW * (high - low)) // edges + 2
    ends = np.empty(min(most, high - low + 1), dtype=np.int64)
    found = cuts(rows.offsets, order, low, high, edges, ROW, ends)
    return list(pairwise([low, *ends[:found].tolist()]))


def adjacency(graph: Graph, flow: Flow, alpha: float = 1.0) -> Pull:
    """``alpha A^T`` for flow along the edges, ``alpha A`` against them."""
    return Pull(graph.pull(flow), np.full(graph.n, alpha))


def walk(graph: Graph, flow: Flow, damping: float = 1.0) -> tuple[Pull, Floats]:
    """``damping P^T`` of the random walk along ``flow``, and the out-strengths, shape (n,).

    ``P[i, j]`` is the share of i's out-strength on its edge to j.  Rows of nodes without
    out-strength (dangling) are zero.
    """
    strength = strengths(graph, flow)
    scale = np.zeros(graph.n)
    np.divide(damping, strength, out=scale, where=strength > 0)
    return Pull(graph.pull(flow), scale), strength


def strengths(graph: Graph, flow: Flow) -> Floats:
    """What every node gives away along ``flow``, shape (n,); added up once and kept."""
    cache, key = graph.structure.cache, f"strengths {flow}"
    if key not in cache:
        cache[key] = graph.push(flow).strengths()
    kept: Floats = cache[key]
    return kept


def told_apart(matrix: Pull, push: Adjacency) -> Pull:
    """``matrix`` of a walk, with scales that differ wherever the exact out-strengths may.

    For telling ties only: two strengths can be equal as floats and not as sums.  Whole numbers
    below 2^53 are added up exactly; other nodes are alike where they give the same weights.
    """
    from kingpost.core.kernels.colour import refine
    from kingpost.core.kernels.rows import row_totals

    weights, n = push.weights, matrix.n
    strength = np.empty(n)
    if weights is None:
        strength = push.strengths()
    if weights is None or row_totals(push.offsets, weights, 0, n, strength):
        return Pull(matrix.rows, np.where(matrix.scale != 0.0, strength, 0.0))
    kinds = np.empty(n, dtype=np.uint64)
    same = np.zeros(n, dtype=np.uint64)
    refine(
        push.offsets, push.neighbours, weights.view(np.uint64), np.arange(n, dtype=np.uint32),
        0, n, same, np.ones(n, dtype=np.uint64), kinds,
    )  # fmt: skip
    number = np.unique(kinds, return_inverse=True)[1].ravel() + 1.0
    return Pull(matrix.rows, np.where(matrix.scale != 0.0, number, 0.0))
