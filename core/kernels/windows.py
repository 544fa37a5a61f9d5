"""Mean, spread and ranks within windows of an ordered array."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

_FEW = 48  # members up to which counting beats sorting the window


@kernel()
def moments(x, reach, left, right, low, high, out):  # type: ignore[no-untyped-def]
    """Per window d in [low, high): mean and standard deviation of ``x[left[d]:right[d]]``, mean
    and root mean square of ``reach`` there, mean of ``|x|``; into ``out[d]``, shape (., 5)."""
    for d in range(low, high):
        a, b = left[d], right[d]
        size = b - a
        total = 0.0
        weight = 0.0
        blur = 0.0
        square = 0.0
        for j in range(a, b):
            total += x[j]
            weight += abs(x[j])
            blur += reach[j]
            square += reach[j] * reach[j]
        mean = total / size
        spread = 0.0
        for j in range(a, b):
            gap = x[j] - mean
            spread += gap * gap
        out[d, 0] = mean
        out[d, 1] = np.sqrt(spread / size)
        out[d, 2] = blur / size
        out[d, 3] = np.sqrt(square / size)
        out[d, 4] = weight / size


@kernel()
def ranks(lows, highs, start, end, left, right, low, high, first, last):  # type: ignore[no-untyped-def]
    """Ranks, from 1, that each member of window d may truly have among the window.

    The members are ``[start[d], end[d])``, a part of ``[left[d], right[d])``; ``lows`` and
    ``highs`` are the ends of the scores' intervals.  ``first`` is one more than the number
    surely above, ``last`` the number that is not surely below.
    """
    for d in range(low, high):
        a, b = left[d], right[d]
        if end[d] - start[d] <= _FEW:
            for i in range(start[d], end[d]):
                above = 0
                below = 0
                for j in range(a, b):
                    if lows[j] > highs[i]:
                        above += 1
                    if highs[j] < lows[i]:
                        below += 1
                first[i] = 1 + above
                last[i] = (b - a) - below
        else:
            bottoms = np.sort(lows[a:b])
            tops = np.sort(highs[a:b])
            for i in range(start[d], end[d]):
                first[i] = 1 + (b - a) - np.searchsorted(bottoms, highs[i], side="right")
                last[i] = (b - a) - np.searchsorted(tops, lows[i], side="left")
