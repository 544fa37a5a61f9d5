"""Loading: names the file at once, then shows the stages of reading and of the first solve.

This is the first frame.  Nothing imported from here may import numpy.
"""

from __future__ import annotations

import time
from typing import TYPE_CHECKING

from textual.app import ComposeResult

from kingpost.core.text import visible
from kingpost.core.watch import Progress
from kingpost.tui.models.drawing import bar
from kingpost.tui.rooms import LOADING
from kingpost.tui.views.base import View
from kingpost.tui.widgets.lines import KeyLine, Line, Piece, Rule

if TYPE_CHECKING:
    from kingpost.tui.jobs import Job

_MOST_STAGES = 12


class LoadingView(View):
    """Stages done, the stage at work with how far it has come, and the way out."""

    view = LOADING

    def __init__(self, paths: list[str]) -> None:
        super().__init__()
        names = [visible(path.rstrip("/").rsplit("/", 1)[-1], 60) for path in paths]
        self._file_name = names[0] if len(names) == 1 else f"{names[0]} +{len(names) - 1}"
        self._stages: dict[str, Progress] = {}
        self._started = time.monotonic()
        self._offered = ("", "", "")
        self._waits = False  # for an answer, with nothing left to read

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield Line(id="stages")
        yield Rule(id="kept", classes="offer")
        yield Line(id="words", classes="offer")
        yield Line(id="changed", classes="offer")
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        self.query_one("#head", Line).show((f" {self._file_name}", "head"), ("   opening", "plain"))
        self.query_one("#stages", Line).show(
            (f" {self.looks.glyphs.pointer} reading the edge table", "plain")
        )
        self.refresh_keys()
        self._run_clock()
        self.offer(*self._offered)
        if self._waits:
            self.wait_for_answer()

    def _run_clock(self) -> None:
        # On a slow link a clock is the first thing to go.
        self._clock = self.set_interval(5.0 if self.looks.slow else 1.0, self._tick)

    def can_step_back(self) -> bool:
        # Back is where the tables were chosen; from the command line there is only out.
        return self.app.screen_stack[0] is not self

    def do_step_back(self) -> None:
        self.kingpost.opener.give_up()

    def again(self) -> None:
        """Reading begins once more."""
        self._waits = False
        self._stages.clear()
        self._started = time.monotonic()
        if self.composed:
            self._clock.stop()
            self._run_clock()

    def offer(self, title: str, words: str, changed: str) -> None:
        """Show what sitting was kept, or that nothing is offered if there is no title."""
        self._offered = (title, words, changed)
        if not self.composed:
            return
        self.set_class(bool(title), "-offer")
        self.query_one("#kept", Rule).title(title)
        self.query_one("#words", Line).show((f" {words}", "strong"))
        self.query_one("#changed", Line).show((f" {changed}", "plain"))
        self.refresh_keys()

    def wait_for_answer(self) -> None:
        """All is read; only the answer is missing."""
        self._waits = True
        if not self.composed:
            return
        self._clock.stop()
        self.query_one("#head", Line).show(
            (f" {self._file_name}", "head"),
            ("   read; take up the sitting that was kept?", "plain"),
        )
        self.refresh_keys()  # there is nothing left to halt

    def _tick(self) -> None:
        if self.app.screen is not self:
            # Under another screen even a tick that does nothing repaints the whole terminal.
            self._clock.stop()
            return
        self._time()
        self.refresh_keys()

    def stage(self, job: Job) -> None:
        """Show the latest of a job: its stage and how far it is, or the sweeps of a solve."""
        if job.log:
            line = job.log[-1]
            self._stages[job.words] = Progress(job.words, line.index, None, "sweeps")
        elif job.progress is not None:
            self._stages[job.progress.stage] = job.progress
        elif job.words:
            self._stages.setdefault(job.words, Progress(job.words))
        if self.composed:
            self._show()
            self.refresh_keys()

    def _show(self) -> None:
        shown = list(self._stages.values())[-_MOST_STAGES:]
        width = max((len(p.stage) for p in shown), default=0)
        width = min(max(width, 12), 40)
        rows = [self._row(p, width, p is shown[-1]) for p in shown]
        self.query_one("#stages", Line).show_rows(rows)
        self._time()

    def _time(self) -> None:
        seconds = time.monotonic() - self._started
        self.query_one("#head", Line).show(
            (f" {self._file_name}", "head"), (f"   opening, {seconds:.0f} s", "plain")
        )

    def _row(self, progress: Progress, width: int, now: bool) -> list[Piece]:
        glyphs = self.looks.glyphs
        name = visible(progress.stage, 40).ljust(width)
        pieces: list[Piece] = [(f" {glyphs.pointer if now else ' '} {name}  ", "plain")]
        # Stages are told of now and then: one that another follows is done, whatever was heard.
        done = progress.done if now or not progress.total else progress.total
        amount = f"{done:,}"
        if progress.total:
            share = min(done / progress.total, 1.0)
            pieces.append((bar(share, 16, glyphs).ljust(16) + " ", "bar"))
            amount += f" of {progress.total:,}"
        if done or progress.total:
            pieces.append((f"{amount} {visible(progress.unit, 20)}", "plain"))
        return pieces
