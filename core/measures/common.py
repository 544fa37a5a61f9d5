"""What several measures do alike: refusals, conventions, the judging of a linear solve."""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np

from kingpost.core.certify import Residual
from kingpost.core.graph import Floats, Graph
from kingpost.core.measures.base import Settings
from kingpost.core.result import Bound, BoundKind, Iteration, Refusal, Result, Seconds, Stop

_REASONS = {
    Stop.CONVERGED: "the proven error is {bound:.1e} of the scores, within the {tol:.1e} asked for",
    Stop.ORDER_PROVEN: "the order of the first {order} ranks is proven",
    Stop.STALLED: "the proven error stays at {bound:.1e} of the scores: rounding allows no less "
    "({tol:.1e} was asked for)",
    Stop.LIMIT: "the limit of {limit:,} sweeps was reached with a proven error of {bound:.1e} "
    "({tol:.1e} was asked for)",
    Stop.CANCELLED: "cancelled; the proven error of what there is, is {bound:.1e}",
}

_UNPROVEN = {
    Stop.STALLED: "rounding allows no progress; no error is proven",
    Stop.LIMIT: "the limit of {limit:,} sweeps was reached; no error is proven",
    Stop.CANCELLED: "cancelled; no error is proven",
}


def reason(stop: Stop, bound: float, settings: Settings) -> str:
    """Why a solve ended, in words."""
    if not np.isfinite(bound) and stop in _UNPROVEN:
        return _UNPROVEN[stop].format(limit=settings.max_sweeps)
    return _REASONS[stop].format(
        bound=bound, tol=settings.tol, limit=settings.max_sweeps, order=settings.stop_order
    )


def refused(
    name: str, graph: Graph, settings: Settings, why: str, instead: str, log: list[Iteration]
) -> Result:
    """A Result without scores: the mathematics has no such answer."""
    refusal = Refusal(why, instead)
    return Result(
        measure=name,
        settings=settings,
        scores=np.full(graph.n, np.nan),
        stop=Stop.REFUSED,
        reason=refusal.sentence,
        bound=Bound(BoundKind.NONE, float("nan")),
        log=tuple(log),
        conventions=conventions(graph, settings),
        refusal=refusal,
    )


def empty(name: str, graph: Graph, settings: Settings) -> Result:
    """The answer for a graph without nodes."""
    return refused(
        name, graph, settings, "the graph has no nodes", "load a table that holds edges", []
    )


def conventions(graph: Graph, settings: Settings, **more: str) -> dict[str, str]:
    """The choices other software may make otherwise, by name, in words."""
    if not graph.directed:
        flow = "both ways: the graph is undirected"
    elif settings.flow == "along":
        flow = f"along {graph.origin.source} -> {graph.origin.target}: high is who is pointed at"
    else:
        flow = f"against {graph.origin.source} -> {graph.origin.target}: high is who points at"
    account = graph.account
    loops = graph.loop_count
    filters = graph.origin.where_words
    return {
        "flow": flow,
        "weight": graph.origin.weight_words,
        **({"rows": f"filtered, {filters}"} if filters is not None else {}),
        "parallel edges": f"{graph.origin.parallel} ({account.merged:,} rows merged)",
        "self-loops": f"dropped ({account.loops_dropped:,})"
        if graph.origin.loops == "drop"
        else f"kept ({loops:,})",
        **more,
    }


class Clock:
    """Seconds spent preparing and solving."""

    def __init__(self) -> None:
        self._began = time.perf_counter()
        self._ready = self._began

    def ready(self) -> None:
        """Preparation is over."""
        self._ready = time.perf_counter()

    def seconds(self) -> Seconds:
        """Both parts so far."""
        return Seconds(0.0, self._ready - self._began, time.perf_counter() - self._ready)


def order_judge(
    settings: Settings, bounds: Callable[[Floats, Residual], Bound]
) -> Callable[[Floats, Residual], tuple[float, bool]]:
    """A judge for the linear solver: the headline bound, and whether the wanted order is proven."""
    wanted = settings.stop_order

    def judge(x: Floats, r: Residual) -> tuple[float, bool]:
        bound = bounds(x, r)
        return bound.value, wanted is not None and proven_prefix(x, bound, wanted) >= wanted

    return judge


def proven_prefix(scores: Floats, bound: Bound, wanted: int) -> int:
    """How many of the first ``wanted`` ranks are proven, without sorting all scores."""
    from kingpost.core.standing import stand

    n = len(scores)
    if n == 0 or (bound.relative is None and bound.absolute is None):
        return 0
    kept = min(n, wanted + 1)
    low, high = bound.interval(scores)
    top = np.argpartition(-scores, kept - 1)[:kept] if kept < n else np.arange(n)
    rest = np.ones(n, dtype=bool)
    rest[top] = False
    ceiling = float(high[rest].max()) if rest.any() else -np.inf
    absolute = bound.absolute
    part = Bound(
        bound.kind,
        bound.value,
        bound.relative,
        absolute[top] if isinstance(absolute, np.ndarray) else absolute,
    )
    standing = stand(scores[top], part)
    lows = np.minimum.accumulate(low[top][standing.order])
    safe = int(np.searchsorted(-lows, -ceiling, side="left"))  # lows fall: those above the rest
    return min(standing.proven, safe, wanted)
