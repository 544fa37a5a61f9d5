"""A positive vector that an M-matrix keeps positive: what turns any residual into a bound.

With ``w > 0`` and ``M w >= h > 0`` (M = I - B, B nonnegative) every solution of ``M x = b``
obeys ``|x - y| <= max_i(|r_i| / h_i) w`` for any y with residual r, whatever the signs of b and y;
the same holds for ``M' x = b`` whenever ``|M'^-1| <= M^-1``, as for negative alpha.  That such a w
exists also proves that the spectral radius of B is below 1.
"""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT, Residual
from kingpost.core.graph import Floats, Flow
from kingpost.core.operators import Pull
from kingpost.core.result import Iteration, Stop
from kingpost.core.solvers.linear import Solution, System, solve
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

_LEFT = 0.35  # of an entry's last movement is left in its residual, on the bench graphs
_HELD = 64.0  # units of rounding; a row solved once is known to 18 and a little


@dataclass(frozen=True)
class Guard:
    """``w``, a lower bound ``kept`` of M w, and the rows ``live`` they hold for; shape (n,)."""

    w: Floats
    kept: Floats
    live: NDArray[np.bool_]
    sweeps: int
    edge_visits: int

    def factor(self, reach: Floats) -> float:
        """c with ``|x - y| <= c w`` for a residual of magnitude ``reach`` (shape (n,))."""
        if not self.live.any():
            return 0.0
        return float((reach[self.live] / self.kept[self.live]).max()) * (1 + 1e-15)


def find_guard(
    matrix: Pull,
    structure: Structure,
    flow: Flow,
    g: Floats,
    *,
    max_sweeps: int,
    watch: Watch,
    ignore: int | None = None,
    start: Floats | None = None,
) -> Generator[Iteration, None, Guard | None]:
    """Solve ``M w = g`` only so far that ``M w >= g / 2`` where ``g > 0``; None if that fails.

    ``ignore`` is a node whose row does not count (its column in ``matrix`` must be zero), ``start``
    a first w.  Where
    w spans so many decades that its own rounding drowns g, g is raised there to what can be
    held: what a guard is in proportion to is a matter of taste, that it is one is not.
    """
    guard, found = yield from _guard(matrix, structure, flow, g, max_sweeps, watch, ignore, start)
    if guard is None and found.stop is Stop.STALLED and np.isfinite(found.x).all():
        least = np.where(np.broadcast_to(g > 0, matrix.n), _HELD * UNIT * np.abs(found.x), 0.0)
        raised = np.maximum(g, least)
        guard, _ = yield from _guard(
            matrix, structure, flow, raised, max_sweeps, watch, ignore, start
        )
    return guard


def _guard(
    matrix: Pull,
    structure: Structure,
    flow: Flow,
    g: Floats,
    max_sweeps: int,
    watch: Watch,
    ignore: int | None,
    start: Floats | None,
) -> Generator[Iteration, None, tuple[Guard | None, Solution]]:
    live = np.broadcast_to(g > 0, matrix.n).copy()
    if ignore is not None:
        live[ignore] = False

    def judge(w: Floats, r: Residual) -> tuple[float, bool]:
        if not live.any():
            return 0.0, False
        if not (w[live] > 0).all():
            return float("inf"), False
        given = g if len(g) == 1 else g[live]
        return float((r.reach[live] / given).max()), False

    # A bound by entries is to be expected from the movement of entries once w is nearly right in
    # amount, and only then.
    near = start is not None and bool(live.any())
    gain = 100.0  # sums move by at least that much less, on the bench graphs
    if start is not None and near:
        gain = _LEFT * float((start[live] / (g if len(g) == 1 else g[live])).max())
    found: Solution = yield from solve(
        System(matrix, g, structure, flow),
        judge,
        tol=0.5,
        max_sweeps=max_sweeps,
        watch=watch,
        start=start,
        gain=gain,
        by_entry=near,
    )
    if not found.bound <= 0.5:
        return None, found
    kept = np.broadcast_to(g - found.residual.reach, matrix.n)
    return Guard(found.x, kept, live, found.sweeps, found.edge_visits), found
