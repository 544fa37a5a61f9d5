"""Reach: how many nodes lead to a node, or how much of a node attribute they hold.

Flow along the edges counts the nodes from which a node can be reached over any number of edges
(who leads to it); flow against them counts the nodes that can be reached from it.  Weights of
edges play no part.  Counted exactly on the condensation of the graph where that is affordable
(:mod:`kingpost.core.solvers.sets`), estimated with a stated standard error where it is not
(:mod:`kingpost.core.solvers.sketch`; Cohen 1997).
"""

from __future__ import annotations

import contextlib
import time
from collections.abc import Generator
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.measures.base import Measure, Settings, Solve, option
from kingpost.core.measures.common import Clock, conventions, empty
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.sets import Condensation, condense, gather, gather_visits, separate
from kingpost.core.solvers.sketch import Known, between, least_ranks, rank_error
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch


@dataclass(frozen=True, kw_only=True)
class ReachSettings(Settings):
    """Settings of reach; ``tol``, ``stop`` and ``max_sweeps`` have no bearing on it."""

    attribute: str | None = option(
        None, "a numeric node attribute to add up, instead of counting nodes"
    )
    itself: str = option(
        "apart",
        "whether a node is part of its own reach: apart (only others are counted) or counted",
        choices=("apart", "counted"),
    )
    budget: float = option(
        2e9, "edge visits up to which reach is counted exactly; beyond, it is estimated", low=0.0
    )
    log2m: int = option(
        10, "an estimate rests on 2 to this power of random ranks: 10 for 3.1%", low=5, high=16
    )
    seed: int = option(1, "which random ranks an estimate draws", low=0, high=2**62)

    def __post_init__(self) -> None:
        super().__post_init__()
        whole_numbers(self, "log2m", "seed")


def whole_numbers(settings: Settings, *names: str) -> None:
    """Refuse a setting that must be a whole number and is not.

    Raises:
        SettingsError: naming the first.
    """
    for name in names:
        value = getattr(settings, name)
        if value != int(value):
            raise SettingsError(f"--{name} is {value:g}; it takes a whole number")
        object.__setattr__(settings, name, int(value))


def solve(graph: Graph, settings: ReachSettings, watch: Watch) -> Solve:
    """Reach of every node, shape (n,): a number of nodes, or a sum of the attribute.

    Raises:
        SettingsError: for an attribute that does not exist, is not numeric, or has values that
            are missing, negative or not finite.
    """
    if graph.n == 0:
        return empty("reach", graph, settings)
    clock = Clock()
    amounts = None if settings.attribute is None else _amounts(graph, settings.attribute)
    work = _Work(graph, settings, amounts, watch)
    clock.ready()
    found = yield from work.run()
    return work.result(found, clock)


def _amounts(graph: Graph, name: str) -> Floats:
    """A nonnegative number for every node from an attribute."""
    import pyarrow as pa
    import pyarrow.compute as pc

    shown = visible(name, 60)
    if graph.attributes is None or name not in graph.attributes.column_names:
        columns = () if graph.attributes is None else graph.attributes.column_names
        have = ", ".join(visible(other, 40) for other in columns) or "none"
        raise SettingsError(
            f"--attribute {shown}: no node attribute is called so; there are {have}"
        )
    column = graph.attributes.column(name)
    kind = column.type.value_type if pa.types.is_dictionary(column.type) else column.type
    values = None
    # Text is refused even where it reads as a number: nobody declared it to be one.
    if pa.types.is_boolean(kind) or pa.types.is_decimal(kind) or pa.types.is_primitive(kind):
        with contextlib.suppress(pa.ArrowException):
            values = pc.cast(column, pa.float64(), safe=False)
    if values is None or pa.types.is_temporal(kind):
        raise SettingsError(
            f"--attribute {shown}: that attribute is {visible(str(column.type), 60)}, not a number"
        )
    if values.null_count:
        raise SettingsError(
            f"--attribute {shown}: that attribute is empty for {values.null_count:,} of "
            f"{graph.n:,} nodes; fill them in the nodes table, with 0 where there is nothing"
        )
    amounts: Floats = np.ascontiguousarray(values.to_numpy(), dtype=np.float64)
    bad = np.flatnonzero(~(np.isfinite(amounts) & (amounts >= 0)))
    if len(bad):
        raise SettingsError(
            f"--attribute {shown}: {count(len(bad), 'node')} of {graph.n:,} have a negative, NaN "
            f"or infinite value, such as {graph.name(int(bad[0]), 40)} with {amounts[bad[0]]:g}; "
            "reach adds up amounts from 0"
        )
    with np.errstate(over="ignore"):
        most = float(amounts.sum()) * len(amounts)  # what all scores together may come to
    if not np.isfinite(most):
        raise SettingsError(
            f"--attribute {shown}: its values add up to more than double precision holds (1e308); "
            "give it in a larger unit"
        )
    return amounts


@dataclass
class _Found:
    """Weight upstream of each component, how it was found, and what is to be said of it.

    ``error`` is a hard bound for each component (0: exact) or None where there is no hard one;
    ``standard`` a relative standard error.
    """

    upstream: Floats
    method: str
    stop: Stop
    reason: str
    error: Floats | None
    standard: float = 0.0
    facts: dict[str, Any] = field(default_factory=dict)
    log: list[Iteration] = field(default_factory=list)


class _Work:
    def __init__(
        self, graph: Graph, settings: ReachSettings, amounts: Floats | None, watch: Watch
    ) -> None:
        from kingpost.core.kernels.reach import group_sums

        self.graph, self.settings, self.watch = graph, settings, watch
        self.began = time.perf_counter()
        self.joined: Condensation = separate(graph, settings.flow)
        joined = self.joined
        if amounts is None:
            self.whole, self.amounts = True, np.ones(graph.n)
        else:
            whole = bool((amounts == np.floor(amounts)).all())
            self.whole, self.amounts = whole and float(amounts.sum()) < 2.0**53, amounts
        self.weights = np.zeros(joined.count)
        self.positive = np.zeros(joined.count, dtype=np.int64)
        group_sums(joined.order, joined.begins, self.amounts, self.weights, self.positive)
        self.total = float(self.weights.sum())
        if not self.whole:
            self.total *= 1 + 2 * UNIT * joined.count

    def run(self) -> Generator[Iteration, None, _Found]:
        """Join the components, then count or estimate."""
        graph, settings = self.graph, self.settings
        try:
            self.joined = condense(graph, settings.flow, self.watch)
        except Interrupted:
            self.known = Known(np.zeros(self.joined.count), np.full(self.joined.count, np.inf))
            return self._nothing()
        joined = self.joined
        self.known = between(joined, self.weights, self.total)
        settled = self.whole and bool((self.known.low == self.known.high).all())
        wanted = gather_visits(joined)
        ledger = Ledger()
        ledger.sweeps, ledger.visits = 1, 2 * graph.stored + joined.edges
        unknown = 0.0 if settled else float("nan")
        yield ledger.line(unknown, unknown, "condensation")
        if settled:
            found = _Found(
                self.known.low, "condensation", Stop.CONVERGED,
                "counted exactly, in one pass over the condensation", np.zeros(joined.count),
            )  # fmt: skip
        elif wanted <= settings.budget:
            found = yield from self._count(ledger)
        else:
            found = yield from self._estimate(ledger)
            found.facts["edge visits of an exact count"] = wanted
        found.log = ledger.log
        return found

    def _nothing(self) -> _Found:
        return _Found(
            np.zeros(self.joined.count), "none", Stop.CANCELLED,
            "cancelled before anything was counted beyond each node's own strong component", None,
            float("inf"),
        )  # fmt: skip

    def _count(self, ledger: Ledger) -> Generator[Iteration, None, _Found]:
        joined = self.joined
        work = gather(joined, self.weights, self.watch)
        done = yield from ledger.relay(work)
        sizes = done.found + self.weights
        # Additions that a sum goes through, those of a component's own weight included.
        depth = 8 + 64 + done.blocks + 8
        error = np.zeros(joined.count) if self.whole else depth * UNIT * sizes * (1 + 1e-9)
        if not done.cancelled:
            how = "counted exactly" if self.whole else "added up exactly but for rounding"
            words = f"{how}, in {count(done.blocks, 'pass', 'passes')} over the condensation"
            return _Found(done.found, "sets of bits", Stop.CONVERGED, words, error)
        words = (
            f"cancelled after {done.done:,} of {done.blocks:,} blocks of components; every score "
            f"is too low by at most {done.missing:,.6g}"
        )
        return _Found(done.found, "sets of bits", Stop.CANCELLED, words, error + done.missing)

    def _estimate(self, ledger: Ledger) -> Generator[Iteration, None, _Found]:
        settings = self.settings
        work = least_ranks(
            self.joined, self.weights, self.known, 1 << settings.log2m, settings.seed, self.watch
        )
        done = yield from ledger.relay(work)
        if done.ranks == 0:
            return self._nothing()
        error = rank_error(done.ranks)
        stop = Stop.CANCELLED if done.cancelled else Stop.CONVERGED
        words = (
            f"{'cancelled; ' * done.cancelled}estimated from {done.ranks:,} random ranks, relative "
            f"standard error {error:.2%}: an exact count would pass the budget of "
            f"{settings.budget:,.6g} edge visits"
        )
        sure = self.known.low == self.known.high
        facts = {
            "standard error": error,
            "ranks": done.ranks,
            "seed": settings.seed,
            "nodes known exactly": int(np.diff(self.joined.begins)[sure].sum())
            if self.whole
            else 0,
        }
        return _Found(done.found, "least ranks", stop, words, None, error, facts)

    def result(self, found: _Found, clock: Clock) -> Result:
        """Scores and everything to be said about them."""
        graph, settings, joined, group = self.graph, self.settings, self.joined, self.joined.group
        apart = settings.itself == "apart"
        # First what the own component adds: exactly nothing where a node is all there is of it.
        own = self.weights[group] - self.amounts if apart else self.weights[group]
        scores = own + found.upstream[group]
        bound = self._bound(found, scores)
        others = self.positive[group] - (self.amounts > 0) * apart
        zero = (self.known.high[group] == 0) & (others == 0)
        exact = isinstance(bound.absolute, float) and bound.absolute == 0.0
        attribute = settings.attribute
        return Result(
            measure="reach",
            settings=settings,
            scores=scores,
            stop=found.stop,
            reason=found.reason,
            bound=bound,
            log=tuple(found.log),
            conventions=conventions(
                graph,
                settings,
                **{"edge weights": "ignored: an edge leads on, however strong it is"},
                itself="a node is not part of its own reach"
                if apart
                else "a node is part of its own reach",
                scores=f"{'estimated ' * (found.error is None)}"
                + (
                    "number of nodes"
                    if attribute is None
                    else f"sum of the node attribute {visible(attribute, 60)}"
                )
                + ", not normalised",
                confidence=self._confidence(found, exact),
            ),
            seconds=clock.seconds(),
            facts={
                "method": found.method,
                "components": joined.count,
                "edges of the condensation": joined.edges,
                **found.facts,
            },
            exact_zero=zero,
            symmetry=None if exact else lambda pools: self._classes(apart),
        )

    def _bound(self, found: _Found, scores: Floats) -> Bound:
        if found.error is None:
            if not np.isfinite(found.standard):
                return Bound(BoundKind.NONE, float("inf"))
            return Bound(BoundKind.STATISTICAL, found.standard)
        if not found.error.any():
            return Bound(BoundKind.EXACT, 0.0, absolute=0.0)
        error = found.error[self.joined.group]
        total = float(scores.sum())
        kind = BoundKind.COMPONENTWISE if found.stop is Stop.CANCELLED else BoundKind.EXACT
        value = float(error.sum()) / total if total > 0 else float("inf")
        return Bound(kind, value, absolute=error)

    def _confidence(self, found: _Found, exact: bool) -> str:
        if found.error is not None:
            return "exact" if exact else "every score within its bound"
        if not np.isfinite(found.standard):
            return "none: lower ends only"
        return (
            f"an estimate: about two in three scores are within {found.standard:.2%} of the truth "
            f"and 95 in 100 within {2 * found.standard:.2%}; no order is proven"
        )

    def _classes(self, apart: bool) -> NDArray[np.int64]:
        """Nodes of one component have the same reach, but for what each holds itself."""
        group = self.joined.group.astype(np.int64)
        if not apart or self.settings.attribute is None:
            return group
        order = np.lexsort((self.amounts, group))
        fresh = np.ones(len(order), dtype=bool)
        fresh[1:] = (np.diff(group[order]) != 0) | (np.diff(self.amounts[order]) != 0)
        classes = np.empty(len(order), dtype=np.int64)
        classes[order] = np.cumsum(fresh) - 1
        return classes


MEASURE = Measure("reach", "R", "reach", ReachSettings, solve)
