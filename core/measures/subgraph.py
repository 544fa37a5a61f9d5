"""Subgraph centrality (Estrada and Rodriguez-Velazquez 2005): ``x_i = (e^{cA})_ii``.

Every closed walk of k steps through a node counts ``c^k / k!``, times the weights of its edges;
the walk of no steps counts 1 and is included.  ``c`` is as for total communicability: ``t / rho``
or ``t`` itself, t being the inverse temperature (called beta by Estrada and Hatano 2007).  The
direction of edges matters, the flow of score does not: a closed walk backwards is a closed walk.

Closed walks stay inside a strong component, so a node on no cycle has exactly 1, and components
are worked on apart.  For each node the walks are counted with a proven remainder
(:mod:`kingpost.core.solvers.closed`); on undirected graphs quadrature rules do the same by another
way (:mod:`kingpost.core.solvers.quadrature`).  Nodes with the same neighbours (twins) have the
same score and are worked on once.

Reference: Estrada and Rodriguez-Velazquez, "Subgraph centrality in complex networks", Phys. Rev. E
71, 056103, 2005.
"""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats, Graph
from kingpost.core.measures.base import Measure, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty, reason, refused
from kingpost.core.measures.communicability import (
    CommunicabilitySettings,
    Factor,
    find_factor,
    overflowing,
)
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.solvers.closed import Sides, closed_walks, norm_bound, products_needed
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.quadrature import between
from kingpost.core.structure import row_pieces
from kingpost.core.watch import Watch

_PIECE = 1_000_000  # edges between two looks whether the work was cancelled
_TOGETHER = 4_096  # nodes of small components that are worked on as one graph
_MOST_EXPONENT = 709.0  # e to this is the last number double precision holds


@dataclass(frozen=True, kw_only=True)
class SubgraphSettings(CommunicabilitySettings):
    """Settings of subgraph centrality; ``flow`` and ``stop`` have no bearing on it."""

    method: str = option(
        "walks",
        "walks (closed walks counted to a proven remainder) or quadrature (Gauss and Gauss-Radau "
        "rules by Lanczos, undirected graphs only: slower, and independent of the other)",
        choices=("walks", "quadrature"),
    )
    budget: float = option(
        2e10, "edge visits up to which walks are counted, 16 nodes at a time each", low=0.0
    )


@dataclass
class _Group:
    """Components worked on together: their numbers, and how many nodes have to be counted."""

    components: NDArray[np.int64]
    asked: int
    edges: int


def solve(graph: Graph, settings: SubgraphSettings, watch: Watch) -> Solve:
    """Subgraph centrality, shape (n,), each score at least 1."""
    if graph.n == 0:
        return empty("subgraph", graph, settings)
    if settings.method == "quadrature" and graph.directed:
        return refused(
            "subgraph", graph, settings,
            "quadrature rules enclose (e^A)_ii for symmetric A only, and this graph is directed",
            "use --set method=walks, which bounds directed graphs too, or read every edge both "
            "ways by --undirected", [],
        )  # fmt: skip
    work = _Work(graph, settings, watch)
    factor = yield from find_factor(graph, settings, watch, work.ledger)
    if factor is None:
        return work.result(Factor(np.nan, "not known", None), Stop.CANCELLED)
    try:
        why = work.prepare(factor)
        if why is not None:
            return refused("subgraph", graph, settings, *why, work.ledger.log)
        stop = yield from work.run(factor)
    except Interrupted:
        stop = Stop.CANCELLED
    if work.overflow:
        return (yield from overflowing("subgraph", graph, settings, factor, watch, work.ledger))
    return work.result(factor, stop)


class _Work:
    def __init__(self, graph: Graph, settings: SubgraphSettings, watch: Watch) -> None:
        self.graph, self.settings, self.watch = graph, settings, watch
        self.clock, self.ledger = Clock(), Ledger()
        n = graph.n
        self.x: Floats = np.ones(n)
        self.error: Floats = np.full(n, np.inf)
        self.twin: NDArray[np.int64] | None = None
        self.groups: list[_Group] = []
        self.norm = 0.0
        self.overflow = False
        self.asked = 0

    def prepare(self, factor: Factor) -> tuple[str, str] | None:
        """Find who has to be counted and what it costs; a refusal where that is too much."""
        graph, settings, watch = self.graph, self.settings, self.watch
        structure = graph.structure
        on_cycle = np.zeros(graph.n, dtype=bool)
        if not structure.acyclic:
            marked = np.zeros(structure.count, dtype=bool)
            marked[structure.cyclic] = True
            on_cycle = marked[structure.component]
        self.error[~on_cycle] = 0.0
        if structure.acyclic:
            self.clock.ready()
            return None
        whole = Sides(graph.inward, graph.outward, factor.value)
        if factor.radius is not None:
            self.norm = factor.value * factor.radius.high * (1 + 4 * UNIT)
        else:
            # Quadrature multiplies rounding by e to the norm: it needs a tight one.
            self.norm = norm_bound(whole, watch, 400 if settings.method == "quadrature" else 40)
        # Before anything is counted: no score is beyond e to the spectral radius, for a diagonal
        # similarity by the Perron vector leaves the diagonal of the exponential as it is.
        if self.norm < _MOST_EXPONENT:
            self.error[on_cycle] = np.expm1(self.norm) * (1 + 1e-12)
        self.twin = _twins(graph, watch)
        ones = self.twin == np.arange(graph.n)
        self.groups = self._grouped(ones)
        self.clock.ready()
        self.asked = sum(group.asked for group in self.groups)
        k = products_needed(self.norm, settings.tol)
        sides = 2 if graph.directed else 1
        if settings.method == "quadrature":
            sides = 16  # a node at a time
        cost = sum(k * sides * -(-group.asked // 16) * group.edges for group in self.groups)
        if cost > settings.budget:
            return (
                f"closed walks through {self.asked:,} nodes on cycles take about {cost:.2g} edge "
                f"visits, beyond the budget of {settings.budget:.2g}",
                "use --measure communicability, which counts all walks at once, or give a "
                "greater --budget",
            )
        return None

    def _grouped(self, ones: NDArray[np.bool_]) -> list[_Group]:
        """Components in condensation order, small ones together."""
        structure = self.graph.structure
        sizes = structure.sizes[structure.cyclic]
        asked = np.bincount(structure.component[ones], minlength=structure.count)[structure.cyclic]
        groups, number = [], 0
        while number < len(sizes):
            # At least one, and as many as stay together below the mark.
            reach = np.cumsum(sizes[number : number + _TOGETHER])
            end = number + max(1, int(np.searchsorted(reach, _TOGETHER, side="right")))
            part = slice(number, end)
            edges = int(structure.inner[part].sum())
            groups.append(_Group(structure.cyclic[part], int(asked[part].sum()), edges))
            number = end
        return groups

    def _built(
        self, group: _Group, factor: float
    ) -> tuple[NDArray[np.int64], Sides, NDArray[np.int64]]:
        """Nodes of a group, the matrix inside its components, and who has to be counted."""
        assert self.twin is not None
        graph, structure = self.graph, self.graph.structure
        nodes = np.concatenate([structure.members(int(number)) for number in group.components])
        nodes = np.sort(nodes).astype(np.int64)
        if group.edges == graph.stored and len(nodes) == graph.n:
            pull, push = graph.inward, graph.outward
        else:
            pull = self._inside(graph.inward, nodes, group.edges)
            push = self._inside(graph.outward, nodes, group.edges) if graph.directed else pull
        return nodes, Sides(pull, push, factor), np.flatnonzero(self.twin[nodes] == nodes)

    def _inside(self, rows: Adjacency, nodes: NDArray[np.int64], edges: int) -> Adjacency:
        """The rows of ``nodes``, cut down to edges inside their components, numbered anew."""
        component = self.graph.structure.component
        place = self.place
        place[nodes] = np.arange(len(nodes), dtype=np.uint32)
        lengths = rows.offsets[nodes + 1] - rows.offsets[nodes]
        kept = np.zeros(len(nodes) + 1, dtype=np.int64)
        near = np.empty(edges, dtype=np.uint32)
        weights = None if rows.weights is None else np.empty(edges)
        at = 0
        reach = np.concatenate(([0], np.cumsum(lengths)))
        for low, high in row_pieces(reach, _PIECE):
            self.watch.check()
            count = lengths[low:high]
            edge = np.arange(int(count.sum())) + np.repeat(
                rows.offsets[nodes[low:high]] - (reach[low:high] - reach[low]), count
            )
            taker = np.repeat(np.arange(low, high), count)
            giver = rows.neighbours[edge]
            inside = component[giver] == component[nodes[taker]]
            end = at + int(np.count_nonzero(inside))
            near[at:end] = place[giver[inside]]
            if weights is not None and rows.weights is not None:
                weights[at:end] = rows.weights[edge[inside]]
            kept[low + 1 : high + 1] = np.bincount(taker[inside] - low, minlength=high - low)
            at = end
        return Adjacency(np.cumsum(kept), near, weights)

    def run(self, factor: Factor) -> Generator[Iteration, None, Stop]:
        """Count, group after group."""
        settings = self.settings
        self.place = np.zeros(self.graph.n, dtype=np.uint32)
        for group in self.groups:
            nodes, sides, asked = self._built(group, factor.value)
            if settings.method == "walks":
                work = closed_walks(
                    sides, asked, settings.tol, self.watch,
                    None if self.graph.directed else self.norm,
                )  # fmt: skip
            else:
                work = between(sides.pull, sides.factor, asked, self.norm, settings.tol, self.watch)
            found = yield from self.ledger.relay(work)
            if found.overflow:
                self.overflow = True
                return Stop.STALLED
            done = nodes[asked[: found.done]]
            self.x[done], self.error[done] = found.value[: found.done], found.error[: found.done]
            if found.done < len(asked):
                return Stop.CANCELLED
        return Stop.CONVERGED if self._bound().value <= settings.tol else Stop.STALLED

    def _bound(self) -> Bound:
        """Bound of all scores, twins as the one that was counted for them."""
        if self.twin is not None:
            self.x, self.error = self.x[self.twin], self.error[self.twin]
        if not np.isfinite(self.error).all():
            return Bound(BoundKind.NONE, float("inf"))
        with np.errstate(over="ignore"):
            value = float(self.error.sum()) / float(self.x.sum())
        if not self.error.any():
            return Bound(BoundKind.EXACT, 0.0, absolute=0.0)
        return Bound(BoundKind.COMPONENTWISE, value * (1 + 1e-12), absolute=self.error)

    def result(self, factor: Factor, stop: Stop) -> Result:
        """Everything found, as a Result."""
        graph, settings = self.graph, self.settings
        bound = self._bound()
        words = reason(stop, bound.value, settings)
        if bound.kind is BoundKind.EXACT:
            words = "no node lies on a cycle: every score is exactly 1"
        facts: dict[str, Any] = {"factor": factor.value, "nodes counted": self.asked}
        if self.norm:
            facts["norm"] = self.norm
        if factor.radius is not None:
            facts["rho"] = (factor.radius.low, factor.radius.high)
        twin = self.twin
        return Result(
            measure="subgraph",
            settings=settings,
            scores=self.x,
            stop=stop,
            reason=words,
            bound=bound,
            log=tuple(self.ledger.log),
            conventions=conventions(
                graph,
                settings,
                flow="closed walks along the edges; backwards they are the same"
                if graph.directed
                else "both ways: the graph is undirected",
                exponential="diagonal of e^{c A}, the walk of no steps included",
                method="closed walks with a proven remainder"
                if settings.method == "walks"
                else "Gauss and Gauss-Radau quadrature by Lanczos",
                c=factor.words,
                scores="not normalised; a node on no cycle has exactly 1",
            ),
            seconds=self.clock.seconds(),
            facts=facts,
            exact_zero=np.zeros(graph.n, dtype=bool),
            symmetry=None if twin is None else lambda _: _classes(graph, twin),
        )


def _twins(graph: Graph, watch: Watch) -> NDArray[np.int64]:
    """For each node the first with the same neighbours by the same weights, shape (n,).

    Two such nodes can change places without changing the matrix.  Rows are compared by hashes of
    64 bits, as in :mod:`kingpost.core.colours`.
    """
    from kingpost.core.kernels.colour import refine

    n = graph.n
    keys = np.zeros(n, dtype=np.uint64)
    order, same = np.arange(n, dtype=np.uint32), np.zeros(n, dtype=np.uint64)
    number = (np.arange(n, dtype=np.uint64) + np.uint64(1)) * np.uint64(0x9E3779B97F4A7C15)
    sides = (graph.inward,) if not graph.directed else (graph.inward, graph.outward)
    for rows in sides:
        bits = None if rows.weights is None else rows.weights.view(np.uint64)
        for low in range(0, n, 100_000):
            watch.check()
            refine(
                rows.offsets, rows.neighbours, bits, order, low, min(low + 100_000, n), same,
                number, keys,
            )  # fmt: skip
        same = keys.copy()  # what the inward rows say starts the hash of the outward ones
    _, first, inverse = np.unique(keys, return_index=True, return_inverse=True)
    found: NDArray[np.int64] = first[inverse.ravel()].astype(np.int64)
    return found


def _classes(graph: Graph, twin: NDArray[np.int64]) -> NDArray[np.int64]:
    """Classes of scores known to be equal: twins, and all nodes on no cycle."""
    structure = graph.structure
    classes = twin.copy()
    marked = np.zeros(structure.count, dtype=bool)
    marked[structure.cyclic] = True
    off = ~marked[structure.component]
    if off.any():
        classes[off] = int(np.argmax(off))
    return np.unique(classes, return_inverse=True)[1].ravel().astype(np.int64)


MEASURE = Measure("subgraph", "G", "subgraph centrality", SubgraphSettings, solve)
