"""``(e^B)_ii`` for a nonnegative matrix B, by the closed walks through each node, with a proof.

With ``r_k = B^k e_i`` and ``l_k = (B^T)^k e_i``, ``(B^(j+k))_ii = l_j . r_k``: K products on each
side give the first 2K + 1 terms of ``sum (B^k)_ii / k!`` and the one after.  For symmetric B both
sides are the same.  All terms are nonnegative, so partial sums are lower ends, and nothing
cancels.  What is left out is bounded by norms: ``(B^(2K+m))_ii = l_K . B^m r_K <= |l_K| |r_K| s^m``
with s no less than the 2-norm of B, hence with ``N = |l_K| |r_K| / (2K)!``

    sum over k > 2K + 1 of (B^k)_ii / k!  <=  N q p / (1 - p),  q = s/(2K+1), p = s/(2K+2) < 1.

Where directions make the 2-norm far greater than the spectral radius, another end is nearer: for
any w > 0 with ``B w <= t w``, ``l_K . B^m r_K <= max (r_K / w) (l_K . w) t^m``, and t can be had
near the spectral radius.  The smaller of both is taken.

Rounding: r_k is off by at most ``k (units + 4) u`` of itself in every component, an inner product
by twice that and its own sum's, and all terms are added up; see :func:`closed_walks`.

The 2-norm is bounded by Collatz's quotient: for any y > 0, ``|B|^2 <= max (B^T B y)_i / y_i``.
"""

from __future__ import annotations

import math
import time
from collections.abc import Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.operators import Pull
from kingpost.core.parallel import each
from kingpost.core.result import Iteration
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

LANES = 2
_PIECE = 200_000  # edges, each with a row of a block, between two looks at the watch
_MOST = 2_000  # products on each side


@dataclass(frozen=True)
class Sides:
    """A matrix by rows and by columns; the same object where it is symmetric."""

    pull: Adjacency
    push: Adjacency
    factor: float

    @property
    def symmetric(self) -> bool:
        """Whether one side serves for both."""
        return self.pull is self.push


def norm_bound(sides: Sides, watch: Watch, steps: int = 40) -> float:
    """A number no less than the 2-norm of ``factor A``, near it where a few power steps settle.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    n = len(sides.pull.offsets) - 1
    scale = np.full(n, sides.factor)
    pull, push = Pull(sides.pull, scale), Pull(sides.push, scale)
    longest = float(max(sides.pull.degrees.max(initial=0), sides.push.degrees.max(initial=0)))
    slack = 1 + UNIT * (longest / 2 + 40)
    y, best = np.ones(n), math.inf
    for _ in range(steps):
        with np.errstate(over="ignore"):
            z = pull.apply(push.apply(y, watch), watch)
            high = float((z / y).max(initial=0.0)) * slack
        moved = high < best * (1 - 1e-3)
        best = min(best, high)
        if not moved or not math.isfinite(best) or best == 0.0:
            break
        y = z + 0.05 * best * y  # no entry dies out
        y = np.maximum(y / y.max(), 1e-200)
    return math.sqrt(best) * (1 + 8 * UNIT)


def weights_bound(sides: Sides, watch: Watch, steps: int = 60) -> tuple[Floats, float]:
    """w > 0 and t with ``factor A w <= t w``, t near the spectral radius; w has shape (n,).

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    n = len(sides.pull.offsets) - 1
    pull = Pull(sides.pull, np.full(n, sides.factor))
    slack = 1 + UNIT * (float(sides.pull.degrees.max(initial=0)) / 2 + 20)
    w = kept = np.ones(n)
    best = math.inf
    for _ in range(steps):
        with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
            z = pull.apply(w, watch)
            high = float((z / w).max(initial=0.0)) * slack
        if not math.isfinite(high):
            break
        if high < best:
            settled = high > best * (1 - 1e-4)
            best, kept = high, w
            if settled:
                break
        # The shift keeps parts with smaller radii, and periodic ones, from dying out.
        w = z + 0.3 * best * w
        w = w / w.max()
        if not (w > 1e-250).all():
            break
    return kept, best


def products_needed(norm: float, tol: float) -> int:
    """Products on each side after which what is left out is surely below ``tol``.

    Taken for a node whose sum is 1 and whose vectors grow as fast as the norm allows; most need
    fewer.
    """
    for k in range(1, _MOST):
        p = norm / (2 * k + 2)
        if p >= 1:
            continue
        size = 2 * k * math.log(norm) - math.lgamma(2 * k + 1) if norm > 0 else -math.inf
        if size + math.log(norm / (2 * k + 1) * p / (1 - p) + 1e-300) < math.log(tol):
            return k
    return _MOST


@dataclass
class Closed:
    """``(e^B)_ii`` of the nodes asked for, so far.

    ``value`` and ``error`` have one entry a node, in the order asked; of those from ``done`` on
    nothing is known yet.  ``overflow`` tells that a sum left the range of double precision.
    """

    value: Floats
    error: Floats
    done: int = 0
    visits: int = 0
    products: int = 0
    overflow: bool = False


def closed_walks(
    sides: Sides,
    nodes: NDArray[np.int64],
    tol: float,
    watch: Watch,
    norm: float | None = None,
) -> Generator[Iteration, None, Closed]:
    """The diagonal of ``e^(factor A)`` at ``nodes``, each to ``tol`` of itself if rounding allows.

    ``norm`` is a bound of the 2-norm of ``factor A``, worked out where it is not known.
    Sums take the same order for any number of threads.  Cancelled, it returns what it has.
    """
    from kingpost.core.kernels.closed import WIDE

    began = time.perf_counter()
    found = Closed(np.ones(len(nodes)), np.full(len(nodes), np.inf))
    blocks = -(-len(nodes) // WIDE)
    weights = None
    try:
        if norm is None:
            norm = norm_bound(sides, watch)
        if not sides.symmetric:
            weights = weights_bound(sides, watch)
    except Interrupted:
        return found
    lanes = [_Lane(sides, norm, weights, watch) for _ in range(max(1, min(LANES, blocks)))]

    def block(number: int) -> None:
        part = slice(number * WIDE, min((number + 1) * WIDE, len(nodes)))
        lane = lanes[number % len(lanes)]
        found.value[part], found.error[part] = lane.run(nodes[part], tol)

    try:
        for number in range(0, blocks, len(lanes)):
            some = range(number, min(number + len(lanes), blocks))
            each(block, some, watch.threads)
            found.done = min(some.stop * WIDE, len(nodes))
            found.visits = sum(lane.visits for lane in lanes)
            found.products = max(lane.most for lane in lanes)
            if not np.isfinite(found.value[: found.done]).all():
                found.overflow = True
                break
            watch.report("counting closed walks", found.done, len(nodes), "nodes")
            worst = float((found.error[: found.done] / found.value[: found.done]).max())
            yield Iteration(
                some.stop, float("nan"), worst, found.visits, time.perf_counter() - began,
                part=f"nodes {number * WIDE + 1:,} to {found.done:,} of {len(nodes):,}",
            )  # fmt: skip
    except Interrupted:
        pass
    return found


def _rest(top: float, k: int) -> float:
    """``q p / (1 - p)``: what is left out after 2k + 1, relative to N; infinite if p >= 1."""
    q, p = top / (2 * k + 1), top / (2 * k + 2)
    return q * p / (1 - p) * (1 + 1e-9) if p < 1 else math.inf


class _Lane:
    """Blocks of vectors, reused for one lot of nodes after the other."""

    def __init__(
        self, sides: Sides, norm: float, weights: tuple[Floats, float] | None, watch: Watch
    ) -> None:
        from kingpost.core.kernels.closed import WIDE
        from kingpost.core.kernels.series import ROW_UNITS

        self.sides, self.norm, self.weights, self.watch = sides, norm, weights, watch
        n = len(sides.pull.offsets) - 1
        self.n, self.visits, self.most = n, 0, 0
        longest = max(sides.pull.degrees.max(initial=0), sides.push.degrees.max(initial=0))
        self.units = min(ROW_UNITS, float(longest) + 13)
        self.dots = min(ROW_UNITS, float(n) + 13)
        self.right = [np.zeros((n, WIDE)) for _ in range(2)]
        self.live = [np.zeros(n, dtype=bool) for _ in range(2)]
        if sides.symmetric:
            self.left, self.lives = self.right, self.live
        else:
            self.left = [np.zeros((n, WIDE)) for _ in range(2)]
            self.lives = [np.zeros(n, dtype=bool) for _ in range(2)]
        self.pieces = list(row_pieces(sides.pull.offsets, _PIECE))
        self.backs = list(row_pieces(sides.push.offsets, _PIECE))

    def run(self, nodes: NDArray[np.int64], tol: float) -> tuple[Floats, Floats]:
        """Values and errors of up to ``WIDE`` nodes; values not finite where they overflow."""
        with np.errstate(over="ignore", invalid="ignore"):
            return self._run(nodes, tol)

    def _run(self, nodes: NDArray[np.int64], tol: float) -> tuple[Floats, Floats]:
        place = np.arange(len(nodes))
        for blocks, live in ((self.right, self.live), (self.left, self.lives)):
            blocks[0][:] = 0.0
            live[0][:] = False
            blocks[0][nodes, place] = 1.0
            live[0][nodes] = True
        value, k = self._dot(self.left, 0, self.right, 0), 0
        size = value.copy()  # |l_k| |r_k| / (2k)!
        ratio = 1.0  # k! k! / (2k)!: the blocks hold B^k / k!
        while True:
            old, new = k % 2, (k + 1) % 2
            self._advance(self.sides.pull, self.pieces, self.right, self.live, old, k)
            # l_k . r_(k+1) is the term 2k + 1.
            odd = ratio * (k + 1) / (2 * k + 1)
            value += odd * self._dot(self.left, old, self.right, new)
            tail = size * _rest(self.norm, k)
            if self.weights is not None:
                tail = np.fmin(tail, ratio * self._weighed(old, k))
            rounding = UNIT * (2 * (k + 1) * (self.units + 6) + self.dots + 6 * k + 40)
            share = tail / value
            settled = bool((share[: len(nodes)] <= max(0.5 * tol, 0.25 * rounding)).all())
            if settled or k >= _MOST or not np.isfinite(value[: len(nodes)]).all():
                break
            if not self.sides.symmetric:
                self._advance(self.sides.push, self.backs, self.left, self.lives, old, k)
            k += 1
            ratio *= k / (2 * (2 * k - 1))
            even = ratio * self._dot(self.left, new, self.right, new)
            value += even
            size = even
            if not self.sides.symmetric:
                norms = self._dot(self.left, new, self.left, new)
                norms = np.sqrt(norms) * np.sqrt(self._dot(self.right, new, self.right, new))
                size = ratio * norms * (1 + 1e-9)
        self.most = max(self.most, k + 1)
        value, tail = value[: len(nodes)], tail[: len(nodes)]
        rounding /= 1 - rounding
        return value + 0.5 * tail, (0.5 * tail + rounding * value) * (1 + 1e-9) + rounding * tail

    def _weighed(self, at: int, k: int) -> Floats:
        """The remainder by the weights w, times (2k)! / (k! k!)."""
        from kingpost.core.kernels.closed import WIDE, weigh

        assert self.weights is not None
        w, top = self.weights
        rest = _rest(top, k)
        tops, sums = np.zeros(WIDE), np.zeros(WIDE)
        if not math.isfinite(rest):
            return np.full(WIDE, np.inf)
        for low in range(0, self.n, _PIECE):
            self.watch.check()
            weigh(
                self.left[at], self.lives[at], self.right[at], self.live[at], w, low,
                min(low + _PIECE, self.n), tops, sums,
            )  # fmt: skip
        return tops * sums * (rest * (1 + 1e-9))

    def _advance(
        self,
        rows: Adjacency,
        pieces: list[tuple[int, int]],
        blocks: list[Floats],
        live: list[NDArray[np.bool_]],
        old: int,
        k: int,
    ) -> None:
        from kingpost.core.kernels.closed import advance

        factor = self.sides.factor / (k + 1)
        for part in pieces:
            self.watch.check()
            advance(
                rows.offsets, rows.neighbours, rows.weights, *part, factor,
                blocks[old], live[old], blocks[1 - old], live[1 - old],
            )  # fmt: skip
        self.visits += len(rows.neighbours)

    def _dot(self, one: list[Floats], at: int, other: list[Floats], to: int) -> Floats:
        from kingpost.core.kernels.closed import WIDE, inner

        lives = self.lives if one is self.left else self.live
        others = self.lives if other is self.left else self.live
        sums = np.zeros((2, WIDE))
        for low in range(0, self.n, _PIECE):
            self.watch.check()
            high = min(low + _PIECE, self.n)
            inner(one[at], lives[at], other[to], others[to], low, high, sums)
        whole: Floats = sums[0] + sums[1]
        return whole
