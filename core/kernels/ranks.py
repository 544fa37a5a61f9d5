"""Counting the pairs of a sequence that stand the wrong way round, by merge sort."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

RUN = 32  # entries that are sorted by insertion before merging begins


@kernel()
def sort_runs(values, low, high):  # type: ignore[no-untyped-def]
    """Sort every run of 32 entries of ``values[low:high]``; returns the inversions removed."""
    found = 0
    for start in range(low, high, RUN):
        end = min(start + RUN, high)
        for i in range(start + 1, end):
            value = values[np.uint64(i)]
            k = i - 1
            while k >= start and values[np.uint64(k)] > value:
                values[np.uint64(k + 1)] = values[np.uint64(k)]
                k -= 1
            values[np.uint64(k + 1)] = value
            found += i - 1 - k
    return found


@kernel()
def merge_runs(values, into, width, low, high):  # type: ignore[no-untyped-def]
    """Merge neighbouring sorted runs of ``width`` within ``[low, high)`` of ``values`` to ``into``.

    ``low`` must be a multiple of ``2 width``.  Returns the number of inversions between runs.
    """
    found = 0
    for start in range(low, high, 2 * width):
        middle, end = min(start + width, high), min(start + 2 * width, high)
        i, j, k = start, middle, start
        while i < middle and j < end:
            left, right = values[np.uint64(i)], values[np.uint64(j)]
            if right < left:
                into[np.uint64(k)] = right
                found += middle - i
                j += 1
            else:
                into[np.uint64(k)] = left
                i += 1
            k += 1
        while i < middle:
            into[np.uint64(k)] = values[np.uint64(i)]
            i += 1
            k += 1
        while j < end:
            into[np.uint64(k)] = values[np.uint64(j)]
            j += 1
            k += 1
    return found
