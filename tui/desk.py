"""What is solved and arranged behind the views: which measure is shown, what is at work, what comes
of it.  Knows the runner and the sitting, no screen: views and application are its :class:`Front`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Protocol

from kingpost.core.errors import SettingsError
from kingpost.core.measures import COMPANY, NAMES
from kingpost.core.measures.base import Settings
from kingpost.core.result import Result, Stop
from kingpost.tui.jobs import Job, Runner, solve_work
from kingpost.tui.models.columns import Column
from kingpost.tui.models.headings import Choice, choice_of, shown
from kingpost.tui.models.peers import peers_columns, peers_of
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.models.solvelog import solved_words, sweep_words
from kingpost.tui.models.standings import Standings, arrange, prepare

# Measures nobody asked for are solved too while the edges of all their sweeps are few: rulers
# and rank columns then compare from the first minute.
COMPANY_EDGES = 2_000_000


class Front(Protocol):
    """What the desk tells the screen; always called on the screen's own thread."""

    def news(self, text: str, role: str = "news") -> None:
        """Something to say in passing."""

    def notice(self, title: str, text: str) -> None:
        """Something that must be read."""

    def table_ready(self, table: Standings, first: bool) -> None:
        """A table to show, the first one or another."""

    def swept(self, job: Job) -> None:
        """A solve has news."""

    def refreshed(self) -> None:
        """Results or jobs have changed."""

    def no_start(self, sentence: str) -> None:
        """The first solve failed: there is nothing to show."""


class Desk:
    """Solves measures and arranges their tables in the background."""

    def __init__(self, runner: Runner, sitting: Sitting, front: Front) -> None:
        self.runner, self.sitting, self._front = runner, sitting, front
        self.table: Standings | None = None
        self._wanted: dict[str, Any] = {"sort": "rank", "turned": False, "where": ""}
        self._prepared: tuple[int, ...] = ()
        self._closed = False
        self.away = False  # another desk has the screen: results are kept, nothing is shown

    def close(self) -> None:
        """Stop all work; whatever still comes of it is told to nobody."""
        self._closed = True
        for lane in ("solve", "table"):
            for job in self.runner.jobs(lane):
                self.runner.cancel(job)

    # ---- solving -----------------------------------------------------------------------------

    @property
    def solving(self) -> Job | None:
        """The solve at work now."""
        return self.runner.current("solve")

    def solve(self, measure: str, settings: Settings | None, *, company: bool = False) -> None:
        """Solve in the background, by default with the settings in force.

        ``company`` is what nobody asked for: it gives way, and its faults are not reported.
        """
        if not company:
            for other in self.runner.jobs("solve"):
                if other.facts.get("company"):
                    self.runner.cancel(other)
        job = self.runner.start(
            "solve",
            solve_work(self.sitting, measure, settings),
            lambda result: self._solved(result, company),
            # Asked again with other settings a measure waits its turn, to be compared; the
            # newest of them comes last, and stays.
            topic=f"solve:{id(self)}:{measure}:{settings!r}",
            words=f"solving {measure}",
            failed=lambda sentence: self._unsolved(sentence, company),
            news=self._swept,
        )
        used = settings or self.sitting.settings_of(measure)
        job.facts.update(measure=measure, company=company, settings=used, desk=self)
        if not company:
            self._swept(job)
        self._front.refreshed()

    def choose(self, measure: str) -> None:
        """Show a measure; solve it first if it has not been."""
        sitting = self.sitting
        result = sitting.results.get(measure)
        if result is None:
            self.solve(measure, None)
        elif result.refusal is not None:
            self._front.notice(f"{measure} has no answer here", result.refusal.sentence)
        elif measure != sitting.current:
            sitting.current = measure
            self._front.news(solved_words(result))
            self._make()

    @property
    def company(self) -> Sequence[str]:
        """The measures that are solved unasked."""
        return COMPANY if self.sitting.names is NAMES else self.sitting.names

    def keep_company(self) -> None:
        """Queue the measures nobody asked for, where they cost little."""
        sitting = self.sitting
        if sitting.graph.stored > COMPANY_EDGES:
            return
        for name in self.company:
            result = sitting.results.get(name)
            # The flow is one for all: ranks under different flows do not compare.
            if result is None or getattr(result.settings, "flow", sitting.flow) != sitting.flow:
                self.solve(name, None, company=True)

    def resume(self) -> None:
        """Have the screen again."""
        self.away = False
        self._make()
        self._front.refreshed()
        self.keep_company()

    def _swept(self, job: Job) -> None:
        if self._closed or self.away:
            return
        if self.table is not None and not job.facts.get("company"):
            self._front.news(sweep_words(job))
        self._front.swept(job)

    def _solved(self, result: Result, company: bool) -> None:
        if self._closed:
            return
        if company and result.stop is Stop.CANCELLED:
            return
        if self.away:
            if result.refusal is None:
                self.sitting.record(result)
            return
        sitting, first = self.sitting, self.table is None
        if result.refusal is not None and not first and not company:
            sitting.refuse(result)
            title = f"{result.measure} has no answer here"
            self._front.news(title, "bad")
            self._front.refreshed()
            self._front.notice(title, result.refusal.sentence)
            return
        sitting.record(result)
        if not company:
            sitting.current = result.measure
            if not first:
                self.keep_company()
                role = "news" if result.stop.accurate else "bad"
                self._front.news(solved_words(result), role)
        self._make()

    def _unsolved(self, sentence: str, company: bool) -> None:
        if self._closed or self.away:
            return
        if self.table is None and not company:
            self._front.no_start(sentence)
        elif not company:
            self._front.news(sentence, "bad")
            self._front.notice("the solve failed", sentence)
        self._front.refreshed()

    @property
    def wanted(self) -> dict[str, Any]:
        """How the rows are to be arranged, by names: kept from sitting to sitting."""
        return dict(self._wanted)

    def restore(
        self, wanted: Mapping[str, Any], order: Sequence[str], hidden: Sequence[str]
    ) -> None:
        """Arrange rows and columns as in an earlier sitting, from the first table on."""
        self._wanted.update(wanted)
        if order:
            self.sitting.columns = Choice(tuple(order), frozenset(hidden))

    # ---- the table ---------------------------------------------------------------------------

    def arrange(self, wrong: Callable[[str], None] | None = None, **wanted: Any) -> None:
        """Sort or filter: ``sort``, ``turned``, ``where`` (an SQL condition).

        ``wrong`` is told what is wrong with a condition; the rows then stay as they were.
        """
        self._wanted.update(wanted)
        if self.solving is None:
            self._front.news("")  # it was about the rows as they were
        self._make(wrong)

    def choose_columns(self, choice: Choice) -> None:
        """Show other columns, or the same in another order; nothing is worked out anew."""
        self.sitting.columns = choice
        if self.table is not None:
            self.table.head = shown(self.table.all, choice)
            self._front.table_ready(self.table, False)

    def _make(self, wrong: Callable[[str], None] | None = None) -> None:
        """Make the table that is wanted now; a newer wish replaces an older one at work."""
        sitting, wanted, old = self.sitting, dict(self._wanted), self.table
        result, others = sitting.result, sitting.others()
        if result is None or self.away:
            return
        peers = sitting.peers
        version = (id(result), *(id(other) for other in others), hash(peers))
        fresh = version != self._prepared

        def work(job: Job) -> Any:
            table, told = old, ""
            if table is None or fresh:
                more: list[Column] = []
                if peers:
                    found, told = peers_of(sitting.graph, result, peers, job.watch)
                    more = [] if found is None else peers_columns(found)
                table = prepare(sitting.graph, result, others, more=more)
            if table.column(wanted["sort"]) is None:
                wanted["sort"], wanted["turned"] = "rank", False
            lost = ""
            try:
                made = arrange(table, wanted["sort"], wanted["turned"], wanted["where"], job.watch)
            except SettingsError as trouble:
                if wrong is not None:
                    raise
                # A condition that these results cannot answer must not keep them from sight.
                lost = trouble.sentence
                made = arrange(table, wanted["sort"], wanted["turned"])
            return table, made, version, lost, told

        def failed(sentence: str) -> None:
            self._wanted["where"] = old.arrangement.where if old is not None else ""
            (wrong or (lambda told: self._front.news(told, "bad")))(sentence)

        self.runner.start(
            "table",
            work,
            self._made,
            words="arranging the rows",
            failed=failed,
            replace=True,
        )

    def _made(self, made: Any) -> None:
        if self._closed or self.away:
            return
        table, arrangement, self._prepared, lost, told = made
        if told:
            self._front.news(told)
        old, self.table = self.table, table
        if old is not None and table is old:
            old.adopt(arrangement)
        else:
            if self.sitting.columns.order:  # chosen by hand: columns new since then join it
                self.sitting.columns = choice_of(table.all, self.sitting.columns)
            table.head = shown(table.all, self.sitting.columns)
            table.arrangement = arrangement
            node = None if old is None else old.node
            table.cursor = (0 if node is None else table.row_of(node)) or 0
        if lost:
            self._wanted["where"] = ""
            self._front.news(f"the filter is taken off: {lost}", "bad")
        self._front.table_ready(table, old is None)
        if old is None:
            self.keep_company()

    def among_peers(self, attribute: str) -> None:
        """Rescale scores among the peers by an attribute, as columns; none for an empty one."""
        self.sitting.peers = attribute
        self._make()

    def measures(self) -> list[tuple[str, str, str]]:
        """(name, heading, what is known of it) for every measure, to choose from."""
        at_work = {job.facts.get("measure") for job in self.runner.jobs("solve")}
        rows = []
        for name in self.sitting.names:
            result = self.sitting.results.get(name)
            found = self.sitting.measure(name)
            if name in at_work:
                state = "being solved"
            elif result is None:
                state = "not solved yet"
            elif result.refusal is not None:
                state = "no answer here"
            else:
                state = f"order proven to {result.proven_order:,}"
            rows.append((name, f"{found.letter} {name}", f"{state.ljust(26)} {found.title}"))
        return rows
