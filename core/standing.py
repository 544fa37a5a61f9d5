"""From scores and their bound to an order: who is first, what is tied, what is proven."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats
from kingpost.core.result import Bound, BoundKind

PROVEN, OPEN, TIED, UNRANKED = 0, 1, 2, 3

_STEPS = 32  # steps a position that looking for its range from the one before may take

Order = NDArray[np.int64]
Mask = NDArray[np.bool_]
Pools = NDArray[np.uint32]
Classes = NDArray[np.int64]


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
    exact_zero: Mask | None = None,
    symmetry: Classes | None = None,
) -> Standing:
    """Order ``scores`` (shape (n,)) and say what of the order is proven under ``bound``.

    Position i is proven above i + 1 when the lowest value any of the positions 0..i may have
    exceeds the highest value any later one may have.  Two neighbours are tied when they are
    proven equal: both zero by structure (``exact_zero``), in the same class of ``symmetry``
    (nodes whose equations are the same), or equal under an exact bound.
    """
    return settle(scores, bound, exact_zero, None if symmetry is None else lambda _: symmetry)


def settle(
    scores: Floats,
    bound: Bound,
    exact_zero: Mask | None = None,
    symmetry: Callable[[Pools | None], Classes | None] | None = None,
) -> Standing:
    """As :func:`stand`, looking for classes only where the bound leaves something open.

    ``symmetry`` gets a number for each node, shape (n,), that nodes proven to have different
    scores do not share; None where the bound is no theorem and proves no such thing.
    """
    n = len(scores)
    if n == 0:
        none = np.empty(0, dtype=np.int64)
        return Standing(none, np.empty(0, dtype=np.uint8), none, none, 0)
    if np.isnan(scores[0]) and np.isnan(scores).all():
        order = np.arange(n)
        whole = np.ones(n, dtype=np.int64)
        return Standing(order, np.full(n, UNRANKED, np.uint8), whole, np.full(n, n), 0)
    line = _Line.of(scores, bound, exact_zero)
    apart, tied = line.apart(), line.tied(None)
    if symmetry is not None and not (apart | tied).all():
        # Equal scores can be told from unproven ones only by why they are equal.
        theorem = bound.kind in (BoundKind.EXACT, BoundKind.COMPONENTWISE, BoundKind.L1)
        classes = symmetry(_pools(line.order, apart) if theorem else None)
        if classes is not None:
            line.gather(scores, bound, exact_zero, classes, apart)
            apart, tied = line.apart(), line.tied(classes)
    return line.standing(apart, tied)


def _pools(order: Order, apart: Mask) -> Pools:
    pools = np.zeros(len(order), dtype=np.uint32)
    pools[order[1:]] = np.cumsum(apart[:-1], dtype=np.uint32)
    return pools


@dataclass
class _Line:
    """Nodes from the highest score down, and the least and most the score of each may be."""

    order: Order
    scores: Floats
    low: Floats
    high: Floats
    zero: Mask | None

    @classmethod
    def of(cls, scores: Floats, bound: Bound, exact_zero: Mask | None) -> _Line:
        order = falling_order(scores)
        ordered = scores[order]
        low, high, zero = _intervals(ordered, order, bound, exact_zero)
        return cls(order, ordered, low, high, zero)

    def apart(self) -> Mask:
        """Positions of which, with all before them, every later one is proven to be below."""
        floor = np.minimum.accumulate(self.low)  # the least any of the positions so far may be
        # The most any from here on may be.
        ceiling = np.maximum.accumulate(self.high[::-1])[::-1]
        found = np.empty(len(floor), dtype=bool)
        found[:-1] = floor[:-1] > ceiling[1:]
        found[-1] = True
        return found

    def tied(self, symmetry: Classes | None) -> Mask:
        """Positions proven equal to the next one."""
        same = np.zeros(len(self.order), dtype=bool)
        point = self.low == self.high
        same[:-1] = (self.scores[:-1] == self.scores[1:]) & point[:-1] & point[1:]
        if self.zero is not None:
            same[:-1] |= self.zero[:-1] & self.zero[1:]
        if symmetry is not None:
            group = symmetry[self.order]
            same[:-1] |= group[:-1] == group[1:]
        return same

    def gather(
        self,
        scores: Floats,
        bound: Bound,
        exact_zero: Mask | None,
        symmetry: Classes,
        apart: Mask,
    ) -> None:
        """Bring the members of each class together, at the place of the highest of them.

        They may differ in the last bits; a tie is not to be split by rounding.  Classes never
        reach over a gap in which everything before is proven above everything after.
        """
        alone = apart.copy()  # with a gap on both sides
        alone[1:] &= apart[:-1]
        at = np.flatnonzero(~alone)
        nodes = np.sort(self.order[at])
        best = np.full(int(symmetry.max()) + 1, -np.inf)
        group = symmetry[nodes]
        np.maximum.at(best, group, scores[nodes])
        order = _by_class(best[group], group)
        self.order[at] = nodes = nodes[order]
        self.scores[at] = scores[nodes]
        low, high, zero = _intervals(self.scores[at], nodes, bound, exact_zero)
        self.low[at], self.high[at] = low, high
        if self.zero is not None and zero is not None:
            self.zero[at] = zero

    def standing(self, apart: Mask, tied: Mask) -> Standing:
        """The order and what is proven of it."""
        n = len(self.order)
        open_at = np.flatnonzero(~(apart | tied))
        # A tie is proven as a whole or not at all: nodes equal to one that may have to give way
        # may have to give way too.
        proven = n
        if len(open_at):
            before = ~tied[: int(open_at[0])]
            proven = int(np.flatnonzero(before)[-1]) + 1 if before.any() else 0
        rail = np.where(apart, np.uint8(PROVEN), np.uint8(OPEN))
        rail[tied] = TIED
        unsure = (self.low <= 0.0) & (self.high >= 0.0) & (self.low < self.high)
        rail[unsure & ~tied] = UNRANKED
        first, last = _ranges(self.low, self.high, tied)
        return Standing(self.order, rail, first, last, proven)


def _intervals(
    ordered: Floats, nodes: Order, bound: Bound, exact_zero: Mask | None
) -> tuple[Floats, Floats, Mask | None]:
    """Ends of the intervals of the scores of ``nodes``, and which are zero by structure."""
    absolute = bound.absolute
    if isinstance(absolute, np.ndarray) and absolute.ndim:
        absolute = absolute[nodes]
    low, high = Bound(bound.kind, bound.value, bound.relative, absolute).interval(ordered)
    if exact_zero is None:
        return low, high, None
    zero = exact_zero[nodes]
    low[zero], high[zero] = 0.0, 0.0
    return low, high, zero


def _by_class(keys: Floats, group: Classes) -> Order:
    """Positions from the highest key, equal keys by class, and within a class by position."""
    order = falling_order(keys)
    ordered, classes = keys[order], group[order]
    new = ordered[1:] != ordered[:-1]
    mixed = ~new & (classes[1:] != classes[:-1])
    if mixed.any():
        # Classes that meet in one score are to stand one after the other.
        run = np.zeros(len(order), dtype=np.int64)
        np.cumsum(new, out=run[1:])
        unsorted = np.zeros(int(run[-1]) + 1, dtype=bool)
        unsorted[run[1:][mixed]] = True
        at = np.flatnonzero(unsorted[run])
        places = order[at]
        order[at] = places[np.lexsort((places, classes[at], run[at]))]
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


def _ranges(
    low: Floats, high: Floats, tied: NDArray[np.bool_]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Ranks from 1: one more than those surely above; n less those surely below."""
    from kingpost.core.kernels.standing import falls, rank_ranges, share_ranges

    n = len(low)
    first, last = np.empty(n, dtype=np.int64), np.empty(n, dtype=np.int64)
    lows = low if falls(low) else np.sort(low)[::-1].copy()
    highs = high if falls(high) else np.sort(high)[::-1].copy()
    if rank_ranges(low, high, lows, highs, tied, first, last, _STEPS * n):
        return first, last
    # Not nearly in order: intervals of very different widths.
    lows, highs = lows[::-1], highs[::-1]
    first[:] = 1 + n - np.searchsorted(lows, high, side="right")
    last[:] = n - np.searchsorted(highs, low, side="left")
    share_ranges(tied, first, last)
    return first, last
