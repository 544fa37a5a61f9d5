"""Hubs and authorities (Kleinberg 1999): ``a ~ A^T h``, ``h ~ A a`` for flow along the edges.

A good authority is pointed at by good hubs, a good hub points at good authorities: the dominant
left and right singular vectors of A.  They are the two halves of the Perron vector of
``[[0, A], [A^T, 0]]``, the adjacency of a graph in which every node stands twice, once as a hub and
once as an authority.  ``A A^T`` is never formed: one product with that matrix is a product with A
and one with its transpose.

The answer is unique where one connected part of that doubled graph has the largest singular value
sigma; all other nodes have 0 exactly.  Where two parts tie, the classical iteration returns
whatever its start decides: then there is no answer, and the verdict says so.  Scores have
Euclidean length 1.

Reference: Kleinberg, "Authoritative sources in a hyperlinked environment", J. ACM 46, 1999.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty, proven_prefix, reason, refused
from kingpost.core.operators import Pull, adjacency
from kingpost.core.result import Bound, BoundKind, Result, Stop
from kingpost.core.solvers.dominating import Block, sharpen
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.perron import Bracketed, bracket
from kingpost.core.solvers.pinned import normalised_reach, support
from kingpost.core.structure import Structure, analyse
from kingpost.core.text import count
from kingpost.core.watch import Watch


@dataclass(frozen=True, kw_only=True)
class HitsSettings(Settings):
    """Settings of hubs and authorities."""

    role: str = option(
        "authority",
        "score authorities (pointed at by good hubs) or hubs (pointing at good authorities); flow "
        "against the edges swaps the two",
        choices=("authority", "hub"),
    )
    component: str | None = option(
        None, "a node: answer within the part of hubs and authorities it belongs to"
    )


def solve(graph: Graph, settings: HitsSettings, watch: Watch) -> Solve:
    """Authority or hub scores, shape (n,), Euclidean length 1."""
    if graph.n == 0:
        return empty("hits", graph, settings)
    if graph.stored == 0:
        return refused(
            "hits", graph, settings, "the graph has no edges, so there are no hubs or authorities",
            "load a table in which edges are not all loops or of weight 0", [],
        )  # fmt: skip
    work = _Work(graph, settings)
    try:
        work.structure = analyse(work.double, watch)
        work.clock.ready()
        only = work.named()
        if only is not None and only not in work.structure.cyclic:
            name = graph.name(graph.find(settings.component or ""), 60)
            return refused(
                "hits", graph, settings, f"{name} has no edges as {work.role_words}",
                "name another node, or take the other --role", [],
            )  # fmt: skip
        found: Bracketed = yield from work.ledger.relay(
            bracket(
                work.matrix, work.structure, scores=settings.tol,
                max_steps=settings.max_sweeps, watch=watch, only=only,
            ),
            "bracket",
        )  # fmt: skip
    except Interrupted:
        return work.result(Stop.CANCELLED, watch)
    work.sigma = found.rho
    if found.cancelled:
        work.y = found.y
        return work.result(Stop.CANCELLED, watch)
    if not found.decided:
        if found.steps < settings.max_sweeps:
            return refused("hits", graph, settings, *work.tie(found), work.ledger.log)
        work.y = found.y
        return work.result(Stop.LIMIT, watch)
    inside = support(work.structure, int(found.components[0]), work.double.n)
    block = Block(
        work.matrix, work.structure, "along", inside, np.where(inside, found.y, 0.0), found.rho,
        left=found.left, product=found.product,
    )  # fmt: skip
    wanted = settings.stop_order
    work.bound, stop = yield from sharpen(
        block, work.shape, tol=settings.tol, max_sweeps=settings.max_sweeps, watch=watch,
        ledger=work.ledger,
        enough=None
        if wanted is None
        else lambda scores, bound: proven_prefix(scores, bound, wanted) >= wanted,
    )  # fmt: skip
    work.y, work.sigma, work.inside = block.y, block.rho, inside
    return work.result(stop, watch)


class _Work:
    structure: Structure

    def __init__(self, graph: Graph, settings: HitsSettings) -> None:
        self.graph, self.settings = graph, settings
        self.clock, self.ledger = Clock(), Ledger()
        # Flow against the edges: who is high by pointing at others is the authority.
        self.takes = (settings.role == "authority") == (settings.flow == "along")
        self.double = doubled(graph)
        self.matrix = adjacency(self.double, "along")
        self.half = slice(graph.n, None) if self.takes else slice(0, graph.n)
        self.y: Floats = np.zeros(self.double.n)
        self.y[self.half] = 1.0
        self.sigma = (0.0, float("inf"))
        self.inside: NDArray[np.bool_] | None = None
        self.bound = Bound(BoundKind.NONE, float("inf"))

    @property
    def role_words(self) -> str:
        """What the scored role does."""
        return "a node that is pointed at" if self.takes else "a node that points at others"

    def shape(self, y: Floats, errors: Floats) -> tuple[Floats, Floats]:
        """Scores of the wanted role and the bounds of their errors."""
        mine = y[self.half]
        return mine / np.linalg.norm(mine), normalised_reach(mine, errors[self.half], 2)

    def named(self) -> int | None:
        """The part the node named in the settings belongs to, in the wanted role."""
        if self.settings.component is None:
            return None
        node = self.graph.find(self.settings.component)
        return int(self.structure.component[node + (self.graph.n if self.takes else 0)])

    def tie(self, found: Bracketed) -> tuple[str, str]:
        """The verdict on parts whose largest singular values cannot be told apart."""
        low, high = found.rho
        n, first = self.graph.n, []
        for number in found.components[:2]:
            nodes = self.structure.members(int(number))
            mine = nodes[nodes >= n] - n if self.takes else nodes[nodes < n]
            first.append(int(mine.min()))
        names = [self.graph.name(node, 40) for node in sorted(first)]
        return (
            f"the largest singular value, in [{low:.12g}, {high:.12g}], belongs to "
            f"{len(found.components):,} separate parts of hubs and authorities ({names[0]} in one, "
            f"{names[1]} in another), so the answer would depend on where the iteration starts",
            f"answer within one with --component {names[0]}, or use --measure katz",
        )

    def result(self, stop: Stop, watch: Watch) -> Result:
        """Everything found, as a Result."""
        graph, settings, inside = self.graph, self.settings, self.inside
        low, high = self.sigma
        scores, _ = self.shape(self.y, np.zeros(self.double.n))
        zero = None if inside is None else ~inside[self.half]
        if inside is None:
            where = "not decided"
        else:
            live = int(np.count_nonzero(inside[self.half]))
            of = "of the node named" if settings.component is not None else "dominating"
            where = f"{of}: {count(live, 'node')} in this role, {graph.n - live:,} exactly 0"
        high_is = "is pointed at by good hubs" if self.takes else "points at good authorities"
        words = reason(stop, self.bound.value, settings)
        if stop is Stop.LIMIT and inside is None:
            words += ", and which part of the graph dominates is not decided"
        return Result(
            measure="hits",
            settings=settings,
            scores=scores,
            stop=stop,
            reason=words,
            bound=self.bound,
            log=tuple(self.ledger.log),
            conventions=conventions(
                graph,
                settings,
                flow=f"{settings.flow} {graph.origin.source} -> {graph.origin.target}, "
                f"{settings.role}: high is who {high_is}"
                if graph.directed
                else "both ways: the graph is undirected, hubs and authorities are the same",
                part=where,
                sigma=f"largest singular value, in [{low:.12g}, {high:.12g}]",
                scores="Euclidean length 1",
            ),
            seconds=self.clock.seconds(),
            facts={"sigma": self.sigma},
            exact_zero=zero,
            symmetry=None if inside is None else lambda pools: self._colours(inside, watch),
        )

    def _colours(self, inside: NDArray[np.bool_], watch: Watch) -> NDArray[np.int64] | None:
        from kingpost.core.colours import colours

        kept = Pull(self.matrix.rows, np.where(inside, self.matrix.scale, 0.0))
        found: Any = colours(kept, inside.astype(np.float64), watch)
        if found is None:
            return None
        classes = np.unique(found[self.half], return_inverse=True)[1]
        return classes.astype(np.int64).ravel()


def doubled(graph: Graph) -> Graph:
    """The graph in which node i stands as a hub (number i) and as an authority (n + i).

    Undirected, one edge for each of ``graph``; the numbers of its nodes are its labels.
    """
    import pyarrow as pa

    out, into = graph.outward, graph.inward
    rows = Adjacency(
        np.concatenate((out.offsets, out.offsets[-1] + into.offsets[1:])),
        np.concatenate((out.neighbours + np.uint32(graph.n), into.neighbours)),
        None
        if out.weights is None or into.weights is None
        else np.concatenate((out.weights, into.weights)),
    )
    labels = pa.array(np.arange(2 * graph.n, dtype=np.uint32))
    return Graph(labels, rows, rows, directed=False)


MEASURE = Measure("hits", "H", "HITS", HitsSettings, solve, structured=False)
