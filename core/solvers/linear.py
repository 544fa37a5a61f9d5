"""``x = b + B x`` for a nonnegative B with spectral radius below 1: Katz, random surfer.

Method.  Rows are visited in condensation order: what lies on no cycle is solved once and
exactly (a few roundings), each cyclic stage is swept by Gauss-Seidel until it settles, and only
then what it feeds is touched.  After every sweep of a strong component the iterate is rescaled
by ``theta = sum(c) / sum(keep x)``, where c is what enters the component and ``keep[j]`` one
minus what j gives inside it: a factor that the exact solution satisfies, and that removes the
slowest part of the error where the column sums are nearly equal (random surfer).

Stopping.  A stage is left when the estimated rest of its movement, ``moved q / (1 - q)`` with
q the observed rate, is below a share of its mass.  When all are through, the true residual is
computed (see :mod:`kingpost.core.certify`); while the caller's bound is above ``tol`` the stages
are swept on, warm.  Estimates decide how long to sweep, never what is claimed.

References: Del Corso, Gulli, Romani, "Fast PageRank computation via a sparse linear system",
Internet Math. 2, 2005 (Gauss-Seidel on the pseudo-rank); Varga, "Matrix Iterative Analysis",
1962, ch. 3 (regular splittings of M-matrices).
"""

from __future__ import annotations

import time
from collections.abc import Callable, Generator
from dataclasses import dataclass, field

import numpy as np

from kingpost.core.certify import Residual, residual
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats, Flow
from kingpost.core.operators import Pull, cut
from kingpost.core.parallel import each
from kingpost.core.result import Iteration, Stop
from kingpost.core.solvers.stages import Plan, Stage, plan
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

_NOTHING = np.empty(0)
_NOBODY = np.empty(0, dtype=np.uint32)
_ROUNDING = 4e-16  # a sweep that moves less than this share of the mass moves nothing
_ROUNDS = 12  # certifications before a bound that no longer falls counts as stalled


@dataclass(frozen=True)
class System:
    """``x = b + B x`` on a graph.

    ``b`` has shape (n,), or (1,) for a constant.  ``push`` is the adjacency the other way round:
    given, strong components are rescaled after each sweep.
    """

    matrix: Pull
    b: Floats
    structure: Structure
    flow: Flow
    push: Adjacency | None = None


@dataclass
class Solution:
    """What the solver found: iterate, its residual, and how it got there."""

    x: Floats
    residual: Residual
    stop: Stop
    sweeps: int
    edge_visits: int
    rate: float
    bound: float
    log: list[Iteration] = field(default_factory=list)


Judge = Callable[[Floats, Residual], tuple[float, bool]]


def solve(
    system: System,
    judge: Judge,
    *,
    tol: float,
    max_sweeps: int,
    watch: Watch,
    start: Floats | None = None,
    early: bool = False,
) -> Generator[Iteration, None, Solution]:
    """Solve ``system``; the generator yields one Iteration a sweep and returns a Solution.

    Args:
        judge: ``judge(x, residual) -> (bound, enough)``: the relative error bound that the
            caller can prove from the residual, and whether it is content with less than tol
            (an order it wanted proven).
        tol: stop once ``bound <= tol``.
        early: certify on the way, each time the error has fallen a hundredfold, so that
            ``judge`` may be content early.
        start: a first iterate of shape (n,), nonnegative; b itself otherwise.
    """
    work = _Sweeper(system, watch, max_sweeps, start)
    goal = 1e-2 if early else tol
    best = float("inf")
    stop: Stop | None = None
    r = None
    for _ in range(_ROUNDS + (int(-np.log10(tol)) if early else 0)):
        try:
            yield from work.through(0.3 * goal)
            r, bound, enough = work.certify(judge)
        except Interrupted:
            stop = Stop.CANCELLED
            break
        yield work.line(bound, "certified")
        if bound <= tol:
            stop = Stop.CONVERGED
        elif enough:
            stop = Stop.ORDER_PROVEN
        elif work.sweeps >= max_sweeps:
            stop = Stop.LIMIT
        elif work.floor and not bound < 0.5 * best:
            stop = Stop.STALLED
        if stop is not None:
            break
        best = min(best, bound)
        goal = max(goal * 1e-2, tol) if goal > tol else goal * max(1e-3, min(0.1, 0.5 * tol / bound))
    if r is None or stop is Stop.CANCELLED:
        # Whatever the iterate is now, its bound is that of a full, uninterrupted residual.
        work.watch = Watch(threads=watch.threads)
        r, bound, _ = work.certify(judge, everywhere=True)
        yield work.line(bound, "certified")
    return Solution(
        work.x, r, stop or Stop.STALLED, work.sweeps, work.visits, work.rate, bound, work.log
    )


class _Sweeper:
    """The iterate and everything that changes with it."""

    def __init__(
        self, system: System, watch: Watch, max_sweeps: int, start: Floats | None
    ) -> None:
        self.system, self.watch, self.max_sweeps = system, watch, max_sweeps
        self.matrix, self.b = system.matrix, system.b
        self.plan: Plan = plan(system.structure, system.matrix.rows, system.flow)
        n = system.matrix.n
        self.x: Floats = (
            np.array(start, dtype=np.float64) if start is not None else np.empty(n)
        )
        if start is None:
            self.x[:] = self.b
        z = self.x * self.matrix.scale
        lanes = max((len(step) for stage in self.plan.stages for step in stage.steps), default=1)
        self.z = [z, *(z.copy() for _ in range(lanes - 1))]
        self.sweeps = self.visits = 0
        self.rate = float("nan")
        self.log: list[Iteration] = []
        self.began = time.perf_counter()
        self._keep: Floats | None = None
        self.floor = False  # whether the last pass went on until nothing moved any more

    def line(self, bound: float, part: str = "", moved: float | None = None) -> Iteration:
        made = Iteration(
            self.sweeps,
            self.log[-1].residual if moved is None and self.log else (moved or 0.0),
            bound,
            self.visits,
            time.perf_counter() - self.began,
            part=part,
        )
        self.log.append(made)
        return made

    def through(self, goal: float) -> Generator[Iteration, None, None]:
        """Pass all stages, upstream first, sweeping each cyclic one to ``goal``."""
        self.floor = True
        for stage in self.plan.stages:
            if stage.swept:
                yield from self._settle(stage, goal)
            else:
                self._substitute(stage)
        if not self.plan.swept:
            self.sweeps = max(self.sweeps, 1)
            yield self.line(float("nan"), "single pass", 0.0)

    def _substitute(self, stage: Stage) -> None:
        from kingpost.core.kernels.rows import copy_rows
        from kingpost.core.kernels.sweep import substitute

        rows, order = self.matrix.rows, self.plan.order
        for ((low, high),) in stage.steps:
            self.watch.check()
            substitute(
                rows.offsets, rows.neighbours, rows.weights, order, low, high,
                self.b, self.matrix.scale, self.matrix.loops, self.z[0], self.x,
            )  # fmt: skip
            for other in self.z[1:]:
                copy_rows(order, low, high, self.z[0], other)
        self.visits += stage.edges

    def _settle(self, stage: Stage, goal: float) -> Generator[Iteration, None, None]:
        keep, given, upstream = self._balance(stage)
        nodes = self.plan.order[stage.low : stage.high]
        entering = float(given[0] * len(nodes) if len(given) == 1 else given[nodes].sum())
        above = self.plan.order[: stage.low] if upstream is not None else _NOBODY
        for z in self.z:
            z[above] = 0.0
        factor = 1.0  # the true iterate is factor * x: what enters is divided by it instead
        before, rates = float("inf"), [0.0]
        try:
            while self.sweeps < self.max_sweeps:
                moved, mass, kept = self._sweep(stage, given, keep, factor)
                self.sweeps += 1
                self.visits += stage.edges
                moved, mass = moved * factor, abs(mass * factor)
                if len(keep) and kept > 0 and entering > 0:
                    theta = entering / (kept * factor)
                    if 0.2 < theta < 5.0:
                        factor *= theta
                        moved += abs(theta - 1.0) * mass
                rates = [*rates[-2:], moved / before if before > 0 else 0.0]
                self.rate, before = rates[-1], moved
                share = moved / mass if mass > 0 else 0.0
                yield self.line(float("nan"), "", share)
                rate = min(max(rates), 0.9999)
                if share < _ROUNDING:
                    return
                if len(rates) > 2 and share * rate / (1.0 - rate) <= goal:
                    self.floor = False
                    return
            self.floor = False
        finally:
            if factor != 1.0:
                self.x[nodes] *= factor
                for z in self.z:
                    z[nodes] *= factor
            if upstream is not None:
                for z in self.z:
                    z[above] = upstream

    def _balance(self, stage: Stage) -> tuple[Floats, Floats, Floats | None]:
        """What rescaling needs: ``keep``, what enters each node, and z upstream if that is in it.

        The iterate of a stage can be rescaled without touching it only if all that enters
        from upstream stands beside b instead of being pulled.
        """
        push, own = self.system.push, stage.component
        if push is None or own is None:
            return _NOTHING, self.b, None
        if self._keep is None:
            inside = self.system.structure.inside(self.system.flow, self.watch)
            self._keep = 1.0 - self.matrix.scale * inside
        if stage.low == 0:
            return self._keep, self.b, None
        from kingpost.core.kernels.rows import push_rows

        order, entering = self.plan.order, np.zeros(self.matrix.n)
        for low, high in cut(push, order, 0, stage.low, 2_000_000):
            self.watch.check()
            push_rows(
                push.offsets, push.neighbours, push.weights, order, low, high,
                self.z[0], entering,
            )  # fmt: skip
        above = order[: stage.low].astype(np.int64)
        self.visits += int((push.offsets[above + 1] - push.offsets[above]).sum())
        return self._keep, entering + self.b, self.z[0][above]

    def _sweep(
        self, stage: Stage, given: Floats, keep: Floats, factor: float
    ) -> tuple[float, float, float]:
        from kingpost.core.kernels.rows import copy_rows
        from kingpost.core.kernels.sweep import gauss_seidel

        rows, order = self.matrix.rows, self.plan.order
        totals = np.zeros(3)
        last: list[tuple[int, int]] = []

        def lane(part: tuple[int, tuple[int, int], list[tuple[int, int]]]) -> tuple[float, ...]:
            number, (low, high), others = part
            for other, block in enumerate(others):
                if other != number:
                    copy_rows(order, *block, self.z[other], self.z[number])
            return gauss_seidel(  # type: ignore[no-any-return]
                rows.offsets, rows.neighbours, rows.weights, order, low, high,
                given, 1.0 / factor, self.matrix.scale, self.matrix.loops, keep,
                self.z[number], self.x,
            )  # fmt: skip

        for step in stage.steps:
            self.watch.check()
            for sums in each(
                lane, [(k, block, last) for k, block in enumerate(step)], self.watch.threads
            ):
                totals += sums
            last = step
        for other, block in enumerate(last):
            for number, z in enumerate(self.z):
                if other != number:
                    copy_rows(order, *block, self.z[other], z)
        return float(totals[0]), float(totals[1]), float(totals[2])

    def certify(self, judge: Judge, everywhere: bool = False) -> tuple[Residual, float, bool]:
        ranges = [(0, self.matrix.n)] if everywhere else self.plan.swept
        r = residual(self.matrix, self.b, self.x, self.plan.order, ranges, self.watch)
        for stage in self.plan.stages:
            if stage.swept or everywhere:
                self.visits += stage.edges
        bound, enough = judge(self.x, r)
        return r, bound, enough
