"""Solve log: how residual, bound and proven order went, sweep by sweep, live while solving."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from textual import events
from textual.app import ComposeResult

from kingpost.core.text import visible
from kingpost.tui.jobs import Job
from kingpost.tui.models.detail import on_screen
from kingpost.tui.models.drawing import wrap
from kingpost.tui.models.keeping import keep_log
from kingpost.tui.models.solvelog import Sweeps, series_of, why_stopped
from kingpost.tui.rooms import LOG
from kingpost.tui.views.rows import RowsView
from kingpost.tui.views.sheets import PromptSheet
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.residual import ResidualChart
from kingpost.tui.widgets.rowtable import RowTable

if TYPE_CHECKING:
    from kingpost.core.result import Iteration, Result


class SolveLogView(RowsView):
    """The solve at work, else the latest solve of the measure the standings show."""

    CSS_PATH = "solvelog.tcss"
    view = LOG

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="legend")
        yield ResidualChart(id="chart")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Line(id="why", rows=3)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        self.refreshed()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 18, "-low")
        self.call_after_refresh(self.refreshed)

    def refreshed(self) -> None:
        """Show the running solve if there is one, else the latest result."""
        if not self.composed or not self.is_attached:
            return
        job = self.kingpost.solving
        sitting = self.kingpost.sitting
        if job is not None:
            self._live(job)
        elif sitting.result is not None:
            result = sitting.result
            log = result.log
            self._head(result.measure, f"{result.sweeps:,} sweeps, {result.stop}", result.settings)
            self._series(log, result.settings, result.proven_order)
            sentence = why_stopped(result)
            if result.refusal is not None:
                sentence = result.refusal.sentence
            self._why(sentence)

    def _live(self, job: Job) -> None:
        name = str(job.facts.get("measure", job.words))
        self._head(name, "solving", job.facts.get("settings"))
        self._series(list(job.log), job.facts.get("settings"))
        stage = (
            f"{job.progress.stage}"
            if job.progress and not job.log
            else "h halts it and keeps the best iterate"
        )
        self._why(stage)

    def can_log_keep(self) -> bool:
        result = self.kingpost.sitting.result
        return self.kingpost.solving is None and result is not None and bool(result.log)

    def do_log_keep(self) -> None:
        result = self.kingpost.sitting.result
        if result is not None:
            self._ask_name(result, f"{result.measure}_log.csv", "")

    def _ask_name(self, result: Result, name: str, wrong: str) -> None:
        hint = "ends in .csv, .json or .parquet; a file that exists is never written over"
        sheet = PromptSheet("write the log to", name, hint=hint, wrong=wrong)

        def named(text: str | None) -> None:
            if text is not None:
                self.kingpost.runner.start(
                    "keep",
                    lambda job: keep_log(result, text),
                    lambda path: self.kingpost.news(f"written: {visible(path, 200)}"),
                    words="writing the log",
                    failed=lambda sentence: self._not_kept(result, text, sentence),
                )

        self.app.push_screen(sheet, named)

    def _not_kept(self, result: Result, name: str, sentence: str) -> None:
        if self.app.screen is self:
            self._ask_name(result, name, sentence)
        else:
            self.kingpost.news(sentence, "bad")

    def _head(self, measure: str, state: str, settings: object) -> None:
        tol = getattr(settings, "tol", None)
        asked = f", bound asked for {tol:g}" if isinstance(tol, float) else ""
        self.query_one("#head", Line).show(
            (f" solve log of {visible(measure, 40)}", "head"), (f"   {state}{asked}", "plain")
        )

    def _legend(self, known: int) -> None:
        """``known``: for how many sweeps the order proven is known."""
        glyphs = self.looks.glyphs
        proven = "order proven (right scale)" if known > 1 else "order proven, known at the end"
        self.query_one("#legend", Line).show(
            (f" {glyphs.residual}", "residual"),
            (" residual  ", "plain"),
            (glyphs.bound, "bound"),
            (" bound  ", "plain"),
            (glyphs.both, "residual"),
            (" both  ", "plain"),
            (glyphs.tolerance * 3, "quiet"),
            (" asked for  ", "plain"),
            (glyphs.step * 2, "step"),
            (f" {proven}", "plain"),
        )

    def _series(
        self, log: Iterable[Iteration], settings: object, proven: int | None = None
    ) -> None:
        lines = list(log)
        tol = getattr(settings, "tol", None)
        n = self.kingpost.sitting.graph.n
        self._legend(sum(line.proven is not None for line in lines))
        self.query_one("#chart", ResidualChart).show(series_of(lines, tol, n, proven))
        table = self.table
        at_end = table.row >= table.count - 1
        sweeps = Sweeps(lines)
        row = sweeps.count - 1 if at_end else table.row
        table.show(sweeps, row, empty="no sweeps: the answer was computed directly")
        self.refresh_keys()

    def _why(self, sentence: str) -> None:
        lines = wrap(on_screen(sentence), max((self.size.width or 80) - 2, 10))
        self.query_one("#why", Line).show_rows([[(f" {line}", "plain")] for line in lines[:3]])
