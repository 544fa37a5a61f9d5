"""Sweeps over compressed rows: Gauss-Seidel, pull products, residuals.

Everywhere ``x = b + B x`` with ``B[i, j] = weight(j -> i) * scale[j]`` and ``z = scale * x``; rows
are visited in the order ``order[low:high]``.  ``weights`` is None where every weight is 1.  An
array ``b`` of length 1 stands for a constant.  Indices are unsigned: signed ones cost a branch.
Sums run over four fixed partial sums, so the bits depend on the graph alone.
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def row_sum(neighbours, weights, start, end, z):  # type: ignore[no-untyped-def]
    """Sum of ``weight * z[neighbour]`` over one row."""
    one, four = np.uint64(1), np.uint64(4)
    a = b = c = d = 0.0
    if weights is None:
        while start + four <= end:
            a += z[neighbours[start]]
            b += z[neighbours[start + one]]
            c += z[neighbours[start + one + one]]
            d += z[neighbours[start + one + one + one]]
            start += four
        while start < end:
            a += z[neighbours[start]]
            start += one
    else:
        while start + four <= end:
            a += weights[start] * z[neighbours[start]]
            b += weights[start + one] * z[neighbours[start + one]]
            c += weights[start + one + one] * z[neighbours[start + one + one]]
            d += weights[start + one + one + one] * z[neighbours[start + one + one + one]]
            start += four
        while start < end:
            a += weights[start] * z[neighbours[start]]
            start += one
    return (a + b) + (c + d)


@kernel()
def gauss_seidel(offsets, neighbours, weights, order, low, high, b, scale, loops, z, x):  # type: ignore[no-untyped-def]
    """One sweep in place over ``order[low:high]``; returns ``sum |change|`` and ``sum |x|``.

    ``loops[i]`` is ``B[i, i]`` (or ``loops`` is empty where there is none): a self-loop is
    solved for, not iterated.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant = len(b) == 1
    looped = len(loops) > 0
    moved = mass = 0.0
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        new = row_sum(neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z)
        new += b[zero] if constant else b[i]
        old = x[i]
        if looped and loops[i] != 0.0:
            new = (new - loops[i] * old) / (1.0 - loops[i])
        moved += abs(new - old)
        mass += abs(new)
        x[i] = new
        z[i] = new * scale[i]
    return moved, mass


@kernel()
def substitute(offsets, neighbours, weights, order, low, high, b, scale, loops, z, x):  # type: ignore[no-untyped-def]
    """Solve the rows ``order[low:high]`` once, in order, by compensated sums.

    Exact up to a few roundings a row where no row depends on a later one.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant = len(b) == 1
    looped = len(loops) > 0
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        if looped and loops[i] != 0.0:
            z[i] = 0.0
        new, _ = _compensated(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z
        )
        new += b[zero] if constant else b[i]
        if looped and loops[i] != 0.0:
            new /= 1.0 - loops[i]
        x[i] = new
        z[i] = new * scale[i]


@kernel()
def substitute_deep(offsets, neighbours, weights, order, low, high, b, scale, z, x, depth):  # type: ignore[no-untyped-def]
    """As :func:`substitute` without self-loops, keeping the length of the longest way to each row.

    Where b and B have no negative entry nothing cancels: every row multiplies the relative error
    of what it adds up by at most ``1 + 16 u``, so x is off by ``16 u (depth + 1) x`` at most.
    Returns the greatest depth.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant = len(b) == 1
    deepest = np.uint32(0)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        start, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        new, _ = _compensated(neighbours, weights, start, end, z)
        longest = np.uint32(0)
        while start < end:
            longest = max(longest, np.uint32(depth[neighbours[start]] + np.uint32(1)))
            start += one
        new += b[zero] if constant else b[i]
        x[i] = new
        z[i] = new * scale[i]
        depth[i] = longest
        deepest = max(deepest, longest)
    return deepest


@kernel()
def pull(offsets, neighbours, weights, low, high, z, y):  # type: ignore[no-untyped-def]
    """``y[i] = sum_j weight(j -> i) z[j]`` for rows ``low..high``."""
    for i in range(np.uint64(low), np.uint64(high)):
        y[i] = row_sum(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + np.uint64(1)]), z
        )


@kernel()
def pull_rows(offsets, neighbours, weights, order, low, high, z, y):  # type: ignore[no-untyped-def]
    """``y[i] = sum_j weight(j -> i) z[j]`` for rows ``order[low:high]``."""
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        y[i] = row_sum(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + np.uint64(1)]), z
        )


@kernel()
def _compensated(neighbours, weights, start, end, z):  # type: ignore[no-untyped-def]
    """One row by compensated summation (two-sum; Knuth 1969): the sum, and that of magnitudes."""
    one = np.uint64(1)
    total = other = 0.0
    spill = left = 0.0
    whole = 0.0
    # Two sums side by side: neighbouring terms need not wait for each other.
    while start + one < end:
        a = z[neighbours[start]]
        b = z[neighbours[start + one]]
        if weights is not None:
            a *= weights[start]
            b *= weights[start + one]
        start += one + one
        after = total + a
        back = after - total
        spill += (total - (after - back)) + (a - back)
        total = after
        after = other + b
        back = after - other
        left += (other - (after - back)) + (b - back)
        other = after
        whole += abs(a) + abs(b)
    if start < end:
        a = z[neighbours[start]]
        if weights is not None:
            a *= weights[start]
        after = total + a
        back = after - total
        spill += (total - (after - back)) + (a - back)
        total = after
        whole += abs(a)
    after = total + other
    back = after - total
    spill += (total - (after - back)) + (other - back)
    total = after
    spill += left
    return total + spill, whole


@kernel()
def pull_exactly(offsets, neighbours, weights, order, low, high, z, y, size):  # type: ignore[no-untyped-def]
    """As :func:`pull_rows`, by compensated summation, with ``size[i] = sum |terms|``.

    The computed ``y[i]`` is off the exact sum of the rounded products by at most
    ``u |y[i]| + O(n u^2) size[i]`` (Ogita, Rump and Oishi, "Accurate sum and dot product",
    SIAM J. Sci. Comput. 26, 2005, Proposition 4.5), for any length of row met in practice.
    """
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        y[i], size[i] = _compensated(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z
        )


@kernel()
def push(offsets, neighbours, weights, low, high, z, y):  # type: ignore[no-untyped-def]
    """``y[v] += weight(u -> v) z[u]`` for rows u in ``low..high`` of the outgoing adjacency.

    The other way round from every solver: what checks a result never runs the code that
    made it.
    """
    one = np.uint64(1)
    for u in range(np.uint64(low), np.uint64(high)):
        value = z[u]
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        if value != 0.0:
            while e < end:
                y[neighbours[e]] += value if weights is None else value * weights[e]
                e += one
