"""Solves: every one of this sitting, at work, waiting or done; two of them side by side."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult

from kingpost.core.result import Result
from kingpost.tui.jobs import Job
from kingpost.tui.models.drawing import wrap
from kingpost.tui.models.solvelog import why_stopped
from kingpost.tui.models.solves import Differences, Entry, Solves, compare, differing, entries
from kingpost.tui.rooms import APART, SOLVES
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable


class SolvesView(RowsView):
    """The list; Enter picks two to compare, ``h`` halts the highlighted one."""

    CSS_PATH = "solves.tcss"
    view = SOLVES

    def __init__(self) -> None:
        super().__init__()
        self._picked: Result | None = None
        self._list = Solves([])

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield RowTable(id="rows")
        yield Rule(id="below")
        yield Line(id="why", rows=3)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        self.refreshed()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 14, "-low")
        self.call_after_refresh(self._why)

    def refreshed(self) -> None:
        if not self.composed or not self.is_attached:
            return
        kingpost = self.kingpost
        row, entry = self.table.row, self._entry
        found = entries(kingpost.runner.jobs("solve"), kingpost.sitting.solves)
        self._list = Solves(found, self._picked)
        if entry is not None:
            # A job that has become a result moved down; the cursor stays with what it was on.
            row = next((at for at, other in enumerate(found) if _same(entry, other)), row)
        waiting = sum(one.job is not None for one in found)
        words = f"   {len(found) - waiting:,} done, {waiting:,} at work or waiting"
        self.query_one("#head", Line).show((" solves of this sitting", "head"), (words, "plain"))
        empty = "nothing was solved yet; Esc, then m chooses a measure to solve"
        self.table.show(self._list, row, empty=empty)
        self._why()
        self.refresh_keys()

    @property
    def _entry(self) -> Entry | None:
        row = self.table.row
        return self._list.entries[row] if row < self._list.count else None

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self._why()
        self.refresh_keys()

    def _why(self) -> None:
        if not self.composed or not self.is_attached:
            return
        entry = self._entry
        sentence = "" if entry is None else f"{_words(entry)}: {_sentence(entry)}"
        if self._picked is not None:
            sentence = f"compared with {_title(self._picked)}: {sentence}"
        lines = wrap(sentence, max((self.size.width or 80) - 2, 10))[:3]
        self.query_one("#why", Line).show_rows([[(f" {line}", "plain")] for line in lines])

    # ---- actions -----------------------------------------------------------------------------

    def _job(self) -> Job | None:
        entry = self._entry
        return None if entry is None else entry.job

    def can_solve_halt(self) -> bool:
        job = self._job()
        return job is not None and job.live and not job.watch.cancelled

    def do_solve_halt(self) -> None:
        job = self._job()
        if job is not None:
            self.kingpost.runner.cancel(job)
            self.refreshed()

    def can_solve_pick(self) -> bool:
        entry = self._entry
        return entry is not None and entry.result is not None and entry.result.refusal is None

    def do_solve_pick(self) -> None:
        entry = self._entry
        if entry is None or entry.result is None:
            return
        first, second = self._picked, entry.result
        self._picked = second if first is None else None
        self.refreshed()
        if first is None:
            self.kingpost.news("Enter on another solve compares the two")
        elif first is second:
            self.kingpost.news("")
        else:
            self.kingpost.news("comparing the two")
            graph = self.kingpost.sitting.graph
            self.kingpost.background(
                "compare",
                lambda job: compare(graph, first, second, job.watch),
                self._compared,
                words="comparing two solves",
            )

    def _compared(self, found: Differences) -> None:
        self.kingpost.news("")
        if self.app.screen is self:
            self.app.push_screen(ApartView(found))

    def can_step_back(self) -> bool:
        return True

    def do_step_back(self) -> None:
        if self._picked is not None:
            self._picked = None
            self.kingpost.news("")
            self.refreshed()
        else:
            self.app.pop_screen()


def _same(a: Entry, b: Entry) -> bool:
    return (a.job is not None and a.job is b.job) or (a.result is not None and a.result is b.result)


def _title(result: Result) -> str:
    return _words(Entry(result=result))


def _words(entry: Entry) -> str:
    settings = "" if entry.settings is None else differing(entry.settings)
    return f"{entry.measure} ({settings})" if settings else entry.measure


def _sentence(entry: Entry) -> str:
    if entry.result is None:
        return "waits for its turn; h takes it out" if entry.state == "waiting" else entry.state
    if entry.result.refusal is not None:
        return entry.result.refusal.sentence
    return why_stopped(entry.result)


class ApartView(RowsView):
    """Two solves: the nodes they place furthest apart, first; Enter opens the node."""

    CSS_PATH = "solves.tcss"
    view = APART

    def __init__(self, found: Differences) -> None:
        super().__init__()
        self._apart = found

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="second")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="below")
        yield Line(id="why", rows=2)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        found = self._apart
        self.query_one("#head", Line).show((" first   ", "plain"), (_title(found.a), "head"))
        self.query_one("#second", Line).show((" second  ", "plain"), (_title(found.b), "head"))
        self.table.show(found, 0, empty="the graph has no nodes")
        self._write()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 14, "-low")
        self.call_after_refresh(self._write)

    def _write(self) -> None:
        if self.composed and self.is_attached:
            lines = wrap(self._apart.words, max((self.size.width or 80) - 2, 10))[:2]
            self.query_one("#why", Line).show_rows([[(f" {line}", "plain")] for line in lines])

    def can_node_open(self) -> bool:
        return self.table.count > 0 and self.kingpost.sitting.result is not None

    def do_node_open(self) -> None:
        node = self.table.item()
        if node is not None:
            self.kingpost.open_node(node)
