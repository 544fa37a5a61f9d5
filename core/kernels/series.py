"""Terms of a power series applied to one vector or to a block of vectors.

Row sums are blocked: 128 terms are added plainly, the partial sums by compensated summation.
For nonnegative terms the sum is then off by at most ``ROW_UNITS`` units in the last place of
itself, however long the row is, at the speed of a plain sum.
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

# Per row: 127 plain additions of one block at the most, 2 for the compensated ones, 3 for the
# products of weight, scale and vector and 3 for what follows; doubled would be 270, the sum of
# these is 135, and a little is left for the terms of second order.
ROW_UNITS = 140.0
_BLOCK = 128


@kernel()
def blocked_sum(neighbours, weights, start, end, z):  # type: ignore[no-untyped-def]
    """Sum of ``weight * z[neighbour]`` over one row, terms nonnegative."""
    one, block = np.uint64(1), np.uint64(128)
    total = spill = 0.0
    while start < end:
        stop = min(start + block, end)
        part = 0.0
        if weights is None:
            while start < stop:
                part += z[neighbours[start]]
                start += one
        else:
            while start < stop:
                part += weights[start] * z[neighbours[start]]
                start += one
        after = total + part
        spill += (total - after) + part if total >= part else (part - after) + total
        total = after
    return total + spill


@kernel()
def next_term(offsets, neighbours, weights, low, high, divisor, floor, z, v, fresh, x):  # type: ignore[no-untyped-def]
    """``fresh = (B v) / divisor`` and ``x += fresh`` in the rows ``low..high``; z is scale * v.

    Returns ``max (B v)_i / v_i`` over rows with ``fresh > 0`` (infinity where v is zero there),
    and the sums of fresh and x.  Positive values below ``floor`` are raised to it, so that no
    ratio is ever taken of denormal numbers.
    """
    one = np.uint64(1)
    ratio = made = mass = 0.0
    for i in range(np.uint64(low), np.uint64(high)):
        total = blocked_sum(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z
        )
        value = total / divisor
        if value > 0.0:
            ratio = max(ratio, total / v[i] if v[i] > 0.0 else np.inf)
            value = max(value, floor)
        fresh[i] = value
        made += value
        x[i] += value
        mass += x[i]
    return ratio, made, mass
