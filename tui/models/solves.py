"""Every solve of a sitting side by side: at work, waiting, done; and two of them compared."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.insight.ranks import rank_biased_overlap, ranks_of, tau_b
from kingpost.core.standing import PROVEN, UNRANKED
from kingpost.core.text import visible
from kingpost.core.watch import Watch
from kingpost.tui.models.columns import Column, name_column
from kingpost.tui.models.numbers import percent, rank_range, small

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result
    from kingpost.tui.jobs import Job

RBO_P = 0.98  # half of the weight on the first 16 ranks


def differing(settings: Any) -> str:
    """The settings that are not the measure's own defaults, in words; all of them, accuracy too."""
    try:
        plain = type(settings)()
    except TypeError:
        return ""
    parts = []
    for item in dataclasses.fields(settings):
        value, usual = getattr(settings, item.name), getattr(plain, item.name)
        try:
            same = bool(value == usual)
        except ValueError:  # arrays compare entry by entry
            same = value is usual
        if same:
            continue
        if isinstance(value, float):
            shown = f"{value:g}"
        elif isinstance(value, dict):
            shown = f"on {len(value):,} nodes"
        else:
            shown = visible(str(value), 24)
        parts.append(f"{item.name.replace('_', ' ')} {shown}")
    return ", ".join(parts)


@dataclass(frozen=True)
class Entry:
    """A solve: the job of one that waits or is at work, or the result; ``number`` counts the
    finished ones of the sitting from 1."""

    job: Job | None = None
    result: Result | None = None
    number: int = 0

    @property
    def measure(self) -> str:
        """The measure's name."""
        if self.result is not None:
            return self.result.measure
        assert self.job is not None
        return str(self.job.facts.get("measure", self.job.words))

    @property
    def settings(self) -> Any:
        """Its settings, None where they are not known yet."""
        if self.result is not None:
            return self.result.settings
        assert self.job is not None
        return self.job.facts.get("settings")

    @property
    def state(self) -> str:
        """Waiting, at work with its sweeps, halting, or why it stopped."""
        if self.result is not None:
            return str(self.result.stop)
        assert self.job is not None
        if self.job.watch.cancelled:
            return "halting"
        return "waiting" if self.job.state == "waiting" else "at work"


def entries(jobs: Sequence[Job], solves: Sequence[Result]) -> list[Entry]:
    """What waits or is at work in the order it comes, then what is done, newest first."""
    done = [Entry(result=result, number=at) for at, result in enumerate(solves, 1)]
    return [Entry(job=job) for job in jobs if job.live] + done[::-1]


class Solves:
    """Entries as a source of the row-window table; ``picked`` is the first of two to compare."""

    def __init__(self, found: Sequence[Entry], picked: Result | None = None) -> None:
        self.entries = list(found)
        self.picked = picked
        widest = max((len(entry.measure) for entry in self.entries), default=7)
        self.head = [
            Column("number", "solve", 5, self._number, right=True, frozen=True),
            Column(
                "measure",
                "measure",
                min(max(widest, 7), 24),
                lambda at: visible(self.entries[at].measure, 24),
                frozen=True,
                stretch=24,
            ),
            Column("state", "state", 12, lambda at: self.entries[at].state),
            Column("sweeps", "sweeps", 6, self._sweeps, right=True),
            Column("seconds", "seconds", 7, self._seconds, right=True),
            Column("bound", "bound", 7, self._bound, right=True),
            Column("proven", "proven", 7, self._proven, right=True),
            Column("settings", "settings not the usual", 30, self._settings),
        ]

    @property
    def count(self) -> int:
        """Number of solves."""
        return len(self.entries)

    def item(self, row: int) -> int:
        """Solves are addressed by their place in the list."""
        return row

    def rail(self, row: int) -> int:
        """The one picked has the sign of what is settled."""
        return PROVEN if self.marked(row) else UNRANKED

    def marked(self, row: int) -> bool:
        """Whether it is picked to be compared."""
        result = self.entries[row].result
        return result is not None and result is self.picked

    def _number(self, at: int) -> str:
        return str(self.entries[at].number or "-")

    def _sweeps(self, at: int) -> str:
        entry = self.entries[at]
        if entry.result is not None:
            return f"{entry.result.sweeps:,}"
        assert entry.job is not None
        return f"{entry.job.log[-1].index:,}" if entry.job.log else ""

    def _seconds(self, at: int) -> str:
        result = self.entries[at].result
        return "" if result is None else f"{result.seconds.prepare + result.seconds.solve:.2f}"

    def _bound(self, at: int) -> str:
        entry = self.entries[at]
        if entry.result is not None:
            return small(entry.result.bound.value)
        assert entry.job is not None
        return small(entry.job.log[-1].bound) if entry.job.log else ""

    def _proven(self, at: int) -> str:
        result = self.entries[at].result
        if result is None:
            return ""
        return "-" if result.refusal is not None else f"{result.proven_order:,}"

    def _settings(self, at: int) -> str:
        return differing(self.entries[at].settings)


class Differences:
    """Nodes by how far two solves place them apart; a source of the row-window table.

    Disagreement is the quotient of the two ranks: 1st against 100th counts as much as 10th
    against 1,000th.  ``moved[node]`` is the rank in ``a`` less that in ``b``: positive where b
    places the node higher.
    """

    def __init__(
        self,
        graph: Graph,
        a: Result,
        b: Result,
        rows: NDArray[np.int64],
        moved: NDArray[np.int64],
        words: str,
    ) -> None:
        self.a, self.b, self.rows, self.moved, self.words = a, b, rows, moved, words
        width = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)

        def rank(of: Result, title: str) -> Column:
            standing = of.standing
            return Column(
                title,
                title,
                max(width, len(title)),
                lambda node: rank_range(*standing.range_of(node), width),
                right=True,
            )

        self.head = [
            name_column(graph, rows),
            rank(a, "first"),
            rank(b, "second"),
            Column("moved", "moved", 8, lambda node: _moved(int(moved[node])), right=True),
        ]

    @property
    def count(self) -> int:
        """Number of nodes."""
        return len(self.rows)

    def item(self, row: int) -> int:
        """The node in a row."""
        return int(self.rows[row])

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is marked."""
        return False


def _moved(places: int) -> str:
    return "0" if places == 0 else f"{places:+,}"


def compare(graph: Graph, a: Result, b: Result, watch: Watch | None = None) -> Differences:
    """Where two answers on one graph differ, O(n log n); run it in a job.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    left, right = ranks_of(a), ranks_of(b)
    watch.check()
    watch.report("comparing ranks")
    factor = np.abs(np.log(left.mean) - np.log(right.mean))
    moved = left.first - right.first
    # Equal disagreement: in the order of the first solve.
    order = a.standing.order
    rows = np.take(order, np.argsort(-np.take(factor, order), kind="stable"))
    watch.check()
    tau, rbo = tau_b(left, right, watch), rank_biased_overlap(left, right, RBO_P)
    same = float(np.count_nonzero(moved == 0)) / max(graph.n, 1)
    words = f"Kendall's tau-b {tau:.4f}, rank-biased overlap {rbo:.4f} (p {RBO_P:g})"
    words += f", {percent(same)} of the nodes at the same rank"
    return Differences(graph, a, b, rows, moved, words)
