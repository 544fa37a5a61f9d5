"""Sharpening the Perron vector of one component by Gauss-Seidel sweeps with one node held fixed.

With ``x_p = 1`` and ``rho = (B x)_p``, every other row is solved in turn for its own entry,
``x_i = (B x)_i / rho``, using the newest values of the others.  Fixed points are exactly the
eigenvectors; one sweep in the order most edges run carries a change through the whole
component, so that entries many decades below the largest come out right to all digits.
Sweeps are mixed as in :mod:`kingpost.core.solvers.linear`.  Nothing is claimed of the result:
the bracket of :mod:`kingpost.core.solvers.perron` judges it.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull
from kingpost.core.solvers.mixing import Mixing
from kingpost.core.solvers.stages import swept_stage
from kingpost.core.solvers.sweeping import sweep
from kingpost.core.watch import Watch

_SWEEPS = 40
STILL = 1e-15  # a sweep that moves less than this share of the mass moves nothing
_TAIL = 2  # sweeps after that, for entries too small to show in the sum


class PinnedSweeps:
    """Sweeps over ``nodes`` from the positive vector ``y`` (shape (n,), zero elsewhere).

    They end once a sweep moves less than ``enough`` of the mass.
    ``x`` is the iterate; ``sound`` says whether it is still positive and finite.
    """

    def __init__(
        self, matrix: Pull, nodes: Order, y: Floats, watch: Watch, enough: float = STILL
    ) -> None:
        self.watch = watch
        self.matrix, self.enough = matrix, max(enough, STILL)
        self.pin = int(nodes[int(np.argmax(y[nodes]))])
        self.x: Floats = y / y[self.pin]
        self.nodes: Order = nodes[nodes != self.pin]
        self.stage = swept_stage(matrix.rows, self.nodes, 0, len(self.nodes))
        lanes = max(len(step) for step in self.stage.steps)
        self.z = np.zeros((lanes, matrix.n))
        self.sound = True

    def run(self) -> Iterator[float]:
        """Sweep until hardly anything moves; yields the share of the mass that each sweep moved.

        Raises:
            Interrupted: if the watch was cancelled; ``x`` is then between two sweeps.
        """
        mixing = Mixing(self.stage, self.nodes, self.x, self.watch.threads)
        zero = np.zeros(1)
        least, worse, still = np.inf, 0, 0
        for _ in range(_SWEEPS):
            rho = self._root()
            if not (np.isfinite(rho) and rho > 0):
                self.sound = False
                return
            matrix = self.matrix.scaled(1.0 / rho)
            self.z[:] = self.x * matrix.scale
            moved, mass = sweep(matrix, zero, self.nodes, self.stage, self.z, self.x, self.watch)
            share = moved / mass if mass > 0 else np.inf
            yield share
            worse = worse + 1 if not share < least else 0
            least = min(least, share)
            still = still + 1 if share < self.enough else 0
            if still > (_TAIL if self.enough == STILL else 0) or (worse > 6 and least < 1e-13):
                break
            if not np.isfinite(share) or worse > 6:
                self.sound = False
                return
            if not still:
                mixing.mix(self.x, matrix.scale, self.z)
        inside = self.x[self.nodes]
        self.sound = bool(np.isfinite(inside).all() and (inside > 0).all())

    def _root(self) -> float:
        near, weights = self.matrix.rows.row(self.pin)
        return float((weights * self.matrix.scale[near] * self.x[near]).sum())
