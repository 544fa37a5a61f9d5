"""Closed walks counted from many nodes at once: products of a sparse matrix with a block.

``WIDE`` columns side by side make two cache lines of float64 per row.  Everything is nonnegative:
sums are blocked as in :mod:`kingpost.core.kernels.series`, so that they are off by at most
``ROW_UNITS`` units in the last place, however long they are.
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

WIDE = 16
_BLOCK = 128


@kernel()
def advance(offsets, neighbours, weights, low, high, factor, block, live, out, lives):  # type: ignore[no-untyped-def]
    """``out = factor A block`` in the rows ``low..high``; blocks have shape (n, WIDE).

    ``live`` marks the rows of ``block`` that are not all zero; ``lives`` is set for ``out``.
    """
    one = np.uint64(1)
    part = np.zeros(WIDE)
    total = np.zeros(WIDE)
    spill = np.zeros(WIDE)
    for i in range(np.uint64(low), np.uint64(high)):
        e, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        met = 0
        for k in range(WIDE):
            part[k] = total[k] = spill[k] = 0.0
        while e < end:
            j = np.uint64(neighbours[e])
            if live[j]:
                weight = 1.0 if weights is None else weights[e]
                for k in range(WIDE):
                    part[k] += weight * block[j, k]
                met += 1
                if met % _BLOCK == 0:
                    for k in range(WIDE):
                        grown = total[k] + part[k]
                        if total[k] >= part[k]:
                            spill[k] += (total[k] - grown) + part[k]
                        else:
                            spill[k] += (part[k] - grown) + total[k]
                        total[k] = grown
                        part[k] = 0.0
            e += one
        lives[i] = met > 0
        for k in range(WIDE):
            grown = total[k] + part[k]
            if total[k] >= part[k]:
                spill[k] += (total[k] - grown) + part[k]
            else:
                spill[k] += (part[k] - grown) + total[k]
            out[i, k] = (grown + spill[k]) * factor


@kernel()
def inner(one_block, live_one, other, live_other, low, high, sums):  # type: ignore[no-untyped-def]
    """Add the inner products of the columns, over the rows ``low..high``, to ``sums`` (2, WIDE).

    The first row of ``sums`` holds totals, the second what they rounded off.
    """
    part = np.zeros(WIDE)
    met = 0
    for i in range(np.uint64(low), np.uint64(high)):
        last = np.int64(i) == high - 1
        if live_one[i] and live_other[i]:
            for k in range(WIDE):
                part[k] += one_block[i, k] * other[i, k]
            met += 1
        if met == _BLOCK or last:
            met = 0
            for k in range(WIDE):
                total = sums[0, k]
                grown = total + part[k]
                if total >= part[k]:
                    sums[1, k] += (total - grown) + part[k]
                else:
                    sums[1, k] += (part[k] - grown) + total
                sums[0, k] = grown
                part[k] = 0.0


@kernel()
def weigh(left, live_left, right, live_right, w, low, high, tops, sums):  # type: ignore[no-untyped-def]
    """Raise ``tops`` to the columns' ``max right / w``; add their ``left . w`` to ``sums``."""
    for i in range(np.uint64(low), np.uint64(high)):
        if live_right[i]:
            for k in range(WIDE):
                tops[k] = max(tops[k], right[i, k] / w[i])
        if live_left[i]:
            for k in range(WIDE):
                sums[k] += left[i, k] * w[i]
