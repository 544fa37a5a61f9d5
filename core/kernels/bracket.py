"""Brackets of spectral radii (Collatz 1942, Wielandt 1950), component by component."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

UNIT = 2.0**-53
_LEAST = 1e-290  # an entry that underflows would leave the bracket open for good


@kernel()
def ratios(offsets, order, firsts, sizes, exactly, product, y, low, high, middle):  # type: ignore[no-untyped-def]
    """Narrow ``[low, high]`` of every component by ``product / y`` on its nodes, rounding included.

    Component c has the nodes ``order[firsts[c] : firsts[c] + sizes[c]]``.  ``exactly`` says that
    products are compensated sums (16 u); plain sums of k terms are off by at most (k / 4 + 8) u
    of themselves (four partial sums).  ``middle`` becomes the middle of this step's own bracket.
    """
    one = np.uint64(1)
    for c in range(len(firsts)):
        least, most = np.inf, 0.0
        for k in range(np.uint64(firsts[c]), np.uint64(firsts[c] + sizes[c])):
            i = np.uint64(order[k])
            ratio = product[i] / y[i]
            slack = 16.0 * UNIT
            if not exactly:
                slack = UNIT * (np.float64(offsets[i + one] - offsets[i]) / 4.0 + 8.0)
            if ratio != ratio:
                least, most = -np.inf, np.inf
                break
            least = min(least, ratio * (1.0 - slack))
            most = max(most, ratio * (1.0 + slack))
        # Both hold at every step, so the best of all steps does.
        low[c] = max(low[c], least)
        high[c] = min(high[c], most)
        middle[c] = (max(least, 0.0) + min(most, 1e300)) / 2.0


@kernel()
def advance(order, firsts, sizes, product, shift, middle, y):  # type: ignore[no-untyped-def]
    """``y = product + shift * middle * y``, scaled so that the largest of every component is 1.

    Returns ``sum |change|`` and ``sum y``.
    """
    moved = total = 0.0
    for c in range(len(firsts)):
        start, end = np.uint64(firsts[c]), np.uint64(firsts[c] + sizes[c])
        top = 0.0
        for k in range(start, end):
            i = np.uint64(order[k])
            top = max(top, product[i] + shift * middle[c] * y[i])
        for k in range(start, end):
            i = np.uint64(order[k])
            value = (product[i] + shift * middle[c] * y[i]) / top
            if not value > _LEAST:
                value = _LEAST
            value = min(value, 1.0)
            moved += abs(value - y[i])
            total += value
            y[i] = value
    return moved, total
