"""Theorems that turn a residual into an error bound, rounding included.

Throughout, ``M = I - B`` with B nonnegative (see :mod:`kingpost.core.operators`), ``M x = b``
exactly, ``y`` is what was computed and ``r = b - M y``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull, cut
from kingpost.core.parallel import each
from kingpost.core.watch import Watch

_PIECE = 1_000_000  # edges certified between two looks at whether to stop

UNIT = 2.0**-53  # unit roundoff of IEEE double precision


@dataclass(frozen=True)
class Residual:
    """``r = b - M y`` as computed, and a bound of its rounding error; shape (n,) each.

    ``slack`` covers, per row, the rounding of scale (3 u), of scale times score (u), of weight
    times that (u), of the compensated sum (3 u), half as much again for safety, and of the two
    last additions, doubled: ``12 u |B||y| + 6 u (|y| + |b|)``.  ``relative`` is set where y was
    solved in one pass without a subtraction: then ``|x - y| <= relative y`` whatever the residual
    says (see ``kernels.sweep.substitute_deep``).
    """

    value: Floats
    slack: Floats
    relative: float | None = None

    def of(self, pick: Callable[[Floats], Floats]) -> Residual:
        """The same residual with its rows put in another order by ``pick``."""
        return Residual(pick(self.value), pick(self.slack), self.relative)

    @property
    def reach(self) -> Floats:
        """The most the exact residual can be, in magnitude."""
        total: Floats = np.abs(self.value) + self.slack
        return total

    @property
    def norm(self) -> float:
        """Bound of ``sum |r|``."""
        from kingpost.core.kernels.certify import reach_sum

        # n additions of nonnegative numbers lose at most a share of n u / 4 of the sum.
        return float(reach_sum(self.value, self.slack)) * (1 + (len(self.value) / 4 + 8) * UNIT)


def residual(
    matrix: Pull,
    b: Floats,
    y: Floats,
    order: Order,
    ranges: list[tuple[int, int]],
    watch: Watch,
) -> Residual:
    """The residual of ``y`` in the rows ``order[low:high]`` of ``ranges``.

    All other rows must have been solved once, by ``kernels.sweep.substitute``, after everything
    they depend on: there the residual is rounding alone and is bounded, not computed.
    """
    from kingpost.core.kernels.certify import residual_rows, rounding_rows

    rows, z = matrix.rows, matrix.scale * y
    value, slack = np.empty(matrix.n), np.empty(matrix.n)
    at = 0
    pieces: list[tuple[int, int]] = []
    for low, high in [*ranges, (matrix.n, matrix.n)]:
        rounding_rows(order, at, low, b, y, value, slack)
        pieces += cut(rows, order, low, high, _PIECE)
        at = high

    def piece(part: tuple[int, int]) -> None:
        watch.check()
        residual_rows(
            rows.offsets, rows.neighbours, rows.weights, order, *part, b, z, y, value, slack
        )

    each(piece, pieces, watch.threads)
    return Residual(value, slack)


def componentwise(b: Floats, y: Floats, r: Residual) -> float:
    """Smallest c such that ``|x - y| <= c y`` in every component; infinity where none is proven.

    M is an M-matrix as soon as some ``y > 0`` has ``M y > 0``; then ``M^-1 >= 0`` and, with
    ``|r| <= c M y``, ``|x - y| <= M^-1 |r| <= c y``.  So the same numbers prove that alpha is
    below 1/rho (Katz) and how far the scores can be off.  Rows where y is zero must be zero
    by structure (nothing is given to them, directly or through others).
    """
    from kingpost.core.kernels.certify import largest_ratio

    c = float(largest_ratio(b, y, r.value, r.slack)) * (1 + 8 * UNIT)
    if np.isnan(c):
        return float("inf")
    return c if r.relative is None else min(c, r.relative)
