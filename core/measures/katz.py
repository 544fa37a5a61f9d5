"""Katz centrality (Katz 1953) and its signed relative, Bonacich's power centrality (1987).

``x = beta + alpha A^T x`` for flow along the edges: every walk that ends at a node counts alpha to
the power of its length, times the beta of where it starts.  The sum is finite when ``|alpha|``
is below 1/rho, rho the spectral radius of A; on an acyclic graph always.  beta is included in
the scores, and the scores are not normalised.
"""

from __future__ import annotations

import math
from collections.abc import Generator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from kingpost.core.certify import Residual, componentwise
from kingpost.core.colours import colours
from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import (
    Clock,
    conventions,
    empty,
    order_judge,
    reason,
    refused,
)
from kingpost.core.measures.radius import Radius, spectral_radius
from kingpost.core.measures.vectors import node_vector
from kingpost.core.operators import adjacency
from kingpost.core.result import Bound, BoundKind, Iteration, Refusal, Result, Stop
from kingpost.core.solvers.guard import Guard, find_guard
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.linear import Solution, System
from kingpost.core.solvers.linear import solve as solve_linear
from kingpost.core.structure import reachable
from kingpost.core.watch import Watch

DEFAULT_FRACTION = 0.85
_RADIUS_WIDTH = 1e-9  # relative width to which rho is known before alpha is set from it


@dataclass(frozen=True, kw_only=True)
class KatzSettings(Settings):
    """Settings of Katz centrality."""

    alpha: float | None = option(
        None, "weight of one step, absolute; its magnitude must be below 1/rho"
    )
    alpha_fraction: float | None = option(
        None,
        f"alpha as a fraction of 1/rho ({DEFAULT_FRACTION} if neither is given)",
        low=-1.0,
        high=1.0,
        open_low=True,
        open_high=True,
    )
    beta: Any = option(1.0, "what every node starts with: a number, or weights by node")

    def __post_init__(self) -> None:
        super().__post_init__()
        for name, value in (("--alpha", self.alpha), ("--beta", self.beta)):
            if isinstance(value, int | float) and not math.isfinite(value):
                raise SettingsError(f"{name} is {value}; it takes a finite number")
        if self.alpha is not None and self.alpha_fraction is not None:
            raise SettingsError("--alpha and --alpha-fraction exclude each other; give one")


def solve(graph: Graph, settings: KatzSettings, watch: Watch, start: Floats | None = None) -> Solve:
    """Katz scores, shape (n,); ``start`` may be scores of a near problem.

    ``settings.beta`` is a number, an array (n,) or a mapping.
    """
    if graph.n == 0:
        return empty("katz", graph, settings)
    clock, ledger = Clock(), Ledger()
    chosen = yield from _alpha(graph, settings, watch, ledger)
    if isinstance(chosen, Refusal) and watch.cancelled:
        return _unstarted(graph, settings, chosen, clock, ledger)
    if isinstance(chosen, Refusal):
        return refused("katz", graph, settings, chosen.reason, chosen.instead, ledger.log)
    alpha, words, radius = chosen
    beta = settings.beta
    b = (
        np.array([float(beta)])
        if isinstance(beta, int | float)
        else node_vector(graph, beta, "--beta")
    )
    clock.ready()
    done = yield from _solve(graph, settings, alpha, b, watch, ledger, start)
    if not np.isfinite(done.bound.value) and done.found.stop is not Stop.CANCELLED:
        # No proof that alpha is below 1/rho: find out whether it is above.
        radius = radius or (
            yield from ledger.relay(spectral_radius(graph, 1e-12, watch), "spectral radius")
        )
        if radius is not None and abs(alpha) * radius.low >= 1.0:
            limit = 1 / radius.high
            return refused(
                "katz", graph, settings,
                f"alpha = {alpha:.6g} is not below 1/rho = {limit:.6g}, so the sum over walks has "
                "no limit",
                f"give --alpha below {limit:.6g} or --alpha-fraction below 1", ledger.log,
            )  # fmt: skip
    facts: dict[str, Any] = {"alpha": alpha, "rate": done.found.rate}
    facts["share iterated"] = graph.structure.share_iterated
    if radius is not None:
        facts["rho"] = (radius.low, radius.high)
    matrix = adjacency(graph, settings.flow, alpha)
    return Result(
        measure="katz",
        settings=settings,
        scores=done.found.x,
        stop=done.found.stop,
        reason=reason(done.found.stop, done.bound.value, settings),
        bound=done.bound,
        log=tuple(ledger.log),
        conventions=conventions(
            graph,
            settings,
            alpha=words,
            beta=f"{beta:g} at every node, included in the scores"
            if isinstance(beta, int | float)
            else f"a vector of its own ({int(np.count_nonzero(b)):,} nodes not zero), included",
            scores="not normalised",
        ),
        seconds=clock.seconds(),
        facts=facts,
        exact_zero=_untouched(graph, settings, b, watch),
        symmetry=lambda pools: colours(matrix, b, watch, graph.structure, settings.flow, pools),
    )


def _unstarted(
    graph: Graph, settings: KatzSettings, why: Refusal, clock: Clock, ledger: Ledger
) -> Result:
    """Cancelled before alpha was known: all there is, is the first term of the sum, beta."""
    beta = settings.beta
    return Result(
        measure="katz",
        settings=settings,
        scores=np.full(graph.n, float(beta))
        if isinstance(beta, int | float)
        else node_vector(graph, beta, "--beta"),
        stop=Stop.CANCELLED,
        reason=f"{why.reason}; the scores are beta alone",
        bound=Bound(BoundKind.NONE, float("inf")),
        log=tuple(ledger.log),
        conventions=conventions(graph, settings, scores="beta alone"),
        seconds=clock.seconds(),
    )


def _untouched(graph: Graph, settings: KatzSettings, b: Floats, watch: Watch) -> Any:
    """Nodes no walk from a nonzero beta ends at: exactly zero."""
    if len(b) == 1:
        return np.ones(graph.n, dtype=bool) if b[0] == 0 else None
    if watch.cancelled:
        return None
    start = np.flatnonzero(b).astype(np.uint32)
    return ~reachable(graph.push(settings.flow), start, watch)


def _alpha(
    graph: Graph, settings: KatzSettings, watch: Watch, ledger: Ledger
) -> Generator[Iteration, None, tuple[float, str, Radius | None] | Refusal]:
    """alpha, how it was chosen in words, and the bracket of rho where one was needed."""
    if settings.alpha is not None:
        return settings.alpha, f"{settings.alpha:g}, as given", None
    fraction = settings.alpha_fraction
    if graph.structure.acyclic:
        if fraction is not None:
            return Refusal(
                "the graph has no cycle, so rho is 0 and alpha cannot be a fraction of 1/rho",
                "give --alpha: on an acyclic graph any value is legal",
            )
        strength = graph.pull(settings.flow).strengths()
        fed = strength[strength > 0]
        mean = float(fed.mean()) if len(fed) else 1.0
        alpha = DEFAULT_FRACTION / mean
        return (
            alpha,
            f"{alpha:.6g} = {DEFAULT_FRACTION} / the mean strength of nodes that are fed: the "
            "graph has no cycle, so 1/rho does not exist and any alpha is legal",
            None,
        )
    share = DEFAULT_FRACTION if fraction is None else fraction
    radius = yield from ledger.relay(
        spectral_radius(graph, _RADIUS_WIDTH, watch), "spectral radius"
    )
    if radius is None:
        return Refusal(
            "cancelled before the spectral radius was known", "let it run, or give --alpha"
        )
    alpha = share / radius.high
    return (
        alpha,
        f"{alpha:.10g} = {share:g}/rho, rho in [{radius.low:.10g}, {radius.high:.10g}]",
        radius,
    )


@dataclass
class _Done:
    found: Solution
    bound: Bound


def _solve(
    graph: Graph,
    settings: KatzSettings,
    alpha: float,
    b: Floats,
    watch: Watch,
    ledger: Ledger,
    start: Floats | None,
) -> Generator[Iteration, None, _Done]:
    matrix = adjacency(graph, settings.flow, alpha)
    structure, flow = graph.structure, settings.flow
    guard: Guard | None = None
    if alpha < 0 or (b <= 0).any():
        # Signs, or zeros in beta: the scores cannot prove themselves, another vector must.
        guard = yield from ledger.relay(
            find_guard(
                adjacency(graph, flow, abs(alpha)), structure, flow, np.ones(1),
                max_sweeps=settings.max_sweeps, watch=watch,
            ),
            "certificate",
        )  # fmt: skip
        if guard is None:
            unproven = Bound(BoundKind.NONE, float("inf"))
            lost = Residual(np.zeros(graph.n), np.full(graph.n, np.inf))
            stop = Stop.CANCELLED if watch.cancelled else Stop.STALLED
            x = np.broadcast_to(b, graph.n).copy()
            return _Done(Solution(x, lost, stop, 0, 0, float("nan"), float("inf")), unproven)

    def bounds(x: Floats, r: Residual) -> Bound:
        if guard is None:
            c = componentwise(b, x, r)
            return Bound(BoundKind.COMPONENTWISE, c, c if np.isfinite(c) else None)
        reach = guard.factor(r.reach) * guard.w
        total = float(np.abs(x).sum())
        value = float(reach.sum()) / total if total > 0 else 0.0
        return Bound(BoundKind.COMPONENTWISE, value, absolute=reach)

    strongest = float(graph.push(flow).strengths().max(initial=0.0))
    system = System(matrix, b, structure, flow, contraction=abs(alpha) * strongest)
    order = order_judge(settings, bounds)

    def settled(x: Floats, r: Residual) -> tuple[float, bool]:
        # A row that is large beside beta makes this bound a poor one long after the scores
        # have settled: then a tighter one is worth more than further sweeps.
        bound, enough = order(x, r)
        return bound, enough or r.norm <= 0.2 * settings.tol * float(np.abs(x).sum())

    early = settings.stop_order is not None
    limit = ledger.sweeps + settings.max_sweeps
    for judge in (settled, order):
        found = yield from ledger.relay(
            solve_linear(
                system,
                judge,
                tol=settings.tol,
                max_sweeps=limit - ledger.sweeps,
                watch=watch,
                start=start,
                early=early,
                gain=4.0,
            )
        )
        bound = bounds(found.x, found.residual)
        proven = settings.stop_order is not None and order(found.x, found.residual)[1]
        if found.stop is Stop.ORDER_PROVEN and not proven:
            found.stop = Stop.STALLED
        if found.stop is not Stop.STALLED or not np.isfinite(found.residual.reach).all():
            break
        left = limit - ledger.sweeps
        if left < 1:
            break
        bound = yield from ledger.relay(
            _tight(graph, settings, alpha, found, bound, left, watch), "certificate"
        )
        if bound.value <= settings.tol:
            found.stop = Stop.CONVERGED
            break
        if ledger.sweeps >= limit:
            break
        start, early = found.x, False
    return _Done(found, bound)


def _tight(
    graph: Graph,
    settings: KatzSettings,
    alpha: float,
    found: Solution,
    bound: Bound,
    max_sweeps: int,
    watch: Watch,
) -> Generator[Iteration, None, Bound]:
    """A bound by a guard in proportion to each row's own residual: it goes only where that goes."""
    reach = found.residual.reach
    guard = yield from find_guard(
        adjacency(graph, settings.flow, abs(alpha)), graph.structure, settings.flow, reach,
        max_sweeps=max_sweeps, watch=watch,
    )  # fmt: skip
    if guard is None:
        return bound
    errors = guard.factor(reach) * guard.w
    value = float(errors.sum()) / (float(np.abs(found.x).sum()) or 1.0)
    return replace(bound, value=value, absolute=errors) if value < bound.value else bound


MEASURE = Measure("katz", "K", "Katz", KatzSettings, solve)
