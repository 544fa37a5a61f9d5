"""How a graph is built: what to know about it before believing any ranking of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Graph
from kingpost.core.measures.base import finish
from kingpost.core.measures.radius import spectral_radius
from kingpost.core.structure import weak_components
from kingpost.core.watch import Watch

RADIUS_WIDTH = 1e-9  # relative width of the bracket asked for; rounding may leave it wider
QUANTILES = (0.0, 0.25, 0.5, 0.75, 0.9, 0.99, 1.0)


@dataclass(frozen=True, slots=True)
class Weights:
    """Sum, least and greatest weight of the stored edges."""

    total: float
    least: float
    greatest: float


@dataclass(frozen=True, slots=True)
class Audit:
    """The structure of a graph.

    Attributes:
        nodes, edges: their numbers; an undirected edge counts once.
        density: edges other than self-loops, as a share of all that could be.
        weights: None where every edge weighs 1.
        in_degrees, out_degrees: number of neighbours at each of :data:`QUANTILES`, the least
            value that at least that share of the nodes does not exceed.
        dangling: nodes that point at nobody; sources: nodes nobody points at; isolated: both.
        self_loops: edges from a node to itself.
        zero_weight: edges left out because they weigh nothing.
        weak, weak_largest: weakly connected components, nodes in the largest.
        strong, strong_largest: strongly connected components, nodes in the largest.
        cyclic: strong components that hold a cycle.
        cyclic_share: share of the stored edges inside those: what needs iterating.
        period: greatest common divisor of the cycle lengths in the cyclic component with most
            edges (1: aperiodic), ``period_nodes`` its size; None on an acyclic graph.
        radius: bracket of the spectral radius of A; (0, 0) on an acyclic graph.
    """

    nodes: int
    edges: int
    density: float
    weights: Weights | None
    in_degrees: tuple[int, ...]
    out_degrees: tuple[int, ...]
    dangling: int
    sources: int
    isolated: int
    self_loops: int
    zero_weight: int
    weak: int
    weak_largest: int
    strong: int
    strong_largest: int
    cyclic: int
    cyclic_share: float
    period: int | None
    period_nodes: int | None
    radius: tuple[float, float]


def examine(graph: Graph, watch: Watch | None = None) -> Audit:
    """Examine a graph.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    watch.report("counting degrees", 0, graph.n, "nodes")
    gains, gives = graph.inward.degrees, graph.outward.degrees
    watch.check()
    structure = graph.structure
    watch.check()
    watch.report("finding weak components", 0, graph.n, "nodes")
    weak = np.bincount(weak_components(graph, watch), minlength=1)
    watch.check()
    period = period_nodes = None
    if not structure.acyclic:
        main = int(structure.cyclic[np.argmax(structure.inner)])
        period, period_nodes = structure.period(main), int(structure.sizes[main])
    return Audit(
        nodes=graph.n,
        edges=graph.m,
        density=density(graph),
        weights=_weights(graph.outward),
        in_degrees=quantiles(gains),
        out_degrees=quantiles(gives),
        dangling=int(np.count_nonzero(gives == 0)),
        sources=int(np.count_nonzero(gains == 0)),
        isolated=int(np.count_nonzero((gives == 0) & (gains == 0))),
        self_loops=graph.loop_count,
        zero_weight=graph.account.zero_weight,
        weak=int(np.count_nonzero(weak)),
        weak_largest=int(weak.max()),
        strong=structure.count,
        strong_largest=int(structure.sizes.max(initial=0)),
        cyclic=len(structure.cyclic),
        cyclic_share=structure.share_iterated,
        period=period,
        period_nodes=period_nodes,
        radius=_radius(graph, watch),
    )


def _radius(graph: Graph, watch: Watch) -> tuple[float, float]:
    found = finish(
        spectral_radius(graph, RADIUS_WIDTH, watch),
        lambda line: watch.report("bracketing the spectral radius", line.index, unit="steps"),
    )
    if found is None:
        raise Interrupted("cancelled before there was an answer to keep")
    return found.low, found.high


def density(graph: Graph) -> float:
    """Edges other than self-loops over n (n - 1), or half that where undirected; 0 for n < 2."""
    pairs = graph.n * (graph.n - 1)
    if not graph.directed:
        pairs //= 2
    return (graph.m - graph.loop_count) / pairs if pairs else 0.0


def quantiles(degrees: NDArray[np.int64]) -> tuple[int, ...]:
    """Degrees at each of :data:`QUANTILES`: always values that occur, never interpolated."""
    if len(degrees) == 0:
        return (0,) * len(QUANTILES)
    found = np.quantile(degrees, QUANTILES, method="inverted_cdf")
    return tuple(int(value) for value in found)


def _weights(side: Adjacency) -> Weights | None:
    if side.weights is None or len(side.weights) == 0:
        return None
    values = side.weights
    return Weights(float(values.sum()), float(values.min()), float(values.max()))
