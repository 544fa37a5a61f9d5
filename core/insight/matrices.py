"""The matrices that measures iterate, as :mod:`kingpost.core.solvers.eigenvalues` takes them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from kingpost.core.certify import UNIT
from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull, cut
from kingpost.core.parallel import each
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

_PIECE = 2_000_000
# A row of k products: each with its factor and that factor's own rounding, four partial sums.
_ROW = 10.0


@dataclass
class Inside:
    """A nonnegative matrix cut down to the edges inside its strong components.

    What leads from one component to another changes no eigenvalue: nodes on no cycle are left out
    and only add zeros.  ``symmetric`` as its owner knows it.
    """

    pull: Pull
    structure: Structure
    symmetric: bool

    def __post_init__(self) -> None:
        marked = np.zeros(self.structure.count, dtype=bool)
        marked[self.structure.cyclic] = True
        order = self.structure.order
        self.nodes: Order = order[marked[self.structure.component[order]]]
        self.pieces = cut(self.pull.rows, self.nodes, 0, len(self.nodes), _PIECE)
        self.units = UNIT * (self.pull.rows.degrees[self.nodes] / 4 + _ROW)
        self.visits = self.pull.edges_of(self.nodes)

    @property
    def size(self) -> int:
        """Nodes on cycles."""
        return len(self.nodes)

    def apply(self, x: Floats, watch: Watch) -> Floats:
        """``B x``."""
        from kingpost.core.kernels.rows import pull_inside

        rows, pull = self.pull.rows, self.pull
        z, y = np.zeros(pull.n), np.empty(pull.n)
        z[self.nodes] = pull.scale[self.nodes] * x

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            pull_inside(
                rows.offsets, rows.neighbours, rows.weights, self.nodes, *part,
                self.structure.component, z, y,
            )  # fmt: skip

        each(piece, self.pieces, watch.threads)
        found: Floats = y[self.nodes]
        return found

    def rounding(self, x: Floats, watch: Watch) -> Floats:
        """A share of ``|B| |x|``."""
        return self.units * self.apply(np.abs(x), watch)


@dataclass
class Jumping:
    """The surfer's matrix ``d P^T + (d w a^T + (1 - d) v 1^T)``, dangling nodes marked by a.

    ``walk`` is ``d P^T``; ``landing`` is where dangling nodes jump (w), None where their mass
    leaks away and only the walk itself is meant; ``teleport`` is v.
    """

    walk: Pull
    damping: float
    dangling: Floats
    landing: Floats | None
    teleport: Floats

    symmetric = False

    @property
    def size(self) -> int:
        """All nodes."""
        return self.walk.n

    @property
    def visits(self) -> int:
        """Edges of one product."""
        return self.walk.stored

    def apply(self, x: Floats, watch: Watch) -> Floats:
        """``B x``."""
        y = self.walk.apply(x, watch)
        if self.landing is not None:
            y += (self.damping * float((self.dangling * x).sum())) * self.landing
            y += ((1 - self.damping) * float(x.sum())) * self.teleport
        return y

    def rounding(self, x: Floats, watch: Watch) -> Floats:
        """A share of ``|B| |x|``; sums over all nodes are pairwise, in blocks of 128."""
        units = UNIT * (self.walk.rows.degrees / 4 + _ROW + 64)
        return units * self.apply(np.abs(x), watch)


@dataclass
class Doubled:
    """``[[0, A], [A^T, 0]]``: its eigenvalues are the singular values of A, with both signs."""

    out: Pull
    into: Pull

    symmetric = True

    @property
    def size(self) -> int:
        """Every node as a hub and as an authority."""
        return 2 * self.out.n

    @property
    def visits(self) -> int:
        """Edges of one product."""
        return self.out.stored + self.into.stored

    def apply(self, x: Floats, watch: Watch) -> Floats:
        """``B x``."""
        n = self.out.n
        return np.concatenate(
            (self.out.apply(x[n:], watch), self.into.apply(np.ascontiguousarray(x[:n]), watch))
        )

    def rounding(self, x: Floats, watch: Watch) -> Floats:
        """A share of ``|B| |x|``."""
        degrees = np.concatenate((self.out.rows.degrees, self.into.rows.degrees))
        return UNIT * (degrees / 4 + _ROW) * self.apply(np.abs(x), watch)
