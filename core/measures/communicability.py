"""Total communicability (Benzi and Klymko 2013): ``x = e^{c A^T} 1`` for flow along the edges.

Every walk of k steps that ends at a node counts ``c^k / k!``, times the weights of its edges;
the walk of no steps counts 1 and is included.  ``c`` is ``t / rho`` (scale rho: the unit of the
weights does not matter) or ``t`` itself (scale none: the plain ``e^{tA} 1``), t being the inverse
temperature (Estrada and Hatano 2007).  Scores are not normalised.

Reference: Benzi and Klymko, "Total communicability as a centrality measure", J. Complex Networks
1, 2013.
"""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty, proven_prefix, reason, refused
from kingpost.core.measures.radius import Radius, spectral_radius
from kingpost.core.operators import Pull, adjacency
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.taylor import Exponential, exponential
from kingpost.core.watch import Watch

_RADIUS_WIDTH = 1e-9  # relative width to which rho is known before c is set from it


@dataclass(frozen=True, kw_only=True)
class CommunicabilitySettings(Settings):
    """Settings of the measures made from the exponential of the adjacency."""

    inverse_temperature: float = option(
        1.0, "t in e^{tA/rho} or e^{tA}: how much long walks count", low=0.0, open_low=True
    )
    scale: str = option(
        "rho",
        "divide A by its spectral radius rho first (rho), or take it as it stands (none); "
        "without cycles rho is 0 and A is taken as it stands",
        choices=("rho", "none"),
    )


@dataclass(frozen=True)
class Factor:
    """The number A is multiplied by, in words too; ``radius`` where it was needed."""

    value: float
    words: str
    radius: Radius | None


def find_factor(
    graph: Graph, settings: CommunicabilitySettings, watch: Watch, ledger: Ledger
) -> Generator[Iteration, None, Factor | None]:
    """c of ``e^{cA}``; None if cancelled on the way."""
    t = settings.inverse_temperature
    if settings.scale == "none":
        return Factor(t, f"{t:g}, A as it stands", None)
    if graph.structure.acyclic:
        return Factor(t, f"{t:g}, A as it stands: without a cycle rho is 0", Radius(0.0, 0.0))
    steps = min(settings.max_sweeps, 5_000)
    radius = yield from ledger.relay(
        spectral_radius(graph, _RADIUS_WIDTH, watch, steps), "spectral radius"
    )
    if radius is None:
        return None
    value = t / radius.high
    return Factor(
        value, f"{value:.10g} = {t:g}/rho, rho in [{radius.low:.10g}, {radius.high:.10g}]", radius
    )


def overflowing(
    name: str,
    graph: Graph,
    settings: CommunicabilitySettings,
    factor: Factor,
    watch: Watch,
    ledger: Ledger,
) -> Solve:
    """The refusal of an exponential beyond the range of double precision."""
    if graph.structure.acyclic:
        why = "the weights of long walks exceed 1e308, the most that double precision holds"
        instead = "read weights by --weight-as log1p, or give a smaller --inverse-temperature"
        return refused(name, graph, settings, why, instead, ledger.log)
    radius = factor.radius or (
        yield from ledger.relay(spectral_radius(graph, 1e-6, watch), "spectral radius")
    )
    size = f"about {factor.value * radius.high:.4g}" if radius is not None else "too large"
    why = (
        f"c rho is {size}, and e to that power exceeds 1e308, the most that double precision holds"
    )
    instead = "use --scale rho, or a smaller --inverse-temperature"
    return refused(name, graph, settings, why, instead, ledger.log)


def solve(graph: Graph, settings: CommunicabilitySettings, watch: Watch) -> Solve:
    """Total communicability, shape (n,), each score at least 1."""
    if graph.n == 0:
        return empty("communicability", graph, settings)
    clock, ledger = Clock(), Ledger()
    factor = yield from find_factor(graph, settings, watch, ledger)
    if factor is None:
        start = np.ones(graph.n)
        nothing = Exponential(start, np.full(graph.n, np.inf), 0, Stop.CANCELLED)
        return _result(graph, settings, Factor(np.nan, "not known", None), nothing, clock, ledger)
    clock.ready()
    wanted = settings.stop_order

    def enough(x: Floats, error: Floats) -> bool:
        bound = Bound(BoundKind.COMPONENTWISE, 0.0, absolute=error)
        return wanted is not None and proven_prefix(x, bound, wanted) >= wanted

    found = yield from exponential(
        adjacency(graph, settings.flow, factor.value),
        np.ones(graph.n),
        tol=settings.tol,
        max_terms=max(1, settings.max_sweeps - ledger.sweeps),
        watch=watch,
        ledger=ledger,
        enough=enough if wanted is not None else None,
    )
    if found.overflow:
        return (yield from overflowing("communicability", graph, settings, factor, watch, ledger))
    return _result(graph, settings, factor, found, clock, ledger, watch)


def _result(
    graph: Graph,
    settings: CommunicabilitySettings,
    factor: Factor,
    found: Exponential,
    clock: Clock,
    ledger: Ledger,
    watch: Watch | None = None,
) -> Result:
    value = found.bound
    known = bool(np.isfinite(found.error).all())
    kind = BoundKind.COMPONENTWISE if known else BoundKind.NONE
    words = reason(found.stop, value, settings)
    if found.ended and found.stop is Stop.CONVERGED:
        words = (
            f"no walk is longer than {found.terms - 1:,} steps: the sum is complete, and {words}"
        )
    matrix = adjacency(graph, settings.flow, factor.value)
    facts: dict[str, Any] = {"factor": factor.value, "terms": found.terms}
    if factor.radius is not None:
        facts["rho"] = (factor.radius.low, factor.radius.high)
    return Result(
        measure="communicability",
        settings=settings,
        scores=found.x,
        stop=found.stop,
        reason=words,
        bound=Bound(kind, value, absolute=found.error if known else None),
        log=tuple(ledger.log),
        conventions=conventions(
            graph,
            settings,
            exponential="e^{c A} 1, the walk of no steps included",
            c=factor.words,
            scores="not normalised; a node that nothing leads to has 1",
        ),
        seconds=clock.seconds(),
        facts=facts,
        exact_zero=np.zeros(graph.n, dtype=bool),
        symmetry=lambda pools: _colours(matrix, watch or Watch(), pools),
    )


def _colours(
    matrix: Pull, watch: Watch, pools: NDArray[np.uint32] | None
) -> NDArray[np.int64] | None:
    from kingpost.core.colours import colours

    return (
        colours(matrix, np.ones(1), watch, pools=pools) if np.isfinite(matrix.scale).all() else None
    )


MEASURE = Measure("communicability", "C", "total communicability", CommunicabilitySettings, solve)
