"""Ratings from pairwise outcomes: a vote shared out among those one met (after Keener 1993).

``S[i, j]`` is what i won against j: the weight of the edge j -> i for flow along the edges, so
that a table of ``loser, winner, margin`` and a table of points scored both ways are read alike;
what is not in the table is 0.  Two nodes met if either won anything against the other.  A link
function makes of the two sums what i earns with j, between 0 and 1, and ``a[j, i]`` is the rest:

- laplace: ``a = (S_ij + 1) / (S_ij + S_ji + 2)``, Laplace's share of the points;
- skew: ``h(a)`` of that, ``h(x) = 1/2 + sgn(x - 1/2) sqrt|2x - 1| / 2``, which tells close results
  apart and blunts routs (Keener 1993);
- logistic: ``1 / (1 + e^-(S_ij - S_ji)/unit)`` of the margin.

Division *vote*: every node divides one vote among those it met, in proportion to what they earned
with it.  That matrix has columns of sum 1; ratings are its Perron vector, and rho is 1.  Division
*games*: rows are divided by the number of opponents, as Keener does, and ratings are the Perron
vector of that.  The diagonal holds the number set, 0 unless asked for otherwise.

A rating compares only nodes that a chain of meetings joins: where there are several groups that
never met, there is no one answer, and the verdict says so.  Ratings sum to 1.

Reference: Keener, "The Perron-Frobenius theorem and the ranking of football teams", SIAM Review
35, 1993.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats, Flow, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty, proven_prefix, reason, refused
from kingpost.core.operators import Pull
from kingpost.core.parallel import each
from kingpost.core.result import Bound, BoundKind, Result, Stop
from kingpost.core.solvers.dominating import Block, sharpen
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.perron import Bracketed, bracket
from kingpost.core.solvers.pinned import normalised_reach, support
from kingpost.core.structure import Structure, analyse, row_pieces
from kingpost.core.text import count
from kingpost.core.watch import Watch

_PIECE = 2_000_000  # entries between two looks whether the work was cancelled

_LINKS = {
    "laplace": "Laplace's share (S_ij + 1) / (S_ij + S_ji + 2), one point to each side beforehand",
    "skew": "Keener's 1993 skew of (S_ij + 1) / (S_ij + S_ji + 2)",
    "logistic": "1 / (1 + e^-m), m the margin S_ij - S_ji",
}


@dataclass(frozen=True, kw_only=True)
class VotesSettings(Settings):
    """Settings of ratings from pairwise outcomes."""

    link: str = option(
        "laplace",
        "what an outcome earns: laplace (smoothed share of the points), skew (Keener's 1993 skew "
        "of it) or logistic (of the margin)",
        choices=("laplace", "skew", "logistic"),
    )
    unit: float | None = option(
        None,
        "logistic: the margin that counts as one; else the mean margin of those who met",
        low=0.0,
        open_low=True,
    )
    division: str = option(
        "vote",
        "vote (each node divides one vote among those it met) or games (each row is divided by "
        "the number of opponents, as Keener does)",
        choices=("vote", "games"),
    )
    diagonal: float = option(
        0.0, "what a node earns with itself, before dividing: 0, or 0.5 for a draw", low=0.0
    )
    component: str | None = option(
        None, "a node: answer within the group of nodes that meetings join it to"
    )


@dataclass(frozen=True)
class Ballot:
    """The matrix of votes and what it was made from.

    Attributes:
        matrix: entries positive exactly where two nodes met (and on the diagonal, if it is set).
        structure: its strong components: groups joined by meetings, and nodes that met nobody.
        opponents: number of nodes each node met, shape (n,).
        unit: of the logistic link, else 1.
        spread: the most an entry is off, relative to itself.
    """

    matrix: Pull
    structure: Structure
    opponents: NDArray[np.int64]
    unit: float
    spread: float


def ballot(graph: Graph, settings: VotesSettings, watch: Watch) -> Ballot:
    """The matrix whose Perron vector the ratings are.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    from kingpost.core.kernels import votes as kernels

    kind = {"laplace": kernels.LAPLACE, "skew": kernels.SKEW, "logistic": kernels.LOGISTIC}
    starts, neighbours, won, lost = _meetings(graph, settings.flow, settings.diagonal > 0, watch)
    unit, steep = 1.0, 0.0
    if settings.link == "logistic" and len(won):
        unit, greatest = _margins(won, lost, watch)
        unit = settings.unit or unit or 1.0
        steep = min(greatest / unit, kernels.FAR)
    n, games = graph.n, settings.division == "games"
    given, opponents = np.zeros(n), np.zeros(n, dtype=np.int64)

    def piece(part: tuple[int, int]) -> None:
        watch.check()
        kernels.link(
            starts, neighbours, *part, kind[settings.link], unit, settings.diagonal, games,
            won, lost, given, opponents,
        )  # fmt: skip

    each(piece, list(row_pieces(starts, _PIECE)), watch.threads)
    scale = np.ones(n)
    if not games:
        np.divide(1.0, given, out=scale, where=given > 0)
    rows = Adjacency(starts, neighbours, won)
    structure = analyse(Graph(graph.labels, rows, rows, directed=False), watch)
    # An entry: at most 11 roundings, in a logistic one the exponent's error as well; its column's
    # sum as many more; doubled.
    spread = 2 * UNIT * (2 * (11 + 4 * steep) + 6)
    return Ballot(Pull(rows, scale), structure, opponents, unit, spread)


def _margins(won: Floats, lost: Floats, watch: Watch) -> tuple[float, float]:
    """Mean and greatest margin of those who met; entries of the diagonal hold no points."""
    total, pairs, greatest = 0.0, 0, 0.0
    for low in range(0, len(won), _PIECE):
        watch.check()
        mine, theirs = won[low : low + _PIECE], lost[low : low + _PIECE]
        margins = np.abs(mine - theirs)
        total += float(margins.sum())
        greatest = max(greatest, float(margins.max()))
        pairs += int(np.count_nonzero(mine + theirs))
    return total / max(1, pairs), greatest


def _meetings(
    graph: Graph, flow: Flow, itself: bool, watch: Watch
) -> tuple[NDArray[np.int64], NDArray[np.uint32], Floats, Floats]:
    """Rows of those each node met, with the points won against and lost to each."""
    from kingpost.core.kernels.votes import meet

    won_rows, lost_rows, n = graph.pull(flow), graph.push(flow), graph.n
    starts = np.zeros(n + 1, dtype=np.int64)
    neighbours, won, lost = np.empty(0, np.uint32), np.empty(0), np.empty(0)

    def piece(part: tuple[int, int]) -> None:
        watch.check()
        meet(
            won_rows.offsets, won_rows.neighbours, won_rows.weights,
            lost_rows.offsets, lost_rows.neighbours, lost_rows.weights, *part, itself,
            starts, neighbours, won, lost,
        )  # fmt: skip

    pieces = list(row_pieces(won_rows.offsets + lost_rows.offsets, _PIECE))
    each(piece, pieces, watch.threads)
    np.cumsum(starts, out=starts)
    total = int(starts[-1])
    if total:
        neighbours, won, lost = np.empty(total, np.uint32), np.empty(total), np.empty(total)
        each(piece, pieces, watch.threads)
    return starts, neighbours, won, lost


def solve(graph: Graph, settings: VotesSettings, watch: Watch) -> Solve:
    """Ratings of those who met anybody, shape (n,), sum 1; nodes that met nobody have 0."""
    if graph.n == 0:
        return empty("votes", graph, settings)
    work = _Work(graph, settings, watch)
    node = None if settings.component is None else graph.find(settings.component)
    try:
        work.ballot = ballot(graph, settings, watch)
    except Interrupted:
        return work.result(Stop.CANCELLED)
    work.clock.ready()
    why = work.choose(node)
    if why is not None:
        return refused("votes", graph, settings, *why, work.ledger.log)
    matrix, structure = work.ballot.matrix, work.ballot.structure
    found: Bracketed = yield from work.ledger.relay(
        bracket(
            matrix, structure, scores=settings.tol,
            max_steps=settings.max_sweeps, watch=watch, only=work.group,
        ),
        "bracket",
    )  # fmt: skip
    work.y, work.rho = found.y, work.widened(found.rho)
    if found.cancelled:
        return work.result(Stop.CANCELLED)
    block = Block(
        matrix, structure, "along", work.inside, found.y, work.rho, spread=work.ballot.spread,
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
    work.y, work.rho = block.y, work.widened(block.rho)
    return work.result(stop)


class _Work:
    ballot: Ballot

    def __init__(self, graph: Graph, settings: VotesSettings, watch: Watch) -> None:
        self.graph, self.settings, self.watch = graph, settings, watch
        self.clock, self.ledger = Clock(), Ledger()
        self.y: Floats = np.ones(graph.n)
        self.rho = (0.0, float("inf"))
        self.bound = Bound(BoundKind.NONE, float("inf"))
        self.group = -1
        self.groups = 0
        self.inside = np.zeros(graph.n, dtype=bool)

    def choose(self, node: int | None) -> tuple[str, str] | None:
        """Settle on a group; why there is no one answer, if there is none."""
        structure, graph = self.ballot.structure, self.graph
        large = np.flatnonzero(structure.sizes > 1)
        self.groups = len(large)
        if len(large) == 0:
            return (
                "no two nodes have met: the graph has no edge from one node to another",
                "load a table whose rows name two different nodes",
            )
        if node is not None:
            self.group = int(structure.component[node])
            if structure.sizes[self.group] == 1:
                return (
                    f"{graph.name(node, 60)} has met nobody, so it has no rating",
                    "name another node with --component",
                )
        elif len(large) > 1:
            sizes = structure.sizes[large]
            largest = large[np.argsort(-sizes, kind="stable")[:2]]
            names = [int(structure.members(int(number)).min()) for number in largest]
            one, two = (graph.name(number, 40) for number in names)
            return (
                f"{len(large):,} groups of nodes (of {int(sizes.min()):,} to "
                f"{int(sizes.max()):,}, {one} in one, {two} in another) never met, so no rating "
                "compares them",
                f"answer within one with --component {one}",
            )
        else:
            self.group = int(large[0])
        self.inside = support(structure, self.group, graph.n)
        return None

    def widened(self, rho: tuple[float, float]) -> tuple[float, float]:
        """A bracket of the exact matrix' rho from one of the computed matrix'."""
        if self.settings.division == "vote":
            return 1.0, 1.0  # every column of the exact matrix sums to 1
        slack = 1 + 2 * self.ballot.spread
        return rho[0] / slack, rho[1] * slack

    def shape(self, y: Floats, errors: Floats) -> tuple[Floats, Floats]:
        """Ratings of sum 1 and the bounds of their errors."""
        return y / y.sum(), normalised_reach(y, errors, 1)

    def result(self, stop: Stop) -> Result:
        """Everything found, as a Result."""
        graph, settings, inside = self.graph, self.settings, self.inside
        ready = self.group >= 0
        facts: dict[str, Any] = {"rho": self.rho}
        more: dict[str, str] = {}
        if ready:
            met = int(self.ballot.opponents.sum()) // 2
            apart = int(np.count_nonzero(self.ballot.opponents == 0))
            facts |= {"pairs that met": met, "groups": self.groups, "unit": self.ballot.unit}
            more["group"] = (
                ("of the node named: " if settings.component is not None else "")
                + f"{count(int(inside.sum()), 'node')} joined by meetings; "
                f"{count(graph.n - int(inside.sum()), 'other')} exactly 0"
                + (f", {apart:,} of them met nobody" if apart else "")
            )
            if settings.link == "logistic":
                own = "as given" if settings.unit is not None else "the mean margin of a pair"
                more["unit"] = f"{self.ballot.unit:.10g} ({own})"
        origin = graph.origin
        ways = (origin.source, origin.target)
        lost, won = ways if settings.flow == "along" else ways[::-1]
        return Result(
            measure="votes",
            settings=settings,
            scores=self.y / self.y.sum(),
            stop=stop,
            reason=reason(stop, self.bound.value, settings),
            bound=self.bound,
            log=tuple(self.ledger.log),
            conventions=conventions(
                graph,
                settings,
                outcomes=f"S_ij, what i won against j, is the weight of {lost} = j, {won} = i; the "
                "edge the other way holds what j won, 0 where there is none"
                if graph.directed
                else "the graph is undirected: every meeting is a draw",
                **{"self-loops": "no meeting: left out"},
                link=_LINKS[settings.link],
                division="each node divides one vote among those it met: columns sum to 1, rho = 1"
                if settings.division == "vote"
                else "rows divided by the number of nodes met",
                diagonal="zero"
                if settings.diagonal == 0
                else f"{settings.diagonal:g} with itself, before dividing",
                **more,
                scores="ratings, sum 1",
                reading="what these outcomes say, nothing else; before people are judged by it, "
                "follow the local review",
            ),
            seconds=self.clock.seconds(),
            facts=facts,
            exact_zero=~inside if ready else None,
            symmetry=self._classes if ready else None,
        )

    def _classes(self, pools: NDArray[np.uint32] | None) -> NDArray[np.int64] | None:
        """Nodes with the same outcomes against nodes with the same outcomes, and so on."""
        from kingpost.core.colours import colours
        from kingpost.core.kernels.votes import code

        try:
            starts, neighbours, won, lost = _meetings(
                self.graph, self.settings.flow, False, self.watch
            )
            for low, high in ((a, a + _PIECE) for a in range(0, len(won), _PIECE)):
                self.watch.check()
                code(won.view(np.uint64), lost.view(np.uint64), low, min(high, len(won)))
        except Interrupted:
            return None
        rows = Adjacency(starts, neighbours, won)
        pairs = Pull(rows, self.inside.astype(np.float64))
        return colours(pairs, self.inside.astype(np.float64), self.watch, pools=pools)


MEASURE = Measure("votes", "V", "ratings by votes", VotesSettings, solve, structured=False)
