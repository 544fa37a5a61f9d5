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
def reach_on(offsets, neighbours, order, low, high, live):  # type: ignore[no-untyped-def]
    """Mark the rows ``order[low:high]`` that something live gives to; returns how many were new."""
    one = np.uint64(1)
    new = 0
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        if live[i]:
            continue
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        while e < end:
            if live[neighbours[e]]:
                live[i] = True
                new += 1
                break
            e += one
    return new


@kernel()
def cuts(offsets, order, low, high, cost, row, ends):  # type: ignore[no-untyped-def]
    """Write where ranges of ``order[low:high]`` end that cost about ``cost``; returns how many.

    A row costs its entries and ``row``; one that costs more than a range does is not cut.
    """
    one = np.uint64(1)
    found = 0
    total, mark = np.int64(0), np.int64(cost)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        total += offsets[i + one] - offsets[i] + row
        if total >= mark or k + one == np.uint64(high):
            ends[found] = k + one
            found += 1
            mark = (total // cost + 1) * cost
    return found


@kernel()
def entries(offsets, order, low, high):  # type: ignore[no-untyped-def]
    """Number of entries in the rows ``order[low:high]``."""
    one = np.uint64(1)
    total = np.int64(0)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        total += offsets[i + one] - offsets[i]
    return total


@kernel()
def copy_rows(order, low, high, origin, target):  # type: ignore[no-untyped-def]
    """``target[i] = origin[i]`` for the nodes ``order[low:high]``."""
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        target[i] = origin[i]


@kernel()
def given_to(offsets, neighbours, weights, order, low, high, values, totals):  # type: ignore[no-untyped-def]
    """Add ``weight * values[row]`` of all edges into the rows ``order[low:high]`` to their givers'
    totals; ``values`` of length 1 stands for a constant.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant = len(values) == 1
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        value = values[zero] if constant else values[i]
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        while e < end:
            totals[neighbours[e]] += value if weights is None else weights[e] * value
            e += one


@kernel()
def row_totals(offsets, weights, low, high, totals):  # type: ignore[no-untyped-def]
    """Sum the weights of every row ``low..high``, rounded once; was all whole, nothing rounded?"""
    one, two = np.uint64(1), np.uint64(2)
    whole = True
    for i in range(np.uint64(low), np.uint64(high)):
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        a = b = 0.0
        exact = True
        while e + one < end:
            a += weights[e]
            b += weights[e + one]
            exact &= (weights[e] == np.floor(weights[e])) & (
                weights[e + one] == np.floor(weights[e + one])
            )
            e += two
        if e < end:
            a += weights[e]
            exact &= weights[e] == np.floor(weights[e])
        exact &= a + b < 9007199254740992.0  # 2^53
        whole &= exact
        if exact:
            totals[i] = a + b
            continue
        e = np.uint64(offsets[i])
        total = spill = 0.0
        while e < end:
            w = weights[e]
            after = total + w
            back = after - total
            spill += (total - (after - back)) + (w - back)
            total = after
            e += one
        totals[i] = total + spill
    return whole


@kernel()
def renumber(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, order, place, moved, low, high, near, heavy, diagonal
):
    """Copy the rows ``order[low:high]`` to where ``moved`` (offsets) says, naming nodes by place.

    ``heavy`` takes the weights; where it is empty a weight w is w entries instead.
    ``diagonal[k]`` becomes the weight from row k to itself; returns how many rows have any.
    """
    one = np.uint64(1)
    repeat = len(heavy) == 0
    found = 0
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        to = np.uint64(moved[k])
        loops = 0.0
        while e < end:
            j = np.uint64(neighbours[e])
            if j == i:
                loops += 1.0 if weights is None else weights[e]
            if weights is None:
                near[to] = place[j]
                to += one
            elif repeat:
                for _ in range(np.uint64(weights[e])):
                    near[to] = place[j]
                    to += one
            else:
                near[to] = place[j]
                heavy[to] = weights[e]
                to += one
            e += one
        diagonal[k] = loops
        found += loops > 0.0
    return found


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
