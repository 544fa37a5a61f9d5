"""Small loops over compressed rows: diagonals, reachability, moving values between copies."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def diagonal(offsets, neighbours, weights, values):  # type: ignore[no-untyped-def]
    """Write ``A[i, i]`` into ``values`` (by bisection, rows are ascending); returns how many."""
    found = 0
    for i in range(len(values)):
        low, high = offsets[i], offsets[i + 1]
        while low < high:
            middle = (low + high) // 2
            if neighbours[middle] < i:
                low = middle + 1
            else:
                high = middle
        if low < offsets[i + 1] and neighbours[low] == i:
            values[i] = 1.0 if weights is None else weights[low]
            found += 1
    return found


@kernel()
def spread(offsets, neighbours, queue, head, tail, seen, budget):  # type: ignore[no-untyped-def]
    """Breadth-first search in pieces: visit about ``budget`` edges from ``queue[head:tail]``.

    ``seen`` (bool, n) marks nodes ever put into ``queue`` (uint32, n).  Returns the new head
    and tail; done when they are equal.
    """
    one = np.uint64(1)
    while head < tail and budget > 0:
        u = np.uint64(queue[head])
        head += 1
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        budget -= np.int64(end - e) + 1
        while e < end:
            v = np.uint64(neighbours[e])
            if not seen[v]:
                seen[v] = True
                queue[tail] = v
                tail += 1
            e += one
    return head, tail


@kernel()
def copy_rows(order, low, high, origin, target):  # type: ignore[no-untyped-def]
    """``target[i] = origin[i]`` for the nodes ``order[low:high]``."""
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        target[i] = origin[i]


@kernel()
def pull_inside(offsets, neighbours, weights, order, low, high, group, z, y):  # type: ignore[no-untyped-def]
    """As ``pull_rows``, over edges between nodes of the same group only."""
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        g = group[i]
        a = b = c = d = 0.0
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        while e < end:
            j = np.uint64(neighbours[e])
            if group[j] == g:
                # Four partial sums in turn: rounding grows with a quarter of the row's length.
                a, b, c, d = b, c, d, a + (z[j] if weights is None else weights[e] * z[j])
            e += one
        y[i] = (a + b) + (c + d)
