"""From sorted intervals to ranges of ranks in one pass; intervals that do not fall are told."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def falls(values):  # type: ignore[no-untyped-def]
    """Whether no value is above the one before it (a NaN counts as falling)."""
    risen = 0
    for i in range(1, len(values)):
        risen += values[i] > values[i - 1]
    return risen == 0


@kernel()
def rank_ranges(low, high, lows, highs, tied, first, last, budget):  # type: ignore[no-untyped-def]
    """Ranks from 1 that intervals may have; ``lows`` and ``highs`` are their ends, falling.

    ``first`` is one more than the intervals surely above, ``last`` n less those surely below;
    positions joined by ``tied[i]`` (i with i + 1) share the widest range of them.

    Intervals come nearly in order, so each place is looked for from the one before.  Returns
    whether that took no more than ``budget`` steps; if not, the ranges are unfinished.
    """
    n = len(low)
    above, beside = 0, 0
    start = 0
    least, most = n, 0
    for i in range(n):
        while above < n and lows[np.uint64(above)] > high[i]:
            above += 1
            budget -= 1
        while above > 0 and lows[np.uint64(above - 1)] <= high[i]:
            above -= 1
            budget -= 1
        while beside < n and highs[np.uint64(beside)] >= low[i]:
            beside += 1
            budget -= 1
        while beside > 0 and highs[np.uint64(beside - 1)] < low[i]:
            beside -= 1
            budget -= 1
        if budget < 0:
            return False
        least, most = min(least, 1 + above), max(most, beside)
        if not tied[i]:
            for k in range(np.uint64(start), np.uint64(i + 1)):
                first[k] = least
                last[k] = most
            start = i + 1
            least, most = n, 0
    return True


@kernel()
def share_ranges(tied, first, last):  # type: ignore[no-untyped-def]
    """Give the positions joined by ``tied`` the widest range of them, in place."""
    n = len(tied)
    start = 0
    for i in range(n):
        if tied[i]:
            continue
        least, most = first[start], last[start]
        for k in range(start + 1, i + 1):
            least, most = min(least, first[k]), max(most, last[k])
        for k in range(start, i + 1):
            first[k] = least
            last[k] = most
        start = i + 1
