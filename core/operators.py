"""The matrices of this package as mathematical objects, apart from the methods that use them.

All have the form ``(B x)[i] = sum over edges j -> i of weight(j, i) * scale[j] * x[j]``: the
adjacency itself (scale 1), alpha times it (Katz), the damped walk of the random surfer
(scale = damping / out-strength, zero for dangling nodes).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from kingpost.core.graph import Adjacency, Floats, Flow, Graph
from kingpost.core.parallel import each
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

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
        from kingpost.core.kernels.rows import diagonal

        values = np.zeros(self.n)
        found = diagonal(self.rows.offsets, self.rows.neighbours, self.rows.weights, values)
        return values * self.scale if found else np.empty(0)

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

    def apply_exactly(self, x: Floats, watch: Watch) -> tuple[Floats, Floats]:
        """``B x`` by compensated summation, and ``|B| |x|`` for rounding bounds; shape (n,) each."""
        from kingpost.core.kernels.sweep import pull_exactly

        z, y, size = self.scale * x, np.empty(self.n), np.empty(self.n)
        rows = self.rows

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            pull_exactly(rows.offsets, rows.neighbours, rows.weights, *part, z, y, size)

        each(piece, self.pieces, watch.threads)
        return y, size

    def edges_of(self, nodes: np.ndarray[tuple[int], np.dtype[np.uint32]]) -> int:
        """Number of stored entries in the rows of ``nodes``."""
        return int((self.rows.offsets[nodes + np.int64(1)] - self.rows.offsets[nodes]).sum())


def adjacency(graph: Graph, flow: Flow, alpha: float = 1.0) -> Pull:
    """``alpha A^T`` for flow along the edges, ``alpha A`` against them."""
    return Pull(graph.pull(flow), np.full(graph.n, alpha))


def walk(graph: Graph, flow: Flow, damping: float = 1.0) -> tuple[Pull, Floats]:
    """``damping P^T`` of the random walk along ``flow``, and the out-strengths, shape (n,).

    ``P[i, j]`` is the share of i's out-strength on its edge to j.  Rows of nodes without
    out-strength (dangling) are zero.
    """
    strength = graph.push(flow).strengths()
    with np.errstate(divide="ignore"):
        scale = np.where(strength > 0, damping / strength, 0.0)
    return Pull(graph.pull(flow), scale), strength


