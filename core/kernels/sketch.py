"""Counters that estimate the size of a set in little memory, and how they spread along edges."""

from __future__ import annotations

import math

import numpy as np

from kingpost.core.kernels._compile import kernel

LANES = 32  # least elements kept side by side: two cache lines of float32


@kernel()
def scrambled(value):  # type: ignore[no-untyped-def]
    """A 64-bit hash of a 64-bit number (SplitMix64; Steele, Lea, Flood 2014)."""
    value = np.uint64(value) + np.uint64(0x9E3779B97F4A7C15)
    value = (value ^ (value >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    value = (value ^ (value >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return value ^ (value >> np.uint64(31))


@kernel()
def least(starts, givers, weights, feeds, low, high, key, rows, sums):  # type: ignore[no-untyped-def]
    """Least exponential ranks upstream of the groups ``low..high``, ``LANES`` at a time.

    Each group with weight W draws, in every lane, a rank from the exponential distribution of
    rate W; ``key`` (uint64) names the lanes.  Adds to ``sums[g]`` the least ranks among all groups
    upstream of g, itself left out.  Rows (float32, groups by LANES) of groups that feed none are
    not kept.
    """
    one = np.uint64(1)
    for g in range(np.uint64(low), np.uint64(high)):
        e = np.uint64(starts[g])
        end = np.uint64(starts[g + one])
        for k in range(np.uint64(LANES)):
            rows[g, k] = np.float32(np.inf)
        while e < end:
            h = np.uint64(givers[e])
            e += one
            for k in range(np.uint64(LANES)):
                rows[g, k] = min(rows[g, k], rows[h, k])
        if np.uint64(starts[g]) < end:
            total = 0.0
            for k in range(np.uint64(LANES)):
                total += np.float64(rows[g, k])
            sums[g] += total
        if feeds[g] and weights[g] > 0.0:
            seed = scrambled(np.uint64(g) ^ key)
            for k in range(np.uint64(LANES)):
                bits = scrambled(seed + k) >> np.uint64(11)
                uniform = (np.float64(bits) + 0.5) / 9007199254740992.0
                rank = np.float32(-math.log(uniform) / weights[g])
                rows[g, k] = min(rows[g, k], rank)


@kernel()
def settle(starts, givers, weights, low, high, sums, kept, total, found):  # type: ignore[no-untyped-def]
    """Estimates from sums of ``kept`` least ranks, drawn with weights relative to ``total``.

    A group with one giver has exactly that giver's weight more upstream than the giver; every
    other estimate is kept within what is known for certain, ``low`` and ``high``.
    """
    one = np.uint64(1)
    for g in range(np.uint64(len(found))):
        start, end = np.uint64(starts[g]), np.uint64(starts[g + one])
        if end == start + one:
            h = np.uint64(givers[start])
            found[g] = found[h] + weights[h]
        elif end > start:
            found[g] = (kept - 1) / sums[g] * total
        found[g] = min(max(found[g], low[g]), high[g])


@kernel()
def enter(low, high, key, log2m, rows):  # type: ignore[no-untyped-def]
    """Counters that hold their own node only: ``rows`` (uint8, n by 2^log2m) must be zero."""
    shift = np.uint64(64 - log2m)
    for i in range(np.uint64(low), np.uint64(high)):
        bits = scrambled(np.uint64(i) ^ key)
        rest = bits << np.uint64(log2m)
        rank = 1
        while rank <= 64 - log2m and not (rest >> np.uint64(63)):
            rest <<= np.uint64(1)
            rank += 1
        rows[i, bits >> shift] = rank


@kernel()
def size_of(row, powers):  # type: ignore[no-untyped-def]
    """Number of distinct elements a counter has met, for the whole range without a table.

    The estimator of Ertl (arXiv 1702.01284, 2017, sec. 4) for counters of Flajolet, Fusy,
    Gandouet, Meunier (2007); ``powers[k]`` is 2^-k, and 0 for k = 0.
    """
    empty = 0
    rest = 0.0
    for k in range(np.uint64(len(row))):
        rest += powers[row[k]]
        if row[k] == 0:
            empty += 1
    m = np.float64(len(row))
    if empty == len(row):
        return 0.0
    x = empty / m
    sigma, y = x, 1.0
    while x > 0.0:
        x *= x
        before = sigma
        sigma += x * y
        y += y
        if sigma == before:
            break
    return 0.5 / math.log(2.0) * m * m / (rest + m * sigma)


@kernel()
def grow(  # type: ignore[no-untyped-def]
    offsets, neighbours, low, high, level, rows, grown, moved, moving, powers, top, ball, score
):
    """Balls of radius ``level`` from those one smaller, in the rows ``low..high``.

    A node's counter takes the greatest of its own and its neighbours' registers; only nodes
    with a neighbour ``moved`` on the level before are read.  ``score`` gains the growth of
    ``ball`` over ``level``.  Returns how many nodes moved, and the edges read.
    """
    one = np.uint64(1)
    width = np.uint64(rows.shape[1])
    count = visits = 0
    for i in range(np.uint64(low), np.uint64(high)):
        start, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        moving[i] = False
        live = False
        e = start
        while e < end:
            if moved[np.uint64(neighbours[e])]:
                live = True
                break
            e += one
        if not live:
            if moved[i]:
                for k in range(width):
                    grown[i, k] = rows[i, k]
            continue
        for k in range(width):
            grown[i, k] = rows[i, k]
        while e < end:  # nothing new comes from the neighbours before the first that moved
            j = np.uint64(neighbours[e])
            e += one
            if moved[j]:
                visits += 1
                for k in range(width):
                    grown[i, k] = max(grown[i, k], rows[j, k])
        changed = False
        for k in range(width):
            if grown[i, k] != rows[i, k]:
                changed = True
                break
        if not changed:
            continue
        moving[i] = True
        count += 1
        if level > 1:  # the ball of radius 1 is known exactly
            size = min(max(size_of(grown[i], powers), ball[i]), top)
            score[i] += (size - ball[i]) / level
            ball[i] = size
    return count, visits
