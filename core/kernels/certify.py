"""Residuals with bounds of their rounding, and what certificates ask of them, in one pass each."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel
from kingpost.core.kernels.sweep import _compensated

UNIT = 2.0**-53


@kernel()
def residual_rows(offsets, neighbours, weights, order, low, high, b, z, x, value, slack):  # type: ignore[no-untyped-def]
    """Residual ``b + B x - x`` of the rows ``order[low:high]``, by compensated sums.

    ``slack[i]`` bounds its rounding: ``12 u |B||x| + 6 u (|x| + |b|)``, see certify.Residual.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant = len(b) == 1
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        given = b[zero] if constant else b[i]
        product, size = _compensated(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z
        )
        value[i] = (product - x[i]) + given
        slack[i] = UNIT * (12.0 * size + 6.0 * (abs(x[i]) + abs(given)))


@kernel()
def rounding_rows(order, low, high, b, x, value, slack):  # type: ignore[no-untyped-def]
    """The same for rows that were solved once: nothing is left but rounding."""
    zero = np.uint64(0)
    constant = len(b) == 1
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        given = b[zero] if constant else b[i]
        value[i] = 0.0
        slack[i] = UNIT * (18.0 * abs(x[i]) + 6.0 * abs(given))


@kernel()
def reach_sum(value, slack):  # type: ignore[no-untyped-def]
    """``sum |value| + slack`` over four fixed partial sums."""
    sums = np.zeros(4)
    for i in range(len(value)):
        sums[i & 3] += abs(value[i]) + slack[i]
    return (sums[0] + sums[1]) + (sums[2] + sums[3])


@kernel()
def largest_ratio(b, y, value, slack):  # type: ignore[no-untyped-def]
    """Largest ``(|r| + slack) / (b - r - slack)`` where y > 0.

    Infinity where the divisor is not positive, NaN where some y is negative (or NaN), 0 where no
    y is positive.
    """
    constant = len(b) == 1
    worst = 0.0
    for i in range(len(y)):
        if y[i] > 0.0:
            given = b[0] if constant else b[i]
            least = (given - value[i]) - slack[i] * (1.0 + 8.0 * UNIT)
            if not least > 0.0:
                worst = np.inf
            else:
                worst = max(worst, (abs(value[i]) + slack[i]) / least)
        elif y[i] != 0.0:
            return np.nan
    return worst
