"""Anderson mixing of the sweeps of one stage."""

from __future__ import annotations

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage


class Mixing:
    """Extrapolates from the last three sweeps; see :mod:`kingpost.core.solvers.linear`."""

    def __init__(self, stage: Stage, order: Order, x: Floats, threads: int) -> None:
        self._order, self._base, self._threads = order, stage.low, threads
        self._pieces = [block for step in stage.steps for block in step if block[0] < block[1]]
        rows = stage.high - stage.low
        self._before: Floats = x[order[stage.low : stage.high]]
        self._f, self._g = np.zeros((3, rows)), np.zeros((3, rows))
        self._sums = [0.0, 0.0, 0.0]
        self._kept = 0

    def mix(self, x: Floats, scale: Floats, z: Floats) -> None:
        """Take the sweep that ended in ``x`` into account; move x, and z = scale x of all lanes."""
        from kingpost.core.kernels.mixing import extrapolate, record

        new = self._kept % 3
        one, two = (new - 1) % 3, (new - 2) % 3
        totals = np.zeros(6)
        for sums in each(
            lambda block: record(
                self._order, self._base, *block, x, self._before, self._f, self._g, new, one, two
            ),
            self._pieces,
            self._threads,
        ):
            totals += sums
        self._sums[new] = float(totals[5])
        self._kept += 1
        s, t = self._factors(totals)
        total = self._sums[new] * (1 - s - t) + s * self._sums[one] + t * self._sums[two]
        if not 0.2 < total / (self._sums[new] or 1.0) < 1e4:
            s = t = 0.0  # a wild guess: go on from the plain sweep
        each(
            lambda block: extrapolate(
                self._order, self._base, *block, x, self._before, self._g, new, one, two,
                s, t, scale, z, len(z),
            ),
            self._pieces,
            self._threads,
        )  # fmt: skip

    def _factors(self, totals: Floats) -> tuple[float, float]:
        """Least-squares weights of the last one or two differences."""
        a, b, c, p, q = (float(value) for value in totals[:5])
        if self._kept < 2 or a <= 0.0:
            return 0.0, 0.0
        determinant = a * c - b * b
        if self._kept < 3 or determinant <= 1e-12 * a * c:
            return p / a, 0.0
        return (p * c - q * b) / determinant, (a * q - b * p) / determinant
