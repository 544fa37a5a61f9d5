"""The random surfer (PageRank; Page, Brin, Motwani, Winograd 1999).

A walker follows an edge with probability d, chosen in proportion to its weight, and otherwise
jumps by the teleport vector v.  With ``P`` the walk's matrix, ``a`` marking dangling nodes (no
out-weight) and ``w`` where those jump::

    x = d P^T x + d (a^T x) w + (1 - d) v,     sum(x) = 1

Solved as a linear system without the dangling term: the pseudo-rank ``y = d P^T y + (1 - d) v``.
For w = v the scores are ``y / sum(y)`` (Del Corso, Gulli, Romani 2005; Ipsen and Selee 2007);
for another w they are ``y + t y_w`` with ``y_w = (I - d P^T)^-1 w`` and
``t = d a^T y / (1 - d a^T y_w)``.

Error bounds hold for the full system, whose matrix ``M = I - d (P^T + w a^T)`` is an M-matrix
with ``||M^-1||_1 <= 1 / (1 - d)``: the sum of all errors is at most ``||r||_1 / (1 - d)``, and
``|error_i| <= c x_i`` with ``c = max |r| / (M x)`` where teleport reaches every node.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT, Residual, componentwise
from kingpost.core.colours import colours
from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty, order_judge, reason
from kingpost.core.measures.vectors import distribution
from kingpost.core.operators import strengths, told_apart, walk
from kingpost.core.result import Bound, BoundKind, Result, Stop
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.linear import Judge, Solution, System
from kingpost.core.solvers.linear import solve as solve_linear
from kingpost.core.structure import reachable
from kingpost.core.text import count
from kingpost.core.watch import Watch


@dataclass(frozen=True, kw_only=True)
class SurferSettings(Settings):
    """Settings of the random surfer."""

    damping: float = option(
        0.85, "probability of following an edge rather than jumping", low=0.0, high=1.0
    )
    dangling: Any = option(
        "teleport",
        "where a walker goes from a node without out-edges: teleport (by the teleport vector), "
        "uniform (any node alike), leak (it is lost, and the rest scaled to sum 1)",
        choices=("teleport", "uniform", "leak"),
    )
    teleport: Any = option(None, "where jumps land: any node alike, or weights by node")


def solve(
    graph: Graph, settings: SurferSettings, watch: Watch, start: Floats | None = None
) -> Solve:
    """Scores of the random surfer: shape (n,), sum 1; ``start`` may be scores of a near problem.

    ``settings.dangling`` may also be an array of shape (n,) or a mapping from node id to weight
    and ``settings.teleport`` likewise.  At d = 1 the answer is the stationary distribution,
    which exists only where the walk ends in one closed class; otherwise the Result is refused.
    """
    if graph.n == 0:
        return empty("surfer", graph, settings)
    if settings.damping == 1.0:
        from kingpost.core.measures.stationary import solve_stationary

        return (yield from solve_stationary(graph, settings, watch))
    return (yield from _solve(graph, settings, watch, start))


def _solve(graph: Graph, settings: SurferSettings, watch: Watch, start: Floats | None) -> Solve:
    clock = Clock()
    d = settings.damping
    matrix, strength = walk(graph, settings.flow, d)
    jump = Jump(graph, settings, strength == 0)
    structure, push = graph.structure, graph.push(settings.flow)
    clock.ready()
    ledger = Ledger()
    system = System(matrix, (1 - d) * jump.teleport, structure, settings.flow, contraction=d)
    options: dict[str, Any] = {
        "max_sweeps": settings.max_sweeps, "watch": watch, "gain": 0.5 * d / (1 - d)
    }  # fmt: skip
    early = settings.stop_order is not None
    if start is None and jump.uniform and not structure.acyclic:
        start = _guess(graph, settings.flow, d)
    if start is not None:  # scores that sum to 1, on the scale of the pseudo-rank
        start = start * ((1 - d) / (1 - d + d * float(start[jump.dangling].sum())))
    if jump.apart is None:
        judge = order_judge(settings, lambda y, r: jump.pseudo(y, r)[1])
        found = yield from ledger.relay(
            solve_linear(system, judge, tol=settings.tol, early=early, start=start, **options)
        )
        x, bound = jump.pseudo(found.x, found.residual)
        stop = found.stop
        leaked = max(0.0, 1.0 - float(found.x.sum()))
    else:
        # Half the tolerance for each of the two solves that are added up.
        found = yield from ledger.relay(
            solve_linear(system, _plain_judge(d), tol=settings.tol / 2, **options)
        )
        jumped = yield from ledger.relay(
            solve_linear(
                replace(system, b=jump.apart), _plain_judge(d), tol=settings.tol / 2, **options
            ),
            "jumps from dangling nodes",
        )
        x, bound = jump.combined(found, jumped)
        stop = max(found.stop, jumped.stop, key=_severity)
        if stop is Stop.STALLED and bound.value <= settings.tol:
            stop = Stop.CONVERGED
        leaked = 0.0
    return Result(
        measure="surfer",
        settings=settings,
        scores=x,
        stop=stop,
        reason=reason(stop, bound.value, settings),
        bound=bound,
        log=tuple(ledger.log),
        conventions=jump.conventions(leaked),
        seconds=clock.seconds(),
        facts={
            "damping": d,
            "dangling nodes": int(jump.dangling.sum()),
            "leaked": leaked,
            "rate": found.rate,
            "share iterated": structure.share_iterated,
        },
        exact_zero=jump.unreached(watch),
        symmetry=lambda pools: colours(
            told_apart(matrix, push), jump.landing(), watch, structure, settings.flow, pools
        ),
    )


def _guess(graph: Graph, flow: Flow, damping: float) -> Floats:
    """Scores if every edge carried as much as every other: nearer than no edges at all."""
    taken = strengths(graph, "against" if flow == "along" else "along")
    total = float(taken.sum())
    flat = (1.0 - damping) / graph.n
    return flat + taken * (damping / total) if total > 0 else np.full(graph.n, 1.0 / graph.n)


# What holds of any two probability vectors.
_ANY = Bound(BoundKind.L1, 2.0, absolute=1.0)


def _plain_judge(damping: float) -> Judge:
    """L1 error of a linear solve, relative to its own mass."""

    def judge(y: Floats, r: Residual) -> tuple[float, bool]:
        mass = float(y.sum())
        return (r.norm / (1 - damping) / mass if mass > 0 else 0.0), False

    return judge


def _severity(stop: Stop) -> int:
    return [Stop.CONVERGED, Stop.ORDER_PROVEN, Stop.STALLED, Stop.LIMIT, Stop.CANCELLED].index(stop)


class Jump:
    """Where the walker jumps to, and what that makes of a solved linear system."""

    def __init__(self, graph: Graph, settings: SurferSettings, dangling: NDArray[np.bool_]) -> None:
        self.graph, self.settings, self.dangling = graph, settings, dangling
        # What was judged last, for that is what is asked for in the end.
        self._last: tuple[Floats, Residual, tuple[Floats, Bound]] | None = None
        n = graph.n
        self.uniform = settings.teleport is None
        self.teleport: Floats = (
            np.array([1.0 / n])
            if self.uniform
            else distribution(graph, settings.teleport, "--teleport")
        )
        self.apart: Floats | None = None  # where dangling nodes jump, if not by teleport
        mode = settings.dangling
        if not isinstance(mode, str):
            self.apart = distribution(graph, mode, "the dangling distribution")
        elif mode == "uniform" and not self.uniform:
            self.apart = np.full(n, 1.0 / n)
        if not dangling.any():
            self.apart = None

    def pseudo(self, y: Floats, r: Residual) -> tuple[Floats, Bound]:
        """Scores and their bound from the pseudo-rank y and its residual r.

        With S = sum(y) the residual of y / S in the full system is ``(r - v sum(r)) / S``.
        """
        if self._last is None or self._last[0] is not y or self._last[1] is not r:
            self._last = y, r, self._pseudo(y, r)
        return self._last[2]

    def _pseudo(self, y: Floats, r: Residual) -> tuple[Floats, Bound]:
        total = float(y.sum())
        if not total > 0:
            return y, Bound(BoundKind.NONE, float("inf"))
        if not np.isfinite(r.slack[0]):
            return y / total, _ANY
        spill = abs(float(r.value.sum())) + float(r.slack.sum())
        x = y / total
        full = Residual(r.value / total, (r.slack + self.teleport * spill) / total + 8 * UNIT * x)
        return x, self._bound(x, full)

    def combined(self, y: Solution, w: Solution) -> tuple[Floats, Bound]:
        """Scores and their bound where dangling nodes jump elsewhere than teleport does."""
        d, apart = self.settings.damping, self.apart
        assert apart is not None
        if not (np.isfinite(y.residual.slack[0]) and np.isfinite(w.residual.slack[0])):
            return y.x / float(y.x.sum()), _ANY
        hang, back = float(y.x[self.dangling].sum()), float(w.x[self.dangling].sum())
        t = d * hang / (1 - d * back)
        x = y.x + t * w.x
        total = float(x.sum())
        slip = abs(t - d * float(x[self.dangling].sum())) + 64 * UNIT * t
        value = y.residual.value + t * w.residual.value
        slack = y.residual.slack + t * w.residual.slack + slip * apart + 16 * UNIT * x
        # sum(x) is 1 up to the residual; scaling to it moves the residual by as much again.
        slack = slack + abs(total - 1.0) * ((1 - d) * self.teleport + 2 * x)
        return x / total, self._bound(x / total, Residual(value, slack))

    def _bound(self, x: Floats, full: Residual) -> Bound:
        d = self.settings.damping
        sum_bound = full.norm / (1 - d)
        c = componentwise((1 - d) * self.teleport, x, full)
        if np.isfinite(c):
            return Bound(BoundKind.COMPONENTWISE, min(c, sum_bound, 2.0), c, min(sum_bound, 1.0))
        return Bound(BoundKind.L1, min(sum_bound, 2.0), absolute=min(sum_bound, 1.0))

    def landing(self) -> Floats:
        """What tells nodes apart before any edge is looked at; shape (n,) or (1,)."""
        if self.apart is None:
            return self.teleport
        pairs = self.teleport + 1j * self.apart  # a sum of both would lose last bits
        return np.unique(pairs, return_inverse=True)[1].astype(np.float64).ravel()

    def unreached(self, watch: Watch) -> NDArray[np.bool_] | None:
        """Nodes the walker never comes to, whose scores are exactly zero; None where all are."""
        if self.uniform or watch.cancelled:
            return None
        aim = self.teleport if self.apart is None else self.teleport + self.apart
        start = np.flatnonzero(aim > 0).astype(np.uint32)
        seen = reachable(self.graph.push(self.settings.flow), start, watch)
        return ~seen

    def conventions(self, leaked: float) -> dict[str, str]:
        """The choices in force, in words."""
        mode, number = self.settings.dangling, count(int(self.dangling.sum()), "node")
        words = {
            "teleport": "jump by the teleport vector",
            "uniform": "jump to any node alike",
            "leak": f"leak ({leaked:.3g} of the mass lost), then scaled to sum 1: the scores "
            "of jumping by the teleport vector",
        }
        target = words[mode] if isinstance(mode, str) else "jump by a distribution of their own"
        spots = self.graph.n if self.uniform else int((self.teleport > 0).sum())
        return conventions(
            self.graph,
            self.settings,
            **{
                "dangling nodes": f"{number} without out-edges {target}",
                "teleport": "to any node alike" if self.uniform else f"to {spots:,} nodes as given",
                "scores": "probabilities, sum 1",
            },
        )


MEASURE = Measure("surfer", "S", "random surfer", SurferSettings, solve)
