"""From scores and their bound to an order: who is first, what is tied, what is proven."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats
from kingpost.core.result import Bound

PROVEN, OPEN, TIED, UNRANKED = 0, 1, 2, 3


@dataclass(frozen=True)
class Standing:
    """The order of n scores, by position 0..n-1 from the highest.

    Attributes:
        order: node number at each position, shape (n,), int64; equal scores by node number,
            which is the order of their ids.
        rail: how each position stands against the next one below, shape (n,), uint8:
            ``PROVEN``, ``OPEN`` (not proven), ``TIED`` (exactly equal), ``UNRANKED`` (the score
            cannot be told from zero).
        first, last: the range of ranks (from 1) each position may truly have, ties sharing
            theirs, shape (n,), int64.
        proven: largest K such that ranks 1..K are proven; exact ties count as proven.
    """

    order: NDArray[np.int64]
    rail: NDArray[np.uint8]
    first: NDArray[np.int64]
    last: NDArray[np.int64]
    proven: int

    @cached_property
    def position(self) -> NDArray[np.int64]:
        """Position of each node, shape (n,): the inverse of ``order``."""
        inverse = np.empty_like(self.order)
        inverse[self.order] = np.arange(len(self.order))
        return inverse

    def range_of(self, node: int) -> tuple[int, int]:
        """First and last rank the node may truly have."""
        at = int(self.position[node])
        return int(self.first[at]), int(self.last[at])


def stand(
    scores: Floats,
    bound: Bound,
    exact_zero: NDArray[np.bool_] | None = None,
    symmetry: NDArray[np.int64] | None = None,
) -> Standing:
    """Order ``scores`` (shape (n,)) and say what of the order is proven under ``bound``.

    Position i is proven above i + 1 when the lowest value any of the positions 0..i may have
    exceeds the highest value any later one may have.  Two neighbours are tied when they are
    proven equal: both zero by structure (``exact_zero``), in the same class of ``symmetry``
    (nodes whose equations are the same), or equal under an exact bound.
    """
    n = len(scores)
    if n == 0:
        none = np.empty(0, dtype=np.int64)
        return Standing(none, np.empty(0, dtype=np.uint8), none, none, 0)
    if np.isnan(scores[0]) and np.isnan(scores).all():
        order = np.arange(n)
        whole = np.ones(n, dtype=np.int64)
        return Standing(order, np.full(n, UNRANKED, np.uint8), whole, np.full(n, n), 0)

    low, high = bound.interval(scores)
    zero = np.zeros(n, dtype=bool) if exact_zero is None else exact_zero
    low[zero], high[zero] = 0.0, 0.0
    order = _ordered(scores, symmetry)
    low, high = low[order], high[order]
    floor = np.minimum.accumulate(low)  # the least any of the positions so far may be
    ceiling = np.maximum.accumulate(high[::-1])[::-1]  # the most any from here on may be

    apart = np.empty(n, dtype=bool)
    apart[:-1] = floor[:-1] > ceiling[1:]
    apart[-1] = True
    tied = _tied(scores[order], zero[order], low == high, symmetry, order)
    settled = apart | tied
    open_at = np.flatnonzero(~settled)
    # A tie is proven as a whole or not at all: nodes equal to one that may have to give way
    # may have to give way too.
    group = np.flatnonzero(np.concatenate(([True], ~tied[:-1])))
    proven = n if len(open_at) == 0 else int(group[group <= open_at[0]][-1])

    rail = np.where(apart, PROVEN, OPEN).astype(np.uint8)
    rail[tied] = TIED
    unsure = (low <= 0.0) & (high >= 0.0) & (low < high)
    rail[unsure & ~tied] = UNRANKED
    first, last = _ranges(low, high, tied)
    return Standing(order, rail, first, last, proven)


def _ordered(scores: Floats, symmetry: NDArray[np.int64] | None) -> NDArray[np.int64]:
    if symmetry is None:
        return falling_order(scores)
    # Members of one class may differ in the last bits; they are brought together at the place
    # of their highest, so that a tie is never split by rounding.
    best = np.full(int(symmetry.max()) + 1, -np.inf)
    np.maximum.at(best, symmetry, scores)
    keys = best[symmetry]
    order = falling_order(keys)
    ordered, group = keys[order], symmetry[order]
    if ((ordered[1:] == ordered[:-1]) & (group[1:] != group[:-1])).any():
        return np.lexsort((np.arange(len(scores)), symmetry, -keys))
    return order


def falling_order(values: Floats) -> NDArray[np.int64]:
    """Positions of ``values`` from the highest, equal ones by position.

    The same as a stable argsort, several times faster: an unstable one is, and the positions
    inside runs of equal values are sorted afterwards as whole numbers.
    """
    order = np.argsort(-values)
    ordered = values[order]
    run = np.zeros(len(values), dtype=np.uint64)
    np.cumsum(ordered[1:] != ordered[:-1], out=run[1:])
    keys = np.sort(run << np.uint64(32) | order.astype(np.uint64))
    return (keys & np.uint64(0xFFFFFFFF)).astype(np.int64)


def _tied(
    ordered: Floats,
    zero: NDArray[np.bool_],
    point: NDArray[np.bool_],
    symmetry: NDArray[np.int64] | None,
    order: NDArray[np.int64],
) -> NDArray[np.bool_]:
    same = np.zeros(len(order), dtype=bool)
    same[:-1] = zero[:-1] & zero[1:]
    same[:-1] |= (ordered[:-1] == ordered[1:]) & point[:-1] & point[1:]
    if symmetry is not None:
        group = symmetry[order]
        same[:-1] |= group[:-1] == group[1:]
    return same


def _ranges(
    low: Floats, high: Floats, tied: NDArray[np.bool_]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Ranks from 1: one more than those surely above; n less those surely below."""
    n = len(low)
    lows, highs = np.sort(low), np.sort(high)
    first = 1 + n - np.searchsorted(lows, high, side="right")
    last = n - np.searchsorted(highs, low, side="left")
    start = np.concatenate(([True], ~tied[:-1]))
    group = np.cumsum(start) - 1
    heads = np.flatnonzero(start)
    first = np.minimum.reduceat(first, heads)[group]
    last = np.maximum.reduceat(last, heads)[group]
    return first.astype(np.int64), last.astype(np.int64)
