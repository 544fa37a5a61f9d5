"""Row sums of whole numbers, which need no compensation to be exact."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def whole_sums(offsets, weights, sums):  # type: ignore[no-untyped-def]
    """Sum every row of positive ``weights`` into ``sums``; True if that is exact.

    It is where all weights are whole numbers and no sum reaches 2^53; otherwise ``sums`` is
    unfinished.
    """
    one = np.uint64(1)
    for i in range(np.uint64(len(sums))):
        start, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        total = 0.0
        broken = 0
        while start < end:
            weight = weights[start]
            total += weight
            broken += weight != np.floor(weight)
            start += one
        if broken > 0 or not total < 9007199254740992.0:
            return False
        sums[i] = total
    return True
