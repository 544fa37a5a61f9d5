"""Anderson mixing of the sweeps of one stage."""

from __future__ import annotations

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage

# What is left of the movement, sweep after sweep, from which on mixing pays for the passes over
# vectors that it takes.
SLOW = 0.3
SLOW_BY_ENTRY = 0.8  # where a slow amount of the whole does no harm
_DEPTH = 3  # differences mixed; a fourth saved no sweep on the bench graphs
_LEAP = 1e4  # times the sum of the scores, at most, in one extrapolation
_SUMS = [(0, 1, 2), (1, 3, 4), (2, 4, 5)]  # where kernels.mixing.record puts d_i . d_j


class Mixing:
    """Extrapolates from the last four sweeps; see :mod:`kingpost.core.solvers.linear`."""

    def __init__(self, stage: Stage, order: Order, x: Floats, threads: int) -> None:
        self._order, self._base, self._threads = order, stage.low, threads
        self._pieces = [block for step in stage.steps for block in step if block[0] < block[1]]
        rows = stage.high - stage.low
        self._before: Floats = x[order[stage.low : stage.high]]
        self._f, self._g = np.zeros((4, rows)), np.zeros((4, rows))
        self._totals = np.zeros(4)
        self._kept = 0

    def mix(self, x: Floats, scale: Floats, z: Floats, factor: float = 1.0) -> None:
        """Take the sweep that ended in ``x`` into account; move x, and z = scale x of all lanes.

        ``factor`` multiplies what the sweep ended in first.
        """
        from kingpost.core.kernels.mixing import extrapolate, record

        new = self._kept & 3
        parts = np.zeros((len(self._pieces), 10))
        each(
            lambda k: record(
                self._order, self._base, *self._pieces[k], x, factor, self._before, self._f,
                self._g, new, parts[k],
            ),
            range(len(self._pieces)),
            self._threads,
        )  # fmt: skip
        sums = parts.sum(axis=0)
        self._totals[new] = sums[9]
        factors = np.zeros(_DEPTH)
        depth = min(self._kept, _DEPTH)
        self._kept += 1
        if depth and sums[0] > 0 and np.isfinite(sums).all():
            factors[:depth] = _least_squares(sums, depth)
            past = self._totals[[(new + 3) & 3, (new + 2) & 3, (new + 1) & 3]]
            whole = sums[9] * (1 - factors.sum()) + factors @ past
            growth = whole / (sums[9] or 1.0)
            if growth > _LEAP:  # very near the limit there may be as far to go: in several leaps
                factors *= (_LEAP - 1.0) / (growth - 1.0)
            elif not growth > 0.2:
                factors[:] = 0.0  # a wild guess: go on from the plain sweep
        each(
            lambda block: extrapolate(
                self._order, self._base, *block, x, self._before, self._g, new, *factors,
                scale, z, len(z),
            ),
            self._pieces,
            self._threads,
        )  # fmt: skip


def _least_squares(sums: Floats, depth: int) -> Floats:
    """Weights of the last ``depth`` differences that best cancel the newest change."""
    inner = sums[np.array(_SUMS)][:depth, :depth]
    # Differences shrink by decades from sweep to sweep: compare their directions, not sizes.
    size = np.sqrt(np.diag(inner))
    size[size == 0] = 1.0
    found, *_ = np.linalg.lstsq(
        inner / np.outer(size, size), sums[6 : 6 + depth] / size, rcond=1e-13
    )
    weights: Floats = found / size
    return weights
