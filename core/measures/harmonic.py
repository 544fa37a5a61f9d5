"""Harmonic centrality: ``x[v] = sum over u != v of 1 / d(u, v)``, unreachable pairs giving 0.

For flow along the edges ``d(u, v)`` is the number of edges on a shortest path from u to v: a node
is high when many others need few steps to it.  Against them, paths lead from v to u.  Proposed
by Marchiori and Latora, "Harmony in the small-world", Physica A 285, 2000, and by Rochat,
"Closeness centrality extended to unconnected graphs: the harmonic centrality index", 2009; its
axioms in Boldi and Vigna, "Axioms for centrality", Internet Math. 10, 2014.

Exact by breadth-first searches from 512 nodes at a time where that is affordable, otherwise
estimated by counters that grow with the balls around every node (:mod:`kingpost.core.solvers`).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from kingpost.core.certify import UNIT
from kingpost.core.graph import Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty
from kingpost.core.measures.reach import whole_numbers
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.sets import Searched, same_sums, search
from kingpost.core.solvers.sketch import Balls, ball_error, grow_balls
from kingpost.core.text import count
from kingpost.core.watch import Watch

_ROUNDINGS = 4 * UNIT  # of one exact score: each term's, the sum's, and those of merging lanes


@dataclass(frozen=True, kw_only=True)
class HarmonicSettings(Settings):
    """Settings of harmonic centrality; ``tol`` and ``stop`` have no bearing on it.

    ``max_sweeps`` is the greatest distance an estimate looks at; an exact answer looks at all.
    """

    budget: float = option(
        2e9, "edge visits up to which distances are counted exactly, else estimated", low=0.0
    )
    log2m: int = option(
        8, "counters of 2 to this power of registers: 8 for 6.5% a ball", low=4, high=16
    )
    seed: int = option(1, "which hash the counters use", low=0, high=2**62)

    def __post_init__(self) -> None:
        super().__post_init__()
        whole_numbers(self, "log2m", "seed")


def solve(graph: Graph, settings: HarmonicSettings, watch: Watch) -> Solve:
    """Harmonic centrality of every node, shape (n,), not normalised."""
    if graph.n == 0:
        return empty("harmonic", graph, settings)
    clock = Clock()
    clock.ready()
    ledger = Ledger()
    push, pull = graph.push(settings.flow), graph.pull(settings.flow)
    n = graph.n
    # The least that searches from every node can cost where each reaches most of the graph; a
    # search then shows whether it does, and what it costs.
    if -(-n // 512) * graph.stored <= settings.budget:
        found = yield from ledger.relay(search(push, settings.budget, watch))
        if not found.over_budget:
            return _exact(graph, settings, found, ledger.log, clock)
    balls = yield from ledger.relay(
        grow_balls(pull, settings.log2m, settings.seed, settings.max_sweeps, watch)
    )
    return _estimate(graph, settings, balls, ledger.log, clock)


def _exact(
    graph: Graph,
    settings: HarmonicSettings,
    found: Searched,
    log: list[Iteration],
    clock: Clock,
) -> Result:
    facts: dict[str, Any] = {"method": "searches from every node"}
    if found.cancelled:
        words = (
            f"cancelled after {found.done:,} of {found.blocks:,} blocks of sources; every score is "
            "a lower end, what the other sources give is missing"
        )
        bound = Bound(BoundKind.NONE, float("inf"))
        return _result(
            graph, settings, found.score, Stop.CANCELLED, words, bound, log, clock, facts,
            "none: lower ends only",
        )  # fmt: skip
    facts["greatest distance"] = max(found.levels - 1, 0)
    words = (
        f"counted exactly, in {count(found.blocks, 'search', 'searches')} from 512 nodes at once"
    )
    if found.levels <= 2:
        bound = Bound(BoundKind.EXACT, 0.0, absolute=0.0)  # whole numbers: no distance beyond 1
    else:
        bound = Bound(BoundKind.EXACT, _ROUNDINGS, relative=_ROUNDINGS)
    return _result(
        graph, settings, found.score, Stop.CONVERGED, words, bound, log, clock, facts,
        "exact but for rounding", lambda pools: same_sums(found),
    )  # fmt: skip


def _estimate(
    graph: Graph, settings: HarmonicSettings, balls: Balls, log: list[Iteration], clock: Clock
) -> Result:
    error = ball_error(settings.log2m)
    radius = max(balls.radius, 1)
    within = (
        f"only what is within distance {radius:,} is part of the scores, which are low by the rest"
    )
    if balls.cancelled:
        stop, words = Stop.CANCELLED, f"cancelled; {within}"
    elif not balls.settled:
        stop, words = Stop.LIMIT, f"the limit of {settings.max_sweeps:,} sweeps; {within}"
    else:
        stop = Stop.CONVERGED
        words = (
            f"estimated: no ball grows beyond radius {max(radius - 1, 0):,}; an exact answer would "
            f"pass the budget of {settings.budget:,.6g} edge visits"
        )
    facts = {
        "method": "counters on growing balls",
        "standard error": error,
        "standard error is of": "each ball's size; that of the sum is estimated",
        "registers": 1 << settings.log2m,
        "seed": settings.seed,
        "radius": radius,
    }
    confidence = (
        f"relative standard error of each ball's size {error:.2%} (1.04 / sqrt(registers)); that "
        "of the score is estimated to be no more, as it adds up balls with positive factors; no "
        "order is proven"
    )
    bound = (
        Bound(BoundKind.STATISTICAL, error)
        if balls.settled
        else Bound(BoundKind.NONE, float("inf"))
    )
    return _result(graph, settings, balls.score, stop, words, bound, log, clock, facts, confidence)


def _result(
    graph: Graph,
    settings: HarmonicSettings,
    scores: Floats,
    stop: Stop,
    words: str,
    bound: Bound,
    log: list[Iteration],
    clock: Clock,
    facts: dict[str, Any],
    confidence: str,
    symmetry: Any = None,
) -> Result:
    pull = graph.pull(settings.flow)
    return Result(
        measure="harmonic",
        settings=settings,
        scores=scores,
        stop=stop,
        reason=words,
        bound=bound,
        log=tuple(log),
        conventions=conventions(
            graph,
            settings,
            distance="number of edges on a shortest path; weights are strengths, never distances, "
            "and are ignored",
            itself="a node is not part of its own score",
            unreachable="pairs without a path give 0",
            scores=f"{'' if bound.kind is BoundKind.EXACT else 'estimated '}"
            "sum of 1/distance, not normalised",
            confidence=confidence,
        ),
        seconds=clock.seconds(),
        facts=facts,
        exact_zero=_fed_by_none(pull),
        symmetry=symmetry,
    )


def _fed_by_none(pull: Any) -> Any:
    """Nodes that no other points at: zero by structure."""
    import numpy as np

    from kingpost.core.kernels.rows import diagonal

    loops = np.zeros(len(pull.offsets) - 1)
    diagonal(pull.offsets, pull.neighbours, None, loops)
    return pull.degrees == loops


MEASURE = Measure("harmonic", "N", "harmonic", HarmonicSettings, solve, structured=False)
