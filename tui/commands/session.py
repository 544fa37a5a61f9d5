"""One run of a command: loading and solving under Ctrl-C, progress on a terminal, notes."""

from __future__ import annotations

import contextlib
import dataclasses
import shutil
import signal
import sys
import time
from collections.abc import Callable
from types import FrameType, TracebackType
from typing import TYPE_CHECKING, Any, Self

from kingpost.core import warm
from kingpost.core.errors import Interrupted
from kingpost.core.text import visible
from kingpost.core.watch import Progress, Watch
from kingpost.tui.commands.front import ANSWERED, INTERRUPTED, SHORT_OF_ACCURACY, complain
from kingpost.tui.commands.options import store_wanted

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.measures.base import Measure, Settings
    from kingpost.core.result import Iteration, Result

# The names of loading options that go into LoadOptions as they are.
_PLAIN = (
    "source", "target", "weight", "nodes", "node_id", "parallel", "loops", "bad_rows", "where",
    "node_where", "read_as", "encoding", "header", "memory",
)  # fmt: skip


def load_options(given: dict[str, Any]) -> LoadOptions:
    """The loading options of a command line."""
    from kingpost.core.ingest import LoadOptions

    return LoadOptions(
        **{name: given[name] for name in _PLAIN},
        weight_as=given["weight_as"],
        # A shell makes it hard to type the character itself.
        delimiter={"\\t": "\t", "tab": "\t"}.get(given["delimiter"], given["delimiter"]),
        directed=not given["undirected"],
    )


class StatusLine:
    """One line on standard error that overwrites itself and leaves nothing; silent elsewhere."""

    def __init__(self) -> None:
        self._on = bool(getattr(sys.stderr, "isatty", lambda: False)())
        self._next = 0.0
        self._shown = 0

    def progress(self, report: Progress) -> None:
        """Show how far a stage of work has come."""
        text = report.stage
        if report.total:
            text += f"  {min(report.done / report.total, 1):.0%} of {report.total:,} {report.unit}"
        elif report.done:
            text += f"  {report.done:,} {report.unit}"
        self.show(text)

    def iteration(self, measure: str, line: Iteration) -> None:
        """Show the newest sweep of a solve, four times a second at most."""
        now = time.monotonic()
        if now < self._next:
            return
        self._next = now + 0.25
        text = f"{measure}  sweep {line.index:,}  residual {line.residual:.1e}"
        if line.bound == line.bound:
            text += f"  bound {line.bound:.1e}"
        if line.proven is not None:
            text += f"  order proven to {line.proven:,}"
        self.show(text)

    def show(self, text: str) -> None:
        """Replace the line."""
        if not self._on:
            return
        room = shutil.get_terminal_size().columns - 1
        # Blanks instead of an erase sequence: right on any terminal, however plain.
        text = visible(text).encode("ascii", "replace").decode()[:room]
        sys.stderr.write("\r" + text.ljust(self._shown))
        sys.stderr.flush()
        self._shown = len(text)

    def clear(self) -> None:
        """Leave the line as it was before."""
        if self._on and self._shown:
            sys.stderr.write("\r" + " " * self._shown + "\r")
            sys.stderr.flush()
            self._shown = 0


class Session:
    """Used as a context: within it the first Ctrl-C asks the work to stop, the next one kills.

    Work that was stopped hands back its best iterate, so that there is still something to print.
    """

    def __init__(self, threads: int | None = None) -> None:
        self.line = StatusLine()
        self.watch = Watch(self._progress, threads=threads)
        self.interrupted = False
        self.store = store_wanted()
        self._before: Any = None

    def __enter__(self) -> Self:
        # Whoever started us may have had interrupts ignored (a background job): keep to that.
        if signal.getsignal(signal.SIGINT) is not signal.SIG_IGN:
            with contextlib.suppress(ValueError):  # not in the main thread: not ours to handle
                self._before = signal.signal(signal.SIGINT, self._on_interrupt)
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        trouble: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.line.clear()
        self.release()

    def release(self) -> None:
        """From here on Ctrl-C ends the command at once: the work is done, only writing is left."""
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)
            self._before = None

    def _on_interrupt(self, number: int, frame: FrameType | None) -> None:
        if self.interrupted:
            raise KeyboardInterrupt
        self.interrupted = True
        self.watch.cancel()

    def load(self, paths: tuple[str, ...], options: LoadOptions) -> tuple[Graph, float]:
        """The graph and the seconds it took; what was guessed or lost is told on standard error."""
        from kingpost.core.open import open_graph

        began, notes = time.perf_counter(), list[str]()
        graph = open_graph(
            list(paths), options=options, watch=self.watch, store=self.store, tell=notes.append
        )
        taken = time.perf_counter() - began
        self.line.clear()
        from kingpost.core.export.account import losses

        for note in [*notes, *graph.account.notes, *losses(graph.account)]:
            complain(f"note: {note}")
        return graph, taken

    def solve(
        self,
        measure: Measure,
        graph: Graph,
        settings: Settings,
        load_seconds: float = 0.0,
        on_iteration: Callable[[Iteration], None] | None = None,
    ) -> Result:
        """The result of a measure, cancelled or not, with the time of loading filled in.

        Its order is established too, while Ctrl-C still leaves an answer: looking for ties in a
        graph of millions of nodes takes a while.
        """

        def watched(line: Iteration) -> None:
            self.line.iteration(measure.name, line)
            if on_iteration is not None:
                on_iteration(line)

        from kingpost.core.measures.base import finish
        from kingpost.core.store.results import keep_result, solve

        result = finish(solve(measure, graph, settings, self.watch), watched)
        seconds = dataclasses.replace(result.seconds, load=load_seconds)
        result = dataclasses.replace(result, seconds=seconds)
        if result.refusal is None:
            self.line.show(f"{measure.name}  establishing the order")
            _ = result.standing  # kept by the result
            with contextlib.suppress(Interrupted):  # the answer is there, kept or not
                note = keep_result(measure, graph, result, self.watch)
                if note is not None:
                    complain(f"note: {note}")
        self.line.clear()
        return result

    def _progress(self, report: Progress) -> None:
        warm.heed(report)
        self.line.progress(report)

    def check(self) -> None:
        """Raise Interrupted after a Ctrl-C: for where a solve that was stopped has no scores."""
        if self.interrupted:
            self.watch.check()

    def tell_shortfall(self, result: Result) -> None:
        """One line on standard error where the answer is less than was asked for."""
        if not result.stop.accurate:
            complain(f"{result.measure}: {result.stop.value}: {result.reason}")
        elif self.interrupted:
            complain(f"{result.measure}: interrupted; the scores are complete, ties may be missing")

    def status(self, result: Result) -> int:
        """The exit status that an answer deserves."""
        if self.interrupted:
            return INTERRUPTED
        return ANSWERED if result.stop.accurate else SHORT_OF_ACCURACY
