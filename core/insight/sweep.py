"""Ranks along a parameter: who stays, who comes and goes, where the leader changes.

Each value is solved from the scores of the one before, to the same proven error as a single
solve.  Where the proven leaders of two neighbouring values differ, the values between are halved
until the change lies in an interval as narrow as was asked for.  A leader is one only where it
is proven above all others; where ties or error bounds leave that open there is none.  What comes
and goes between two neighbouring values with the same leader is not seen.
"""

from __future__ import annotations

import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import InputError, SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.align import Ints
from kingpost.core.insight.near import solve_near
from kingpost.core.insight.over import Over, at, whole
from kingpost.core.insight.spans import intervals, spans
from kingpost.core.measures.base import Settings
from kingpost.core.result import Result
from kingpost.core.watch import Watch

TOP = 10
FINE = 1_000  # the interval of a change is this part of the range swept, unless told
_KEPT = 120_000_000  # scores kept at most, of all values together: 2 GB with their bounds
_HALVINGS = 2_000  # solves between values after which the search for changes ends


@dataclass(frozen=True, slots=True)
class Point:
    """One value of the parameter.

    ``leader`` is the node proven first, -1 where none is; ``error`` the proven error of the
    scores as a share of their sum; ``refusal`` why there is no answer, or None; ``sweeps`` and
    ``seconds`` what the solve took, and ``method`` how it began.
    """

    value: float | str
    leader: int
    error: float
    accurate: bool
    sweeps: int
    seconds: float
    method: str
    refusal: str | None = None


@dataclass(frozen=True, slots=True)
class Change:
    """Between ``low`` and ``high`` the leader changes from ``before`` to ``after``; -1: to or from
    no proven one."""

    low: float
    high: float
    before: int
    after: int


@dataclass(frozen=True)
class Sweep:
    """What :func:`sweep` found.

    Attributes:
        measure, over: what was solved along what.
        points: one a value, in the order of ``over.values``.
        top: K of "the first K".
        nodes: every node among the first K at some value, best mean rank first, shape (f,).
        ranks: first and last rank each may have at each value, shape (values, f, 2); -1 where
            there is no answer.
        scores: their scores, shape (values, f); NaN where there is no answer.
        always: which of them are proven among the first K at every value answered, shape (f,).
        same_order: how many first ranks are held by the same nodes, proven, at every value.
        changes: where the leader changes, ascending; numbers only.
        interval: how narrow these were asked to be (a difference, or the logarithm of a ratio);
            one over a short stretch without a proven leader may be up to three times as wide.
        halvings: solves it took to find them; ``cut`` whether the search ended before its end.
    """

    measure: str
    over: Over
    points: tuple[Point, ...]
    top: int
    nodes: Ints
    ranks: Ints
    scores: Floats
    always: NDArray[np.bool_]
    same_order: int
    changes: tuple[Change, ...]
    interval: float
    halvings: int
    cut: bool


def sweep(
    graph: Graph,
    name: str,
    settings: Settings,
    over: Over,
    *,
    graphs: Mapping[str, Graph] | None = None,
    top: int = TOP,
    interval: float | None = None,
    watch: Watch | None = None,
) -> Sweep:
    """Solve measure ``name`` at every value of ``over``.

    Args:
        settings: everything but the parameter.
        graphs: where the parameter is a way of reading the table, the graph for each value; all
            of the same nodes.
        top: follow the nodes among the first ``top``.
        interval: how narrow to make the intervals of leader changes: a difference, or where
            ``over.log`` the logarithm of a ratio; a thousandth of the range where None.

    Raises:
        SettingsError: for an unknown setting, a value out of range, too many values to keep, or
            where no value has an answer.
        InputError: if the ``graphs`` differ in their nodes.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    if graph.n == 0:
        raise SettingsError("the graph has no nodes, so there is nothing to rank")
    if graph.n * len(over.values) > _KEPT:
        most = max(_KEPT // graph.n, 1)
        raise SettingsError(
            f"{len(over.values):,} values of {graph.n:,} nodes are more than is kept; sweep "
            f"{most:,} or fewer"
        )
    if interval is not None and not interval > 0:
        raise SettingsError(f"the interval is {interval:g}; it takes a number above 0")
    work = _Work(graph, name, settings, over, graphs, watch)
    work.check()
    results = work.along()
    answered = [index for index, result in enumerate(results) if result.refusal is None]
    if not answered:
        why = results[0].refusal.sentence if results[0].refusal else ""
        raise SettingsError(f"{name} has no answer at any of the values: {why}")
    top = min(top, graph.n)
    nodes = _followed([results[index].scores for index in answered], top)
    ranks = np.full((len(results), len(nodes), 2), -1, np.int64)
    scores = np.full((len(results), len(nodes)), np.nan)
    for index in answered:
        watch.check()
        watch.report("ranking", index, len(results), "values")
        ranks[index] = spans(*intervals(results[index]), watch, nodes)
        scores[index] = results[index].scores[nodes]
    order = np.lexsort((nodes, ranks[answered].sum(axis=2).mean(axis=0)))
    nodes, ranks, scores = nodes[order], ranks[:, order], scores[:, order]
    always: NDArray[np.bool_] = np.all(ranks[answered, :, 1] <= top, axis=0)
    changes: tuple[Change, ...] = ()
    wide = float("nan")
    if over.numeric and len(over.values) > 1 and not work.whole:
        first, last = float(over.values[0]), float(over.values[-1])
        wide = over.width(first, last) / FINE if interval is None else interval
        changes = work.changes(results, wide)
    return Sweep(
        name, over, tuple(work.points), top, nodes, ranks, scores, always,
        _same_order(ranks[answered]), changes, wide, work.halvings, work.cut,
    )  # fmt: skip


class _Work:
    def __init__(
        self,
        graph: Graph,
        name: str,
        settings: Settings,
        over: Over,
        graphs: Mapping[str, Graph] | None,
        watch: Watch,
    ) -> None:
        self.graph, self.name, self.settings, self.over = graph, name, settings, over
        self.graphs, self.watch = graphs, watch
        self.points: list[Point] = []
        self.halvings = 0
        self.cut = False
        known = graphs is None and hasattr(settings, over.name)
        self.whole = known and whole(type(settings), over.name)

    def check(self) -> None:
        """Refuse what cannot be swept before anything is solved."""
        for value in self.over.values:
            self._settings(value)
        for other in (self.graphs or {}).values():
            if other.n != self.graph.n or not other.labels.equals(self.graph.labels):
                raise InputError(
                    f"reading the table by another {self.over.flag} changes which nodes there are, "
                    "so ranks cannot be compared; leave that value out"
                )

    def _settings(self, value: float | str) -> Settings:
        return self.settings if self.graphs is not None else at(self.settings, self.over, value)

    def solve(self, value: float | str, start: Floats | None) -> tuple[Result, str]:
        """The result at one value."""
        self.watch.check()
        graph = self.graph if self.graphs is None else self.graphs[str(value)]
        found, method = solve_near(self.name, graph, self._settings(value), start, self.watch)
        self.watch.check()
        return found, method

    def along(self) -> list[Result]:
        """The results at all values, each from the scores of the one before."""
        results: list[Result] = []
        start: Floats | None = None
        values: tuple[float | str, ...] = self.over.values
        for index, value in enumerate(values):
            self.watch.report("sweeping", index, len(self.over.values), "values")
            began = time.perf_counter()
            found, method = self.solve(value, start)
            seconds = time.perf_counter() - began
            refusal = None if found.refusal is None else found.refusal.sentence
            self.points.append(
                Point(
                    value, leader(found), float(found.bound.value), found.stop.accurate,
                    found.sweeps, seconds, method, refusal,
                )
            )  # fmt: skip
            results.append(found)
            if found.refusal is None:
                start = found.scores
        return results

    def changes(self, results: Sequence[Result], wide: float) -> tuple[Change, ...]:
        """Where the leader changes, between values next to each other that both have an answer."""
        found: list[Change] = []
        for (a, first), (b, second) in zip(
            enumerate(results[:-1]), enumerate(results[1:], start=1), strict=True
        ):
            if first.refusal is not None or second.refusal is not None:
                continue
            ends = float(self.over.values[a]), float(self.over.values[b])
            leaders = self.points[a].leader, self.points[b].leader
            found += self._between(*ends, *leaders, first.scores, wide)
        return tuple(_merged(found, self.over, wide))

    def _between(
        self, low: float, high: float, before: int, after: int, start: Floats, wide: float
    ) -> list[Change]:
        """Changes between two values whose leaders are known, by halving; depth first."""
        open_ = [(low, high, before, after, start)]
        found: list[Change] = []
        while open_:
            low, high, before, after, start = open_.pop()
            if before == after:
                continue
            middle = self.over.middle(low, high)
            narrow = self.over.width(low, high) <= wide or not low < middle < high
            if narrow or self.halvings >= _HALVINGS:
                self.cut |= not narrow
                found.append(Change(low, high, before, after))
                continue
            self.halvings += 1
            self.watch.report("finding where the leader changes", self.halvings, None, "solves")
            result, _ = self.solve(middle, start)
            if result.refusal is not None:
                found.append(Change(low, high, before, after))
                continue
            between = leader(result)
            open_.append((middle, high, between, after, result.scores))
            open_.append((low, middle, before, between, start))
        return found


def leader(result: Result) -> int:
    """The node proven above all others, or -1."""
    if result.refusal is not None:
        return -1
    low, high = intervals(result)
    first = int(np.argmax(low))
    if len(low) == 1:
        return first
    rest = high.copy()
    rest[first] = -np.inf
    return first if low[first] > rest.max() else -1


def _merged(found: list[Change], over: Over, wide: float) -> list[Change]:
    """Join A to none and none to B where the stretch between is as narrow as was asked for."""
    kept: list[Change] = []
    for change in found:
        last = kept[-1] if kept else None
        if (
            last is not None
            and last.after == change.before == -1
            and (change.low <= last.high or over.width(last.high, change.low) <= wide)
        ):
            kept[-1] = Change(last.low, change.high, last.before, change.after)
        else:
            kept.append(change)
    # Lost and won back within the interval: at its ends the leader is the same.
    return [change for change in kept if change.before != change.after]


def _followed(scores: Sequence[Floats], top: int) -> Ints:
    """Every node among the first ``top`` of any of these, ascending."""
    found = [
        np.argpartition(-one, top - 1)[:top] if top < len(one) else np.arange(len(one))
        for one in scores
    ]
    return np.unique(np.concatenate(found)).astype(np.int64)


def _same_order(ranks: Ints) -> int:
    """How many first ranks are held, proven, by the same nodes at every value."""
    first, last = ranks[:, :, 0], ranks[:, :, 1]
    fixed = ((first == last) & (first == first[0])).all(axis=0)
    held = set(first[0, fixed].tolist())
    count = 0
    while count + 1 in held:
        count += 1
    return count
