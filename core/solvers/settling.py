"""The Perron vector of one irreducible block by Gauss-Seidel sweeps at an estimated root.

Every row is solved in turn for its own entry, ``x_i = (B x)_i / rho``, using the newest values of
the others; fixed points are exactly the eigenvectors.  One sweep in the order most edges run
carries a change through the whole block, and entries many decades below the largest come
out right to all digits.  Between sweeps rho is the quotient ``l B x / l x`` with l what every node
gives away, and ``l B`` one step of the left power iteration on that: the nearer l is to the
left eigenvector, the less of x's error enters rho, and with rho nearly right the sweeps converge
as those of a linear system do, in some graphs in half as many as with rho read off one row.
Once two sweeps in a row gain little, they are mixed as in :mod:`kingpost.core.solvers.linear`.
Nothing is claimed of the result: the bracket of :mod:`kingpost.core.solvers.perron` judges it.

Reference: Varga, "Matrix Iterative Analysis", 1962, ch. 3 (regular splittings of M-matrices).
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull, given_back
from kingpost.core.solvers.mixing import SLOW, Mixing
from kingpost.core.solvers.stages import swept_stage
from kingpost.core.solvers.sweeping import Weighing, sweep
from kingpost.core.watch import Watch

_SWEEPS = 40
_STILL = 1e-15  # a sweep that moves less than this share of the mass moves nothing
_TAIL = 2  # sweeps after that, for entries too small to show in the sum


class Settling:
    """Sweeps over ``nodes`` from the vector ``y``, positive there; shape (n,).

    They end once no entry moves by more than ``enough`` of itself, or nothing moves any more;
    with ``shared`` by more than ``enough`` over the ``amount``.
    ``gives`` (n,) is a first left vector, by default what every node gives to ``nodes``.  ``x``
    is the iterate, zero elsewhere; ``left`` the left vector once known; ``sound`` says whether x
    is still positive and finite.
    """

    def __init__(
        self,
        matrix: Pull,
        nodes: Order,
        y: Floats,
        watch: Watch,
        enough: float = 0.0,
        gives: Floats | None = None,
        shared: bool = False,
    ) -> None:
        self.matrix, self.watch = matrix, watch
        self.enough, self.shared = enough, shared
        self.nodes: Order = nodes
        self.x: Floats = np.zeros(matrix.n)
        self.x[nodes] = y[nodes] / y[nodes].max()
        self.stage = swept_stage(matrix.rows, nodes, 0, len(nodes))
        self._gives = gives
        self.left: Floats | None = None
        # The largest root of a row alone, too near to which nothing is divided by the difference.
        self.loop = float(matrix.loops[nodes].max()) if len(matrix.loops) else 0.0
        self.sound = True

    def run(self) -> Iterator[float]:
        """Sweep until hardly anything moves; yields the share of the mass that each sweep moved.

        Raises:
            Interrupted: if the watch was cancelled; ``x`` is then between two sweeps.
        """
        left = self._given(np.ones(1)) if self._gives is None else self._gives
        left = left / float(left[self.nodes].max())
        self.left = given = self._given(left)
        z = np.tile(self.x * self.matrix.scale, (self.stage.lanes, 1))
        # Not by BLAS, whose sums depend on its number of threads.
        root = float((given * self.x).sum()) / float((left * self.x).sum())
        weighing, nothing, loops = Weighing(left, given), np.zeros(1), self.matrix.loops
        mixing: Mixing | None = None
        least, earlier, worse, still, slow = np.inf, np.inf, 0, 0, 0
        for _ in range(_SWEEPS):
            if not (np.isfinite(root) and root > 0):
                self.sound = False
                return
            swept = sweep(
                self.matrix, nothing, self.nodes, self.stage, z, self.x, self.watch,
                root=root, loops=loops if root > 1.001 * self.loop else loops[:0],
                weighing=weighing,
            )  # fmt: skip
            root = swept.image / swept.weight if swept.weight > 0 else np.nan
            share = swept.moved / swept.mass if swept.mass > 0 else np.inf
            yield share
            if swept.farthest <= self.enough and (
                not self.shared or swept.farthest * self.amount <= self.enough
            ):
                break
            worse = worse + 1 if not share < least else 0
            slow = slow + 1 if share > SLOW * earlier else 0
            least, earlier = min(least, share), share
            still = still + 1 if share < _STILL else 0
            if still > _TAIL or (worse > 2 and least < 1e-12):
                break
            if not np.isfinite(share) or worse > 6:
                self.sound = False
                return
            if mixing is None and slow > 1:
                mixing = Mixing(self.stage, self.nodes, self.x, self.watch.threads)
            elif mixing is not None and not still:
                mixing.mix(self.x, self.matrix.scale, z)
        inside = self.x[self.nodes]
        self.sound = bool(np.isfinite(inside).all() and (inside > 0).all())

    @property
    def amount(self) -> float:
        """How many times as much circulates in all as runs through the node most runs through.

        About the factor between what is known of rho and what can be proven of the scores: the
        guard of :mod:`kingpost.core.solvers.pinned` is nearly as many times the vector.
        """
        assert self.left is not None
        through = self.left[self.nodes] * self.x[self.nodes]
        return float(through.sum() / through.max())

    def _given(self, values: Floats) -> Floats:
        """``B^T values``, shape (n,), of values in the block alone."""
        rows, nodes = self.matrix.rows, self.nodes
        return given_back(rows, nodes, 0, len(nodes), values, self.watch) * self.matrix.scale
