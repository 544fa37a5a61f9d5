"""Who reaches whom, estimated where counting is too dear, each with a stated standard error.

Upstream weight, on the condensation, by least ranks (Cohen, "Size-estimation framework with
applications to transitive closure and reachability", J. Comput. Syst. Sci. 55, 1997).  A component
of weight W draws k ranks from the exponential distribution of rate W; the least rank upstream of
a node is exponential with rate the weight upstream of it, X.  Over k lanes the sum S of least
ranks has the gamma distribution of shape k and rate X, so ``(k - 1) / S`` has mean X and relative
variance exactly ``1 / (k - 2)``.  The minimum passes along edges, so one pass serves 32 lanes.

Balls, by counters of 2^p registers (Flajolet, Fusy, Gandouet, Meunier, "HyperLogLog", 2007), which
grow by one step a level (Boldi and Vigna, "In-core computation of geometric centralities with
HyperBall", 2013).  The relative standard error of a ball's size is about ``1.04 / sqrt(2^p)``.
"""

from __future__ import annotations

import time
from collections.abc import Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.parallel import each
from kingpost.core.result import Iteration
from kingpost.core.solvers.sets import LANES as SIDE
from kingpost.core.solvers.sets import Condensation, pieces
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch


def rank_error(ranks: int) -> float:
    """Relative standard error of an estimate from so many least ranks."""
    return (ranks - 2) ** -0.5 if ranks > 2 else float("inf")


def ball_error(log2m: int) -> float:
    """Relative standard error of a ball's size, by counters of ``2^log2m`` registers."""
    return 1.04 / float(np.sqrt(2.0**log2m))


@dataclass
class Known:
    """What one pass over the condensation knows of the weight upstream of each component.

    It is at least ``low`` and at most ``high``, each (components,), up to roundings.
    """

    low: Floats
    high: Floats


def between(joined: Condensation, weights: Floats, total: float) -> Known:
    """Certain ends of the weight upstream of every component; equal on forests, for instance.

    ``total`` is the weight of all components, or more.
    """
    from kingpost.core.kernels.reach import between as kernel

    low, high = np.zeros(joined.count), np.zeros(joined.count)
    kernel(joined.starts, joined.givers, weights, total, low, high)
    return Known(low, high)


@dataclass
class Estimated:
    """Estimates, the number of ranks they rest on (of those wanted), and what they cost."""

    found: Floats
    ranks: int
    wanted: int
    visits: int

    @property
    def cancelled(self) -> bool:
        """Whether it ended before its end."""
        return self.ranks < self.wanted


def least_ranks(
    joined: Condensation,
    weights: Floats,
    known: Known,
    wanted: int,
    seed: int,
    watch: Watch,
) -> Generator[Iteration, None, Estimated]:
    """Estimated weight upstream of every component, from ``wanted`` ranks (a multiple of 32).

    Cancelled, it returns the estimate by the ranks it has; without any, the certain lower ends.
    """
    from kingpost.core.kernels.sketch import LANES, least, scrambled, settle

    began, visits, count = time.perf_counter(), 0, joined.count
    total = float(weights.sum())
    share = weights / total if total > 0 else weights
    rows = [np.empty((count, LANES), dtype=np.float32) for _ in range(SIDE)]
    parts = [np.zeros(count) for _ in range(SIDE)]
    sums = np.zeros(count)
    blocks, done = wanted // LANES, 0
    key = int(scrambled(np.uint64(seed)))

    def block(number: int) -> None:
        lane = number % SIDE
        parts[lane][:] = 0.0
        lanes = scrambled(np.uint64(key ^ number))
        for low, high in pieces(joined.starts):
            watch.check()
            least(
                joined.starts, joined.givers, share, joined.feeds, low, high, np.uint64(lanes),
                rows[lane], parts[lane],
            )  # fmt: skip

    try:
        for number in range(0, blocks, SIDE):
            some = range(number, min(number + SIDE, blocks))
            each(block, some, watch.threads)
            for step in some:
                sums += parts[step % SIDE]
            done = some.stop
            visits += len(some) * (joined.edges + count)
            watch.report("drawing ranks", done * LANES, wanted, "ranks")
            yield Iteration(
                done, float("nan"), rank_error(done * LANES), visits,
                time.perf_counter() - began,
                part=f"ranks {number * LANES + 1:,} to {done * LANES:,} of {wanted:,}",
            )  # fmt: skip
    except Interrupted:
        pass
    found = known.low.copy()
    if done:
        kept = done * LANES
        settle(
            joined.starts, joined.givers, weights, known.low, known.high, sums, kept, total, found
        )
    return Estimated(found, done * LANES, wanted, visits)


@dataclass
class Balls:
    """Sums of 1/distance by growing balls, and how far these have grown.

    ``settled`` says that no ball grows any more.
    """

    score: Floats
    ball: Floats
    radius: int
    visits: int
    settled: bool
    cancelled: bool


def grow_balls(
    pull: Adjacency,
    log2m: int,
    seed: int,
    levels: int,
    watch: Watch,
) -> Generator[Iteration, None, Balls]:
    """Estimate the sum of ``1 / d(u, v)`` over all u other than v, for every v.

    ``pull`` lists the u one step from each v.  Balls of radius 0 and 1 are known exactly; with
    estimated sizes B_t the sum is ``B_1 - 1 + sum over t > 1 of (B_t - B_(t-1)) / t``, which has
    positive coefficients on every B_t.  At most ``levels`` levels.  Cancelled, it returns the
    estimate of the part within the radius reached.
    """
    from kingpost.core.kernels.rows import diagonal
    from kingpost.core.kernels.sketch import enter, grow, scrambled

    began, n, m = time.perf_counter(), len(pull.offsets) - 1, 1 << log2m
    loops = np.zeros(n)
    diagonal(pull.offsets, pull.neighbours, None, loops)
    score = pull.degrees - loops
    ball = 1.0 + score
    balls = Balls(score, ball, 0, 0, False, False)
    powers = np.ldexp(1.0, -np.arange(66))
    powers[0] = 0.0
    moved, moving = np.ones(n, dtype=bool), np.zeros(n, dtype=bool)
    cuts = list(row_pieces(pull.offsets, max(1, _BYTES // m)))
    try:
        watch.check()
        rows, grown = np.zeros((n, m), dtype=np.uint8), np.empty((n, m), dtype=np.uint8)
        key = scrambled(np.uint64(seed))
        for low, high in cuts:
            watch.check()
            enter(low, high, np.uint64(key), log2m, rows)
        while balls.radius < levels:
            level = balls.radius + 1
            # A level that is cancelled midway must leave no half of its growth behind.
            next_score, next_ball = score.copy(), ball.copy()

            def piece(
                part: tuple[int, int],
                level: int = level,
                rows: NDArray[np.uint8] = rows,
                grown: NDArray[np.uint8] = grown,
                moved: NDArray[np.bool_] = moved,
                moving: NDArray[np.bool_] = moving,
                score: Floats = next_score,
                ball: Floats = next_ball,
            ) -> tuple[int, int]:
                watch.check()
                counted: tuple[int, int] = grow(
                    pull.offsets, pull.neighbours, *part, level, rows, grown, moved, moving,
                    powers, float(n), ball, score,
                )  # fmt: skip
                return counted

            counts = each(piece, cuts, watch.threads)
            change = sum(count for count, _ in counts)
            balls.visits += sum(read for _, read in counts)
            rows, grown, moved, moving = grown, rows, moving, moved
            score, ball = next_score, next_ball
            balls.radius = level
            watch.report(f"growing balls to radius {level:,}", change, n, "nodes")
            gain = float(np.sum(score - balls.score)) / (float(score.sum()) or 1.0)
            balls.score, balls.ball = score, ball
            yield Iteration(
                level, gain, ball_error(log2m), balls.visits, time.perf_counter() - began,
                part=f"radius {level:,}: {change:,} balls still growing",
            )  # fmt: skip
            if change == 0:
                balls.settled = True
                break
    except Interrupted:
        balls.cancelled = True
    return balls


_BYTES = 64_000_000  # of registers read between two looks whether the work was cancelled
