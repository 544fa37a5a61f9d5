"""Eigenvector centrality (Bonacich 1972): ``A^T x = rho x`` for flow along the edges, x >= 0.

Unique only where one strong component dominates: it has the largest spectral radius rho, and
nothing it feeds reaches that.  Then x is positive on that component and everything downstream
of it, and zero elsewhere by structure.  Two components that tie for rho make every mixture of
theirs a solution; an acyclic graph has rho = 0 and no solution at all.  Both are said, not
computed.  Scores have Euclidean length 1.
"""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import Residual
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Floats, Graph
from kingpost.core.layout import layout
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import (
    Clock,
    conventions,
    empty,
    proven_prefix,
    reason,
    refused,
)
from kingpost.core.operators import Pull, adjacency, strengths
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.solvers.dominating import Block, sharpen
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.linear import System
from kingpost.core.solvers.linear import solve as solve_linear
from kingpost.core.solvers.perron import LEAST, Bracketed, bracket
from kingpost.core.solvers.pinned import normalised_reach, support
from kingpost.core.solvers.tied import same_radius
from kingpost.core.structure import downstream, reachable
from kingpost.core.text import count
from kingpost.core.watch import Watch


@dataclass(frozen=True, kw_only=True)
class EigenvectorSettings(Settings):
    """Settings of eigenvector centrality."""

    component: str | None = option(
        None, "a node: answer within its strong component instead of the dominating one"
    )
    certificate: str = option(
        "componentwise",
        "bound every score (componentwise), or only bracket the eigenvalue (bracket)",
        choices=("componentwise", "bracket"),
    )


def solve(
    graph: Graph, settings: EigenvectorSettings, watch: Watch, start: Floats | None = None
) -> Solve:
    """Eigenvector scores, shape (n,), length 1; ``start`` may be those of a near problem."""
    if graph.n == 0:
        return empty("eigenvector", graph, settings)
    work = _Work(graph, settings, watch, start)
    why = work.without_answer()
    if why is None:
        try:
            why = yield from work.find()
        except Interrupted:
            return work.result(Stop.CANCELLED)
    if why is not None:
        return refused("eigenvector", graph, settings, *why, work.ledger.log)
    if work.open:
        return work.result(Stop.LIMIT)
    try:
        stop = yield from work.certify()
    except Interrupted:
        stop = Stop.CANCELLED
    return work.result(stop)


def _unit(y: Floats, errors: Floats) -> tuple[Floats, Floats]:
    """Scores of Euclidean length 1, and the bounds of their errors."""
    return y / np.linalg.norm(y), normalised_reach(y, errors, 2)


class _Work:
    def __init__(
        self, graph: Graph, settings: EigenvectorSettings, watch: Watch, start: Floats | None
    ) -> None:
        self.graph, self.settings, self.watch = graph, settings, watch
        self.start = start
        self.clock = Clock()
        # Everything is found in the numbers that rows are visited in, and told in the graph's.
        self.natural = adjacency(graph, settings.flow)
        self.laid = layout(graph.structure, self.natural.rows, watch)
        self.structure = self.laid.structure
        self.matrix = self.laid.matrix(self.natural)
        self.ledger = Ledger()
        self.x: Floats = np.zeros(graph.n)
        self.rho = (0.0, float("inf"))
        self.bound = Bound(BoundKind.NONE, float("inf"))
        self.live: NDArray[np.bool_] = np.zeros(graph.n, dtype=bool)
        self.left: Floats | None = None
        self.product: tuple[Floats, Floats] | None = None
        self.chosen = -1
        self.open = False  # which component dominates was not found out
        self.clock.ready()

    def without_answer(self) -> tuple[str, str] | None:
        """Why there can be no answer at all, and what to use instead."""
        structure, settings = self.structure, self.settings
        if structure.acyclic:
            return (
                "the graph has no cycle, so its spectral radius is 0 and no eigenvector centrality "
                "exists",
                "use --measure katz, which counts walks and is exact here",
            )
        if settings.component is not None:
            node = self.graph.find(settings.component)
            self.chosen = int(self.graph.structure.component[node])
            if self.chosen not in structure.cyclic:
                return (
                    f"{self.graph.name(node, 60)} lies on no cycle, so its strong component has no "
                    "eigenvector",
                    "name a node on a cycle, or use --measure katz",
                )
        return None

    def find(self) -> Generator[Iteration, None, tuple[str, str] | None]:
        """The dominating component and its vector; a refusal where several tie."""
        settings = self.settings
        found = yield from self._bracketed(self.chosen if self.chosen >= 0 else None)
        if not found.decided:
            if found.steps >= settings.max_sweeps:  # no verdict yet: nothing is said of a tie
                self.x, self.open = found.y, True
                return None
            winner = self._last_of_chain(found)
            if winner is None:
                return self._tie(found)
            found = yield from self._bracketed(winner)
        self.chosen = int(found.components[0])
        self.limit = found.steps >= settings.max_sweeps
        inside = support(self.structure, self.chosen, self.graph.n)
        self.live = inside
        if settings.component is None:
            live = downstream(
                self.graph.structure, self.natural.rows, self.graph.push(settings.flow),
                self.chosen, settings.flow, self.watch,
            )  # fmt: skip
            self.live = self.laid.there(live)
            if not np.array_equal(self.live, inside):
                yield from self._downstream(self.live & ~inside)
        return None

    def _bracketed(self, only: int | None) -> Generator[Iteration, None, Bracketed]:
        """The bracket of one component, or of all; kept as the best there is if cancelled."""
        start = None if self.start is None else self.laid.there(self.start)
        tol, every = self.settings.tol, self.settings.certificate == "componentwise"
        found: Bracketed = yield from self.ledger.relay(
            bracket(
                self.matrix, self.structure,
                max_steps=self.settings.max_sweeps, watch=self.watch, only=only, start=start,
                gives=self.laid.there(strengths(self.graph, self.settings.flow)),
                width=max(tol, LEAST), scores=tol if every else None,
            ),
            "bracket",
        )  # fmt: skip
        self.rho, self.x = found.rho, found.y
        self.left, self.product = found.left, found.product
        if found.cancelled:
            if np.isfinite(found.rho[1]):
                low, high = found.rho
                self.bound = Bound(BoundKind.BRACKET, (high - low) / high)
            raise Interrupted("cancelled")
        return found

    def _last_of_chain(self, found: Bracketed) -> int | None:
        """Of components that tie, the one all others feed: then it alone has a vector."""
        if len(found.components) > 8 or not same_radius(
            self.natural, self.graph.structure, found.components, self.watch
        ):
            return None
        push = self.graph.push(self.settings.flow)
        numbers = found.components.tolist()
        last = numbers[-1] if self.settings.flow == "along" else numbers[0]
        structure = self.graph.structure
        mark = int(structure.members(last)[0])
        for number in numbers:
            start = structure.members(number)[:1]
            if number != last and not reachable(push, start, self.watch)[mark]:
                return None
        return int(last)

    def _tie(self, found: Bracketed) -> tuple[str, str]:
        sizes = self.structure.sizes[found.components]
        low, high = found.rho
        names = [
            self.graph.name(int(self.graph.structure.members(int(number))[0]), 40)
            for number in found.components[:2]
        ]
        total = len(found.components)
        verdict = (
            f"{total:,} strong components (of {int(sizes.min()):,} to {int(sizes.max()):,} nodes, "
            f"{names[0]} in one, {names[1]} in another) tie for the spectral radius, in "
            f"[{low:.12g}, {high:.12g}], so the eigenvector is not unique"
        )
        return (
            verdict,
            f"answer within one with --component {names[0]}, or use --measure katz",
        )

    def _downstream(self, below: NDArray[np.bool_]) -> Generator[Iteration, None, None]:
        """Scores of what the dominating component feeds: ``(rho I - B) x = B x_D``."""
        middle = 0.5 * (self.rho[0] + self.rho[1])
        takers = np.flatnonzero(below).astype(np.uint32)
        given, _ = self.matrix.apply_exactly(self.x, takers, 0, len(takers), self.watch)
        given /= middle
        scale = np.where(below, self.matrix.scale / middle, 0.0)
        mass = float(self.x.sum())

        def judge(x: Floats, r: Residual) -> tuple[float, bool]:
            return r.norm / (mass + float(np.abs(x).sum())), False

        found = yield from self.ledger.relay(
            solve_linear(
                System(Pull(self.matrix.rows, scale), given, self.structure, self.settings.flow),
                judge,
                tol=0.1 * self.settings.tol,
                max_sweeps=self.settings.max_sweeps,
                watch=self.watch,
            ),
            "downstream",
        )
        if found.stop is Stop.CANCELLED:
            raise Interrupted("cancelled")
        self.x = np.where(below, found.x, self.x)

    def certify(self) -> Generator[Iteration, None, Stop]:
        """Bound every score, sharpening the vector until the bound is what was asked for."""
        settings = self.settings
        low, high = self.rho
        width = (high - low) / high
        self.bound = Bound(BoundKind.BRACKET, width)
        if settings.certificate == "bracket":
            return Stop.CONVERGED if width <= settings.tol else self._short()
        block = Block(
            self.matrix, self.structure, settings.flow, self.live, self.x, self.rho,
            home=support(self.structure, self.chosen, self.graph.n), left=self.left,
            product=self.product,
        )  # fmt: skip
        wanted = settings.stop_order
        bound, stop = yield from sharpen(
            block, _unit, tol=settings.tol, max_sweeps=settings.max_sweeps, watch=self.watch,
            ledger=self.ledger,
            enough=None
            if wanted is None
            else lambda scores, bound: proven_prefix(scores, bound, wanted) >= wanted,
        )  # fmt: skip
        self.x, self.rho = block.y, block.rho
        if np.isfinite(bound.value):
            self.bound = bound
        return stop

    def _short(self) -> Stop:
        return Stop.LIMIT if self.limit else Stop.STALLED

    def result(self, stop: Stop) -> Result:
        """Everything found, as a Result."""
        settings, graph = self.settings, self.graph
        norm = float(np.linalg.norm(self.x))
        scores = self.laid.back(self.x / norm if norm > 0 else self.x)
        if isinstance(self.bound.absolute, np.ndarray):
            self.bound = replace(self.bound, absolute=self.laid.back(self.bound.absolute))
        low, high = self.rho
        words = reason(stop, self.bound.value, settings)
        if self.bound.kind is BoundKind.BRACKET:
            words = (
                f"rho is known to a relative width of {self.bound.value:.1e}; the scores "
                "themselves are not bounded (--certificate componentwise bounds them)"
            )
        live = self.laid.back(self.live)
        if live.any():
            size = int(self.structure.sizes[self.chosen])
            zero = int((~live).sum())
            where = (
                f"dominating strong component of {count(size, 'node')}, "
                f"{count(int(live.sum()) - size, 'node')} downstream, "
                f"{count(zero, 'node')} exactly 0"
            )
            period = graph.structure.period(self.chosen)
        else:
            where, period = "not decided", 0
        matrix = self.natural
        return Result(
            measure="eigenvector",
            settings=settings,
            scores=scores,
            stop=stop,
            reason=words,
            bound=self.bound,
            log=tuple(self.ledger.log),
            conventions=conventions(
                graph,
                settings,
                component=where if settings.component is None else "of the node named: " + where,
                rho=f"in [{low:.12g}, {high:.12g}]",
                period=f"{period}" + (" (iterated with a shift)" if period > 1 else ""),
                scores="Euclidean length 1",
            ),
            seconds=self.clock.seconds(),
            facts={"rho": self.rho, "period": period},
            exact_zero=~live if live.any() else None,
            symmetry=lambda pools: _colours(graph, settings, matrix, live, self.watch, pools),
        )


def _colours(
    graph: Graph,
    settings: EigenvectorSettings,
    matrix: Pull,
    live: NDArray[np.bool_],
    watch: Watch,
    pools: NDArray[np.uint32] | None,
) -> NDArray[np.int64] | None:
    from kingpost.core.colours import colours

    if not live.any():
        return None
    kept = Pull(matrix.rows, np.where(live, matrix.scale, 0.0))
    return colours(kept, live.astype(np.float64), watch, graph.structure, settings.flow, pools)


MEASURE = Measure("eigenvector", "E", "eigenvector", EigenvectorSettings, solve)
