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
    """Sum of ``weight * z[neighbour]`` over one row.

    The last one to three entries are read without a branch (an index past the end is the last
    one's, and counts as zero): whether a row's length is a multiple of four cannot be guessed.
    """
    one, two, three, four = np.uint64(1), np.uint64(2), np.uint64(3), np.uint64(4)
    if start == end:
        return 0.0
    last = end - one
    a = b = c = d = 0.0
    if weights is None:
        while start + four <= end:
            a += z[neighbours[start]]
            b += z[neighbours[start + one]]
            c += z[neighbours[start + two]]
            d += z[neighbours[start + three]]
            start += four
    else:
        while start + four <= end:
            a += weights[start] * z[neighbours[start]]
            b += weights[start + one] * z[neighbours[start + one]]
            c += weights[start + two] * z[neighbours[start + two]]
            d += weights[start + three] * z[neighbours[start + three]]
            start += four
    p, q, r = _last_three(neighbours, weights, start, last, z)
    return ((a + p) + (b + q)) + ((c + r) + d)


@kernel()
def _last_three(neighbours, weights, start, last, z):  # type: ignore[no-untyped-def]
    """The terms at ``start``, ``start + 1`` and ``start + 2``; zero beyond ``last``."""
    one, two = np.uint64(1), np.uint64(2)
    e, f, g = min(start, last), min(start + one, last), min(start + two, last)
    p, q, r = z[neighbours[e]], z[neighbours[f]], z[neighbours[g]]
    if weights is not None:
        p *= weights[e]
        q *= weights[f]
        r *= weights[g]
    return (
        p if start <= last else 0.0,
        q if start + one <= last else 0.0,
        r if start + two <= last else 0.0,
    )


@kernel()
def gauss_seidel(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, order, low, high, b, root, scale, loops, left, given, z, x
):
    """One sweep in place over ``order[low:high]`` of ``root x = b + B x``; what it tells.

    ``loops[i]`` is ``B[i, i]`` (or ``loops`` is empty where there is none): a self-loop is
    solved for, not iterated.  Returns ``sum |change|``, ``sum |x|``, the largest change of an entry
    relative to itself, and the sums of ``left * x`` and ``given * x``; ``left`` of length 1
    stands for a constant, an empty ``given`` for zeros.
    """
    zero, one = np.uint64(0), np.uint64(1)
    constant, even = len(b) == 1, len(left) == 1
    looped, weighed = len(loops) > 0, len(given) > 0
    inverse = 1.0 / root
    moved = mass = farthest = weight = image = 0.0
    weights_so_far = images_so_far = 0.0
    for k in range(np.uint64(low), np.uint64(high)):
        if k & np.uint64(255) == zero:
            # Sums of sums, for differences of these are to be had to the last digit or two.
            weight, weights_so_far = weight + weights_so_far, 0.0
            image, images_so_far = image + images_so_far, 0.0
        i = np.uint64(order[k])
        new = row_sum(neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), z)
        new += b[zero] if constant else b[i]
        old = x[i]
        if looped and loops[i] != 0.0:
            new = (new - loops[i] * old) / (root - loops[i])
        else:
            new *= inverse
        change = abs(new - old)
        moved += change
        mass += abs(new)
        # Written so that a NaN counts, and a division is rare.
        if not change <= farthest * abs(new):
            farthest = change / abs(new)
        if weighed:
            weights_so_far += (left[zero] if even else left[i]) * new
            images_so_far += given[i] * new
        x[i] = new
        z[i] = new * scale[i]
    return moved, mass, farthest, weight + weights_so_far, image + images_so_far


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
    """One row: the sum, by fours that are added up without loss, and the sum of magnitudes.

    Four terms are added as a tree (2 u of their magnitudes at most), the fours by compensated
    summation (two-sum; Knuth 1969).
    """
    one, two, three, four = np.uint64(1), np.uint64(2), np.uint64(3), np.uint64(4)
    if start == end:
        return 0.0, 0.0
    last = end - one
    total = spill = whole = 0.0
    while start + four <= end:
        p, q = z[neighbours[start]], z[neighbours[start + one]]
        r, s = z[neighbours[start + two]], z[neighbours[start + three]]
        if weights is not None:
            p *= weights[start]
            q *= weights[start + one]
            r *= weights[start + two]
            s *= weights[start + three]
        start += four
        whole += (abs(p) + abs(q)) + (abs(r) + abs(s))
        four_terms = (p + q) + (r + s)
        after = total + four_terms
        back = after - total
        spill += (total - (after - back)) + (four_terms - back)
        total = after
    p, q, r = _last_three(neighbours, weights, start, last, z)
    whole += (abs(p) + abs(q)) + abs(r)
    rest = (p + q) + r
    after = total + rest
    back = after - total
    spill += (total - (after - back)) + (rest - back)
    return after + spill, whole


@kernel()
def pull_exactly(offsets, neighbours, weights, order, low, high, z, y, size):  # type: ignore[no-untyped-def]
    """As :func:`pull_rows`, by compensated summation, with ``size[i] = sum |terms|``.

    The computed ``y[i]`` is off the exact sum of the rounded products by at most
    ``u |y[i]| + 2 u size[i] + O(n u^2) size[i]`` (Ogita, Rump and Oishi, "Accurate sum and dot
    product", SIAM J. Sci. Comput. 26, 2005, Proposition 4.5, for the sum of the fours), for any
    length of row met in practice.
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
