"""Sets of nodes as rows of bits: who leads to whom, and at how many steps.

``WORDS`` words of 64 bits make one row, a cache line: 512 members of a set at a time.  Unsigned
indices throughout, as in the other kernels.
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

WORDS = 8
WIDTH = 64 * WORDS  # members of one block


@kernel()
def ones(word):  # type: ignore[no-untyped-def]
    """Number of set bits (in parallel within the word; Knuth, TAOCP 7.1.3)."""
    word = word - ((word >> np.uint64(1)) & np.uint64(0x5555555555555555))
    word = (word & np.uint64(0x3333333333333333)) + (
        (word >> np.uint64(2)) & np.uint64(0x3333333333333333)
    )
    word = (word + (word >> np.uint64(4))) & np.uint64(0x0F0F0F0F0F0F0F0F)
    return (word * np.uint64(0x0101010101010101)) >> np.uint64(56)


@kernel()
def condense(offsets, neighbours, group, order, low, high, at, mark, starts, givers):  # type: ignore[no-untyped-def]
    """Distinct groups that give to each group, itself left out, for ``order[low:high]``.

    ``order`` lists the nodes group by group, ascending; ``mark`` (uint32, groups) must be filled
    with a number no group has before the first call.  Writes ``starts[g + 1]`` and, unless
    ``givers`` is empty, the givers from position ``at`` on.  Returns the new ``at``.
    """
    one = np.uint64(1)
    at = np.uint64(at)
    write = len(givers) > 0
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        g = np.uint64(group[i])
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        while e < end:
            h = np.uint64(group[np.uint64(neighbours[e])])
            e += one
            if h == g or mark[h] == g:
                continue
            mark[h] = g
            if write:
                givers[at] = h
            at += one
        starts[g + one] = at
    return at


@kernel()
def group_sums(order, starts, values, sums, positive):  # type: ignore[no-untyped-def]
    """Compensated sum (Neumaier 1974) and number of positive values of every group."""
    for g in range(np.uint64(len(sums))):
        total = lost = 0.0
        count = 0
        for k in range(np.uint64(starts[g]), np.uint64(starts[g + np.uint64(1)])):
            value = values[np.uint64(order[k])]
            grown = total + value
            if abs(total) >= abs(value):
                lost += (total - grown) + value
            else:
                lost += (value - grown) + total
            total = grown
            if value > 0.0:
                count += 1
        sums[g] = total + lost
        positive[g] = count


@kernel()
def between(starts, givers, weights, total, low, high):  # type: ignore[no-untyped-def]
    """Ends of what the groups upstream of each group may weigh, in one pass; low, high (groups,).

    At least its givers, or what any giver has; at most what they all have, counted apart.
    """
    for g in range(np.uint64(len(weights))):
        direct = most = apart = 0.0
        for e in range(np.uint64(starts[g]), np.uint64(starts[g + np.uint64(1)])):
            h = np.uint64(givers[e])
            direct += weights[h]
            most = max(most, weights[h] + low[h])
            apart += weights[h] + high[h]
        low[g] = max(direct, most)
        high[g] = max(low[g], min(apart, total - weights[g]))


@kernel()
def gather(starts, givers, low, high, first, column, base, table, bits, live, found):  # type: ignore[no-untyped-def]
    """Which members of one block lead to each of the groups ``low..high``; rows in order.

    The block's members are the groups with ``column`` from ``base`` to ``base + WIDTH - 1``,
    the first of them group ``first``: no row before it holds any.  Adds to ``found[g]`` the number
    of members upstream of g or, where ``table`` (8 * WORDS, 256) is not empty, what they weigh:
    ``table[b, v]`` is the weight of the set bits of byte b of a row, when it reads v.
    """
    zero, one = np.uint64(0), np.uint64(1)
    weighed = len(table) > 0
    for g in range(np.uint64(low), np.uint64(high)):
        for w in range(np.uint64(WORDS)):
            bits[g, w] = zero
        any_bit = False
        e = np.uint64(starts[g])
        end = np.uint64(starts[g + one])
        while e < end:
            h = np.uint64(givers[e])
            e += one
            if h >= first and live[h]:
                any_bit = True
                for w in range(np.uint64(WORDS)):
                    bits[g, w] |= bits[h, w]
        if any_bit:
            if weighed:
                total = 0.0
                for w in range(np.uint64(WORDS)):
                    word = bits[g, w]
                    for b in range(np.uint64(8)):
                        byte = (word >> (b * np.uint64(8))) & np.uint64(255)
                        total += table[w * np.uint64(8) + b, byte]
                found[g] += total
            else:
                count = zero
                for w in range(np.uint64(WORDS)):
                    count += ones(bits[g, w])
                found[g] += np.float64(count)
        own = np.int64(column[g]) - np.int64(base)
        if column[g] >= 0 and own >= 0 and own < WIDTH:
            any_bit = True
            bits[g, np.uint64(own >> 6)] |= one << np.uint64(own & 63)
        live[g] = any_bit


# Places in the state of a search: phase, position, rows of the wave, rows met, level, visits.
PHASE, AT, WAVE, MET, LEVEL, VISITS = 0, 1, 2, 3, 4, 5


@kernel()
def search(  # type: ignore[no-untyped-def]
    offsets,
    neighbours,
    state,
    budget,
    seen,
    wave,
    fresh,
    front,
    near,
    marked,
    units,
    score,
    lost,
    residue,
):
    """Breadth-first search from up to ``WIDTH`` sources at once, for about ``budget`` edges.

    Row v of ``seen``, ``wave``, ``fresh`` (uint64, n by WORDS) holds which sources have reached v,
    did so on the level before, and do so now; ``front[:state[WAVE]]`` are the nodes with a row
    in ``wave`` that is not zero.  When a node is met by c sources at level l it scores c / l, by
    compensated sums into ``score`` and ``lost``, and ``c * units[l]`` modulo 2^64 into ``residue``
    for levels that ``units`` knows.  Returns whether the search is through; otherwise call it
    again.
    """
    zero, one = np.uint64(0), np.uint64(1)
    while budget > 0:
        at = state[AT]
        if state[PHASE] == 0:
            size = state[WAVE]
            met = state[MET]
            while at < size and budget > 0:
                u = np.uint64(front[np.uint64(at)])
                e = np.uint64(offsets[u])
                end = np.uint64(offsets[u + one])
                budget -= np.int64(end - e) + 1
                state[VISITS] += np.int64(end - e)
                while e < end:
                    v = np.uint64(neighbours[e])
                    e += one
                    for w in range(np.uint64(WORDS)):
                        fresh[v, w] |= wave[u, w]
                    if not marked[v]:
                        marked[v] = True
                        near[np.uint64(met)] = v
                        met += 1
                for w in range(np.uint64(WORDS)):
                    wave[u, w] = zero
                at += 1
            state[AT], state[MET] = at, met
            if at < size:
                return False
            state[PHASE], state[AT], state[WAVE] = 1, 0, 0
            state[LEVEL] += 1
        else:
            level = state[LEVEL]
            size = state[WAVE]
            met = state[MET]
            while at < met and budget > 0:
                v = np.uint64(near[np.uint64(at)])
                at += 1
                budget -= 1
                marked[v] = False
                count = zero
                for w in range(np.uint64(WORDS)):
                    new = fresh[v, w] & ~seen[v, w]
                    seen[v, w] |= new
                    wave[v, w] = new
                    fresh[v, w] = zero
                    count += ones(new)
                if count != zero:
                    front[np.uint64(size)] = v
                    size += 1
                    value = np.float64(count) / np.float64(level)
                    grown = score[v] + value
                    if score[v] >= value:
                        lost[v] += (score[v] - grown) + value
                    else:
                        lost[v] += (value - grown) + score[v]
                    score[v] = grown
                    if level < len(units):
                        residue[v] += count * units[np.uint64(level)]
            state[AT], state[WAVE] = at, size
            if at < met:
                return False
            state[PHASE], state[AT], state[MET] = 0, 0, 0
            if size == 0:
                return True
    return False
