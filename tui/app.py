"""The application: which view, which graph, which results, which work in the background.

Only what the first frame needs is imported here; numpy and everything over it come in with
the loading job, after the first frame has named the file.
"""

from __future__ import annotations

import os
import signal
import sys
import traceback
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, cast

from kingpost.core.text import visible
from kingpost.tui import actions, terminal

terminal.prepare_environment()  # before textual is imported: it reads the environment then

from textual import events  # noqa: E402
from textual.app import App  # noqa: E402
from textual.screen import Screen  # noqa: E402

from kingpost.tui.jobs import Job, Runner, solve_work  # noqa: E402
from kingpost.tui.views.loading import LoadingView  # noqa: E402

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.measures.base import Settings
    from kingpost.core.result import Result
    from kingpost.tui.models.sitting import Sitting
    from kingpost.tui.models.standings import Standings
    from kingpost.tui.views.base import View
    from kingpost.tui.views.standings import StandingsView

# Measures nobody asked for are solved too while the edges of all their sweeps are few: rulers
# and rank columns then compare from the first minute.
COMPANY_EDGES = 2_000_000
FAULT = 70  # exit status of a fault of the program
_PATIENCE = 2.0  # seconds that threads get to end on leaving

Load = Callable[[Job], "Graph"]


class KingpostApp(App[int], inherit_bindings=False):
    """Controller of the views; holds the sitting and the runner of background work."""

    # The first screen is the app's own, whose style sheet textual does not look up by itself.
    CSS_PATH = [  # noqa: RUF012
        os.path.join(os.path.dirname(__file__), name) for name in ("app.tcss", "views/loading.tcss")
    ]
    ENABLE_COMMAND_PALETTE = False
    TITLE = "kingpost"

    def __init__(
        self,
        paths: list[str],
        load: Load,
        measure: str,
        settings: Settings | Callable[[], Settings] | None,
        *,
        threads: int | None = None,
        looks: terminal.Looks | None = None,
    ) -> None:
        super().__init__(ansi_color=True)
        self.theme = "ansi-dark"
        self.looks = looks or terminal.decide()
        self.runner = Runner(self.call_later, threads)
        self.latest_news: tuple[str, str] = ("", "news")
        self.sentence = ""  # what is printed after leaving
        self._sitting: Sitting | None = None
        self._paths, self._load = paths, load
        self._measure, self._settings = measure, settings
        self._keymaps: dict[str, dict[str, str]] = {}
        self._table: Standings | None = None
        self._wanted: dict[str, Any] = {"sort": "rank", "turned": False, "text": ""}
        self._prepared: tuple[Any, ...] = ()

    # ---- start and end -------------------------------------------------------------------------

    def get_default_screen(self) -> Screen[Any]:
        return LoadingView(self._paths)

    def on_mount(self) -> None:
        loop = self._loop
        if loop is not None and not self.is_headless:
            for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
                loop.add_signal_handler(number, self.leave, 128 + number)
        # The first frame is on its way before the heavy imports compete for the processor.
        self.set_timer(0.01, self._begin)

    def _begin(self) -> None:
        self.runner.start(
            "load",
            self._load_all,
            self._loaded,
            failed=self._unreadable,
            news=self._stage,
            words="reading the edge table",
        )

    def _load_all(self, job: Job) -> Graph:
        from importlib import import_module

        graph = self._load(job)
        for name in ("standings", "node", "solvelog", "settings", "help", "sheets"):
            import_module(f"kingpost.tui.views.{name}")
        return graph

    def _stage(self, job: Job) -> None:
        if isinstance(self.screen, LoadingView):
            self.screen.stage(job)

    def _loaded(self, graph: Graph) -> None:
        self._sitting = self.make_sitting(graph, self._measure)
        settings = self._settings() if callable(self._settings) else self._settings
        if settings is not None:
            self._sitting.settings[self._measure] = settings
        self.solve(self._measure, settings)

    def make_sitting(self, graph: Graph, measure: str) -> Sitting:
        """The sitting over a graph just loaded."""
        from kingpost.tui.models.sitting import Sitting

        return Sitting(graph, measure)

    def _unreadable(self, sentence: str) -> None:
        self.sentence = sentence
        cancelled = any(job.watch.cancelled for job in self.runner.jobs("load"))
        self.leave(130 if cancelled or "cancelled before" in sentence else 2)

    def leave(self, status: int) -> None:
        """Leave with an exit status; the terminal is restored by the driver."""
        self.exit(status)

    def fault(self, error: Exception, words: str) -> None:
        """A fault of the program that the screen survives: a sentence, and a log file."""
        place = terminal.keep_fault("".join(traceback.format_exception(error)))
        kept = f"; details are in {place}" if place else ""
        self.news(visible(f"{words}: {type(error).__name__}: {error}{kept}", 300), "bad")

    def _handle_exception(self, error: Exception) -> None:
        # textual would print a traceback with every local variable, data and all.  Tests, which
        # run without a terminal, get the exception itself.
        if self.is_headless:
            super()._handle_exception(error)
            return
        place = terminal.keep_fault("".join(traceback.format_exception(error)))
        kept = f"; please report {place}" if place else ""
        self.sentence = f"a fault of the program ended the screen ({type(error).__name__}){kept}"
        self.leave(FAULT)

    def do_quit(self) -> None:
        """Quit: answered."""
        self.leave(0 if self._sitting is not None else 130)

    def do_quit_now(self) -> None:
        """Quit from anywhere."""
        self.leave(130)

    # ---- what views ask ------------------------------------------------------------------------

    @property
    def sitting(self) -> Sitting:
        """The sitting; views exist only once there is one."""
        assert self._sitting is not None
        return self._sitting

    @property
    def view(self) -> View | None:
        """The view on top."""
        from kingpost.tui.views.base import View

        return self.screen if isinstance(self.screen, View) else None

    async def on_event(self, event: events.Event) -> None:
        # Keys are carried out here, one after the other.  Forwarded to the views they would
        # overtake each other: what is typed fast behind "/" would miss the prompt it opens.
        if isinstance(event, (events.Key, events.Paste)) and not event.is_forwarded:
            if self._screen_stack:
                self.typed(event)
            return
        await super().on_event(event)

    def typed(self, event: events.Key | events.Paste) -> None:
        """Give a key or pasted text to the view on top."""
        if isinstance(event, events.Key) and event.key.startswith("alt+"):
            # No key here is a chord: an Escape and a letter that came in one packet look alike.
            key = event.key.removeprefix("alt+")
            self.typed(events.Key("escape", None))
            event = events.Key(key, key if len(key) == 1 else None)
        view = self.view
        if view is not None:
            view.take(event)

    def keymap(self, view: str) -> dict[str, str]:
        """Key -> action id of a view."""
        if view not in self._keymaps:
            self._keymaps[view] = actions.keymap(view)
        return self._keymaps[view]

    @property
    def solving(self) -> Job | None:
        """The solve at work now."""
        return self.runner.current("solve")

    def news(self, text: str, role: str = "news") -> None:
        """Say something in the rule above the keys of whatever view is on top."""
        self.latest_news = (text, role)
        view = self.view
        if view is not None:
            view.tell(text, role)

    def background(
        self,
        lane: str,
        work: Callable[[Job], Any],
        done: Callable[[Any], None],
        words: str = "",
    ) -> Job:
        """Run something in the background for a view; the newest in a lane wins."""
        return self.runner.start(
            lane, work, done, words=words, failed=lambda s: self.news(s, "bad"), replace=True
        )

    # ---- solving ---------------------------------------------------------------------------------

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
            topic=f"solve:{measure}",
            words=f"solving {measure}",
            failed=lambda sentence: self._unsolved(sentence, company),
            news=self._sweep,
        )
        job.facts.update(measure=measure, company=company)
        if not company:
            self._sweep(job)
        self._refresh_views()

    def _sweep(self, job: Job) -> None:
        if isinstance(self.screen, LoadingView):
            self.screen.stage(job)
            return
        if not job.facts.get("company"):
            self.news(sweep_words(job))
        from kingpost.tui.views.solvelog import SolveLogView

        if isinstance(self.screen, SolveLogView):
            self.screen.refreshed()

    def _solved(self, result: Result, company: bool) -> None:
        sitting = self.sitting
        if company and result.stop == "cancelled":
            return
        first = self._table is None
        shown = sitting.result
        if result.refusal is not None and not first and not company:
            sitting.record(result)
            self.news(f"{result.measure} has no answer here", "bad")
            self._refresh_views()
            self.notice(f"{result.measure} has no answer here", result.refusal.sentence)
            if shown is not None and result.measure == sitting.current:
                sitting.results[result.measure] = shown  # the old standings stay usable
            return
        sitting.record(result)
        if not company:
            sitting.current = result.measure
            if not first:
                self.news(solved_words(result), "news" if result.stop.accurate else "bad")
        self._want()

    def _unsolved(self, sentence: str, company: bool) -> None:
        if self._table is None and not company:
            self.sentence = sentence
            self.leave(2)
        elif not company:
            self.news(sentence, "bad")
            self.notice("the solve failed", sentence)
        self._refresh_views()

    def _company(self) -> None:
        """Queue the measures nobody asked for, where they cost little."""
        sitting = self.sitting
        if sitting.graph.stored > COMPANY_EDGES:
            return
        for name in sitting.names:
            if name not in sitting.results:
                self.solve(name, None, company=True)

    def can_solve_halt(self) -> bool:
        """Whether there is anything to halt."""
        job = self.solving or self.runner.current("load")
        return job is not None and not job.facts.get("company")

    def halt(self) -> None:
        """Stop the solve, keeping its best iterate, or the loading."""
        job = self.solving or self.runner.current("load")
        if job is not None:
            self.runner.cancel(job)

    def do_solve_halt(self) -> None:
        """The key for it."""
        self.halt()
        self.news("halting")

    # ---- the table -------------------------------------------------------------------------------

    def arrange(self, **wanted: Any) -> None:
        """Sort or filter: ``sort``, ``turned``, ``text``; computed in the background."""
        self._wanted.update(wanted)
        self._want()

    def _want(self) -> None:
        """Make the table that is wanted now; a newer wish replaces an older one at work."""
        sitting, wanted, old = self.sitting, dict(self._wanted), self._table
        result, others = sitting.result, sitting.others()
        assert result is not None
        version = (id(result), *(id(other) for other in others))
        fresh = version != self._prepared

        def work(job: Job) -> Any:
            from kingpost.tui.models.standings import arrange, prepare

            table = old
            if table is None or fresh:
                table = prepare(sitting.graph, result, others)
            if table.column(wanted["sort"]) is None:
                wanted["sort"], wanted["turned"] = "rank", False
            arrangement = arrange(table, wanted["sort"], wanted["turned"], wanted["text"])
            return table, arrangement, version

        self.runner.start(
            "table",
            work,
            self._tabled,
            words="arranging the rows",
            failed=lambda sentence: self.news(sentence, "bad"),
            replace=True,
        )

    def _tabled(self, made: Any) -> None:
        table, arrangement, self._prepared = made
        old, self._table = self._table, table
        if old is None:
            table.adopt(arrangement)
            table.cursor = 0
            self._open_standings(table)
            return
        if table is not old:
            table.cursor = 0
            node = old.node
            table.arrangement = arrangement
            row = None if node is None else table.row_of(node)
            table.cursor = row or 0
        else:
            table.adopt(arrangement)
        self._standings_view().show(table)
        self._refresh_views()

    def _open_standings(self, table: Standings) -> None:
        from kingpost.tui.views.standings import StandingsView

        self.latest_news = ("", "news")
        self.push_screen(StandingsView(table))
        self._company()

    def _standings_view(self) -> StandingsView:
        from kingpost.tui.views.standings import StandingsView

        for screen in self.screen_stack:
            if isinstance(screen, StandingsView):
                return screen
        raise LookupError("the standings are not open")

    def _refresh_views(self) -> None:
        from kingpost.tui.views.base import View

        for screen in self.screen_stack:
            if isinstance(screen, View):
                screen.refreshed()

    # ---- going from view to view -------------------------------------------------------------------

    def open_node(self, node: int) -> None:
        """Open the load path of a node."""
        from kingpost.tui.views.node import NodeView

        self.push_screen(NodeView(node))

    def close_node(self, node: int) -> None:
        """Back to the standings, with the cursor on the node one ended at."""
        self.pop_screen()
        if self._table is not None:
            row = self._table.row_of(node)
            if row is not None:
                self._standings_view().table.go(row)

    def open_settings(self, measure: str) -> None:
        """Open the form of a measure's settings."""
        from kingpost.tui.views.settings import SettingsView

        self.push_screen(SettingsView(measure, self.sitting.settings_of(measure)))

    def notice(self, title: str, text: str) -> None:
        """A sentence that must be read."""
        from kingpost.tui.views.sheets import NoticeSheet

        self.push_screen(NoticeSheet(title, text))

    def do_measure_choose(self) -> None:
        """Ask for the measure."""
        from kingpost.tui.views.sheets import MeasureSheet

        sheet = MeasureSheet("measure", measure_choices(self), self.sitting.current)
        self.push_screen(sheet, self._chosen)

    def _chosen(self, measure: str | None) -> None:
        sitting = self.sitting
        if measure is None:
            return
        result = sitting.results.get(measure)
        if result is None:
            self.solve(measure, None)
        elif result.refusal is not None:
            self.notice(f"{measure} has no answer here", result.refusal.sentence)
        elif measure != sitting.current:
            sitting.current = measure
            self.news(solved_words(result))
            self._want()

    def do_settings_change(self) -> None:
        """Ask for the settings of the measure shown."""
        self.open_settings(self.sitting.current)

    def do_log_open(self) -> None:
        """Open the solve log."""
        from kingpost.tui.views.solvelog import SolveLogView

        self.push_screen(SolveLogView())

    def do_help_open(self) -> None:
        """Open the help."""
        from kingpost.tui.views.help import HelpView

        self.push_screen(HelpView())


def sweep_words(job: Job) -> str:
    """How far a solve has come, for the rule."""
    from kingpost.tui.models.numbers import small

    if not job.log:
        stage = f": {visible(job.progress.stage, 60)}" if job.progress else ""
        return f"{job.words}{stage}"
    line = job.log[-1]
    proven = f", order proven to {line.proven:,}" if line.proven else ""
    return f"{job.words}: sweep {line.index:,}, bound {small(line.bound)}{proven}"


def solved_words(result: Result) -> str:
    """What came of a solve, for the rule."""
    from kingpost.tui.models.numbers import small

    words = f"{result.measure}: {result.stop} after {result.sweeps:,} sweeps"
    return f"{words}, bound {small(result.bound.value)}"


def measure_choices(app: KingpostApp) -> list[Any]:
    """A row for every measure: its letter, its title, and what is known of it."""
    from kingpost.tui.views.sheets import Choice

    sitting, choices = app.sitting, []
    at_work = {job.facts.get("measure") for job in app.runner.jobs("solve")}
    for name in sitting.names:
        result = sitting.results.get(name)
        found = sitting.measure(name)
        if name in at_work:
            state = "being solved"
        elif result is None:
            state = "not solved yet"
        elif result.refusal is not None:
            state = "no answer here"
        else:
            state = f"order proven to {result.proven_order:,}"
        choices.append(Choice(name, f"{found.letter} {name}", f"{state.ljust(26)} {found.title}"))
    return choices


def run(
    paths: list[str],
    load_options: LoadOptions | Callable[[], LoadOptions],
    measure: str,
    settings: Settings | Callable[[], Settings] | None,
    *,
    threads: int | None = None,
    slow: bool = False,
) -> int:
    """Open the screen on some edge tables; returns the exit status.

    Options and settings may be given as functions: they are then called in the loading job, so
    that the first frame need not wait for the modules that define them.
    """

    def load(job: Job) -> Graph:
        from kingpost.core.ingest import load as load_tables

        options = load_options() if callable(load_options) else load_options
        return load_tables(paths, options, job.watch)

    looks = terminal.decide(slow=slow)
    # The framework's own reading of NO_COLOR paints greys; our styles have no colour then.
    os.environ.pop("NO_COLOR", None)
    app = KingpostApp(paths, load, measure, settings, threads=threads, looks=looks)
    try:
        status = app.run(mouse=False)
    except KeyboardInterrupt:
        status = 130
    ended = app.runner.shutdown(_PATIENCE)
    status = cast("int | None", status)
    if status is None:
        status = app.return_code or 1
    if app.sentence:
        print(f"kingpost: {app.sentence}", file=sys.stderr)
    if not ended:
        # A thread deep in a library cannot be stopped; waiting for it would hang the shell.
        sys.stdout.flush()
        sys.stderr.flush()
        os._exit(status)
    return status
