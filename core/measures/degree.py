"""Degree and strength: the part of every other measure that needs no solving."""

from __future__ import annotations

import time
from dataclasses import dataclass

import numpy as np

from kingpost.core.certify import UNIT
from kingpost.core.graph import Adjacency, Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.watch import Watch


@dataclass(frozen=True, kw_only=True)
class DegreeSettings(Settings):
    """Settings of degree centrality."""

    counting: str = option(
        "strength",
        "add the weights of a node's edges (strength) or count the edges (edges)",
        choices=("strength", "edges"),
    )


def solve(graph: Graph, settings: DegreeSettings, watch: Watch) -> Solve:
    """In-strength for flow along the edges, out-strength against them; neither is normalised.

    ``x[i] = sum over edges j -> i of weight(j, i)``, each rounded once at the most; exact where
    weights are whole numbers.  In an undirected graph a self-loop counts once.
    """
    if graph.n == 0:
        return empty("degree", graph, settings)
    clock, began = Clock(), time.perf_counter()
    clock.ready()
    rows = graph.pull(settings.flow)
    counts = settings.counting == "edges" or rows.weights is None
    scores = rows.degrees.astype(np.float64) if counts else rows.strengths()
    bound = _bound(rows, scores, counts)
    exact = bound.value == 0.0
    line = Iteration(1, 0.0, bound.value, graph.stored, time.perf_counter() - began)
    yield line
    way = "in" if settings.flow == "along" else "out"
    what = f"{way}-{'degree' if counts else 'strength'}" if graph.directed else "degree"
    return Result(
        measure="degree",
        settings=settings,
        scores=scores,
        stop=Stop.CONVERGED,
        reason="counted, not solved" if exact else "added up, rounded once a node",
        bound=bound,
        log=(line,),
        conventions=conventions(graph, settings, scores=f"{what}, not normalised"),
        seconds=clock.seconds(),
        exact_zero=scores == 0,
    )


def _bound(rows: Adjacency, scores: Floats, counts: bool) -> Bound:
    """Exact where no sum was rounded: counts, multiples of 1/1024, rows of a single edge."""
    if counts or rows.weights is None:
        return Bound(BoundKind.EXACT, 0.0, absolute=0.0)
    if _coarse(rows.weights) and float(scores.max(initial=0.0)) < 2.0**42:
        return Bound(BoundKind.EXACT, 0.0, absolute=0.0)
    errors = np.where(rows.degrees > 1, 2 * UNIT * scores, 0.0)
    return Bound(BoundKind.EXACT, 2 * UNIT, absolute=errors)


def _coarse(weights: Floats) -> bool:
    """Whether every weight is a multiple of 1/1024; in pieces, for they may outgrow memory."""
    for start in range(0, len(weights), 1 << 16):
        fine = weights[start : start + (1 << 16)] * 1024.0
        if not (fine == np.floor(fine)).all():
            return False
    return True


MEASURE = Measure("degree", "D", "degree", DegreeSettings, solve, structured=False)
