"""Residual updates: from a solved ``x = b + B x`` to a system that differs in a few columns.

Column u of B is what node u gives: ``weight(u -> v) * scale[u]`` for each v in its push row.  A
changed system has other scales, nodes that are gone (``blocked``: they give and take nothing)
and edges whose weight is multiplied by a factor (0: gone), named by ``keys = u << 32 | v``,
ascending, for the sources that ``touched`` marks.

``r`` has shape (n, 2): a residual and a bound of what was rounded in it, side by side, so that
an edge costs one visit to memory.  What comes to rest on a blocked node means nothing.
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

UNIT = 2.0**-53


@kernel()
def _factor(keys, factors, key):  # type: ignore[no-untyped-def]
    low, high = 0, len(keys)
    while low < high:
        middle = (low + high) // 2
        if keys[middle] < key:
            low = middle + 1
        else:
            high = middle
    if low < len(keys) and keys[low] == key:
        return factors[low]
    return 1.0


@kernel()
def seed(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, sources, blocked, touched, keys, factors, before, after,
    x, reach, r,
):  # fmt: skip
    """Put ``(B' - B) x`` into ``r``, with a bound of its rounding and of ``|B' - B| reach``.

    ``sources`` are the nodes whose columns changed.  Returns the number of edges read, the sum of
    ``|B' - B| reach``, and the largest sum of a column of ``|B' - B|``.
    """
    visits = 0
    unsure = largest = 0.0
    for u in sources:
        column = 0.0
        for e in range(offsets[u], offsets[u + 1]):
            v = np.int64(neighbours[e])
            if blocked[v]:
                continue
            weight = 1.0 if weights is None else weights[e]
            old = weight * before[u]
            new = 0.0
            if not blocked[u]:
                new = weight * after[u]
                if touched[u]:
                    new *= _factor(keys, factors, (np.int64(u) << 32) | v)
            change = new - old
            step = change * x[u]
            # Rounding: of scale (3 u), product, factor, difference and step, and of the sum.
            size = abs(old) + abs(new)
            wide = abs(change) + 8 * UNIT * size
            r[v, 0] += step
            r[v, 1] += wide * reach[u] + UNIT * (8 * size * abs(x[u]) + abs(r[v, 0]))
            column += wide
        unsure += column * reach[u]
        largest = max(largest, column)
        visits += offsets[u + 1] - offsets[u]
    return visits, unsure, largest


@kernel()
def strengths_of(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, sources, blocked, touched, keys, factors, out
):
    """Strength of the changed rows of ``sources``, each by a compensated sum, into ``out``."""
    for u in sources:
        total = spill = 0.0
        if not blocked[u]:
            for e in range(offsets[u], offsets[u + 1]):
                v = np.int64(neighbours[e])
                if blocked[v]:
                    continue
                term = 1.0 if weights is None else weights[e]
                if touched[u]:
                    term *= _factor(keys, factors, (np.int64(u) << 32) | v)
                after = total + term
                if total >= term:
                    spill += (total - after) + term
                else:
                    spill += (term - after) + total
                total = after
        out[u] = total + spill


@kernel()
def _loop(offsets, neighbours, weights, u):  # type: ignore[no-untyped-def]
    """Weight of the self-loop of u, 0 without one; rows are ascending."""
    low, high = offsets[u], offsets[u + 1]
    while low < high:
        middle = (low + high) // 2
        if neighbours[middle] < u:
            low = middle + 1
        else:
            high = middle
    if low < offsets[u + 1] and np.int64(neighbours[low]) == u:
        return 1.0 if weights is None else weights[low]
    return 0.0


@kernel()
def drain(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, blocked, touched, keys, factors, scale, order, start, floor,
    r, change, loops, budget,
):  # fmt: skip
    """Push, once each and in ``order[start:]``, the nodes whose ``|r|`` is above the floor.

    Pushing a node adds its residual to ``change`` and hands it on to those it gives to; in an
    order along the flow one pass leaves nothing above the floor.  ``floor`` has one entry or one
    a node; ``loops`` tells whether there may be self-loops.  Stops after ``budget`` edges; returns
    the position reached and the edges read.
    """
    one = np.uint64(1)
    constant = len(floor) == 1
    visits = np.int64(0)
    for at in range(start, len(order)):
        u = np.uint64(order[at])
        amount = r[u, 0]
        if not abs(amount) > (floor[0] if constant else floor[u]) or blocked[u]:
            continue
        if visits >= budget:
            return at, visits
        low, high = np.uint64(offsets[u]), np.uint64(offsets[u + one])
        visits += np.int64(high - low) + 1
        held = 0.0
        if loops:
            loop = _loop(offsets, neighbours, weights, np.int64(u)) * scale[u]
            if loop != 0.0:
                if touched[u]:
                    loop *= _factor(keys, factors, (np.int64(u) << 32) | np.int64(u))
                amount /= 1.0 - loop
                # The loop is known to 5 u of itself; what that leaves of the residual stays at u.
                held = 8 * UNIT * (1.0 + loop) * abs(amount)
        change[u] += amount
        given = amount * scale[u]
        e = low
        while e < high:
            v = np.uint64(neighbours[e])
            step = given if weights is None else given * weights[e]
            if touched[u]:
                step *= _factor(keys, factors, (np.int64(u) << 32) | np.int64(v))
            after = r[v, 0] + step
            r[v, 0] = after
            # Rounding: of scale (3 u), of two products and the factor, and of the sum.
            r[v, 1] += UNIT * (8 * abs(step) + abs(after))
            e += one
        r[u, 0] = 0.0  # last: what a self-loop gave back is in the amount already
        r[u, 1] += held + 2 * UNIT * abs(change[u])
    return len(order), visits


@kernel()
def settle(low, high, scores, reach, kept, blocked, r, g, change, spread, y, own):  # type: ignore[no-untyped-def]
    """Rows ``low..high`` of ``y = scores + change`` and of ``own``, what is known of its error.

    Of the residuals that are left (in ``r`` and ``g``, both cleared on the way): returns the sum
    of those of ``r``, bounds included, the sum of ``own``, and the largest ratio of all to what
    the row keeps, infinity where that is not positive or y is not (``kept`` empty: always).
    """
    total = known = worst = 0.0
    for i in range(low, high):
        left = abs(r[i, 0])
        bound = r[i, 1]
        spill = abs(g[i, 0]) + g[i, 1]
        value = scores[i] + change[i]
        wide = reach[i] + max(spread[i], 0.0)
        r[i, 0] = r[i, 1] = g[i, 0] = g[i, 1] = change[i] = spread[i] = 0.0
        if blocked[i]:
            y[i] = own[i] = 0.0
            continue
        y[i] = max(value, 0.0)  # the exact ones are not negative
        own[i] = wide + 4 * UNIT * y[i]
        known += own[i]
        total += left + bound
        least = (kept[i] - left) - bound if len(kept) > 0 else 0.0
        if least > 0.0 and value > 0.0:
            worst = max(worst, (left + spill) / least)
        else:
            worst = np.inf
    return total, known, worst


@kernel()
def rescale(low, high, y, own, kappa, mass, off, whole):  # type: ignore[no-untyped-def]
    """Scores y of sum 1 (up to ``off``) and their errors, in place, in the rows ``low..high``.

    With m = sum(y): ``|y/m - x'/m'| <= |y - x'| / m + x'/m' |m' - m| / m`` and ``|m' - m| <= off``.
    Returns the sum of the errors.
    """
    total = 0.0
    for i in range(low, high):
        x = y[i] / mass
        wide = ((own[i] + kappa * y[i]) + x * off) / (mass - off) + 64 * UNIT * x
        y[i] = x
        own[i] = min(wide, whole)
        total += own[i]
    return total
