"""Pairwise outcomes from compressed rows: who met whom, and what each made of the other."""

from __future__ import annotations

import math

import numpy as np

from kingpost.core.kernels._compile import kernel

LAPLACE, SKEW, LOGISTIC = 0, 1, 2
FAR = 600.0  # margins beyond so many units count as so many: e^-600 is still a number


@kernel()
def meet(  # type: ignore[no-untyped-def]
    won_offsets, winners_over, won_weights, lost_offsets, losers_to, lost_weights, low, high,
    itself, starts, neighbours, won, lost,
):  # fmt: skip
    """Whom each of the nodes ``low..high`` met, from the rows of its points won and lost.

    Both rows are ascending; a node is not counted as meeting itself, but stands among its own
    neighbours where ``itself`` and it met anybody.  With empty ``neighbours`` only
    ``starts[i + 1]`` is set, to their number; otherwise they are written from ``starts[i]`` on,
    with the points won against and lost to each.
    """
    one = np.uint64(1)
    write = len(neighbours) > 0
    for i in range(np.uint64(low), np.uint64(high)):
        e, e_end = np.uint64(won_offsets[i]), np.uint64(won_offsets[i + one])
        f, f_end = np.uint64(lost_offsets[i]), np.uint64(lost_offsets[i + one])
        at = np.uint64(starts[i]) if write else np.uint64(0)
        met = 0
        placed = not itself
        while e < e_end or f < f_end:
            j = np.uint64(0xFFFFFFFF)
            if e < e_end:
                j = np.uint64(winners_over[e])
            if f < f_end and np.uint64(losers_to[f]) < j:
                j = np.uint64(losers_to[f])
            mine = theirs = 0.0
            if e < e_end and np.uint64(winners_over[e]) == j:
                mine = 1.0 if won_weights is None else won_weights[e]
                e += one
            if f < f_end and np.uint64(losers_to[f]) == j:
                theirs = 1.0 if lost_weights is None else lost_weights[f]
                f += one
            if j == i:
                continue
            if write:
                if j > i and not placed:
                    placed = True
                    neighbours[at] = i
                    won[at] = lost[at] = 0.0
                    at += one
                neighbours[at] = j
                won[at] = mine
                lost[at] = theirs
                at += one
            met += 1
        if write:
            if met > 0 and not placed:
                neighbours[at] = i
                won[at] = lost[at] = 0.0
        else:
            starts[i + one] = met + (1 if itself and met > 0 else 0)


@kernel()
def linked(won, lost, kind, unit):  # type: ignore[no-untyped-def]
    """The share of a vote that ``won`` points against ``lost`` earn; between 0 and 1.

    Written so that no difference of nearly equal numbers is taken.
    """
    if kind == LOGISTIC:
        margin = min(max((won - lost) / unit, -FAR), FAR)
        if margin >= 0.0:
            return 1.0 / (1.0 + math.exp(-margin))
        grown = math.exp(margin)
        return grown / (1.0 + grown)
    whole = won + lost + 2.0
    share = (won + 1.0) / whole
    if kind == LAPLACE:
        return share
    if won >= lost:
        return 0.5 + 0.5 * math.sqrt((won - lost) / whole)
    return share / (1.0 + math.sqrt((lost - won) / whole))


@kernel()
def link(starts, neighbours, low, high, kind, unit, diagonal, games, won, lost, given, opponents):  # type: ignore[no-untyped-def]
    """Turn points into entries, in place of ``won``, for the rows ``low..high``.

    ``given[i]`` becomes the sum of what i gives to those it met, itself included: of the entries
    in its column.  With ``games`` each row is divided by the number of nodes met (Keener 1993).
    """
    one = np.uint64(1)
    for i in range(np.uint64(low), np.uint64(high)):
        start, end = np.uint64(starts[i]), np.uint64(starts[i + one])
        total = slip = 0.0
        met = 0
        for e in range(start, end):
            if np.uint64(neighbours[e]) == i:
                back = diagonal
            else:
                back = linked(lost[e], won[e], kind, unit)
                met += 1
            # Compensated (Neumaier 1974); terms are positive.
            grown = total + back
            if total >= back:
                slip += (total - grown) + back
            else:
                slip += (back - grown) + total
            total = grown
        given[i] = total + slip
        opponents[i] = met
        for e in range(start, end):
            if np.uint64(neighbours[e]) == i:
                value = diagonal
            else:
                value = linked(won[e], lost[e], kind, unit)
            won[e] = value / met if games else value


@kernel()
def code(won, lost, low, high):  # type: ignore[no-untyped-def]
    """Hash of the pair in place of ``won``, both given by their bits (uint64)."""
    for e in range(np.uint64(low), np.uint64(high)):
        value = won[e] * np.uint64(0x9E3779B97F4A7C15)
        value = (value ^ (value >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
        value += lost[e]
        value = (value ^ (value >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
        won[e] = value ^ (value >> np.uint64(31))
