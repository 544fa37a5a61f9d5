"""The application: which view, which graph, which results, which work in the background.

Only what the first frame needs is imported here; numpy and everything over it come in with
the loading job, after the first frame has named the file.
"""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from kingpost.core.text import visible
from kingpost.tui import keymaps, rooms, terminal

terminal.prepare_environment()  # before textual is imported: it reads the environment then

from textual import events  # noqa: E402
from textual.app import App  # noqa: E402
from textual.geometry import Size  # noqa: E402
from textual.screen import Screen  # noqa: E402
from textual.timer import Timer  # noqa: E402

from kingpost.tui.asking import Asking  # noqa: E402
from kingpost.tui.config import Config  # noqa: E402
from kingpost.tui.doors import Doors  # noqa: E402
from kingpost.tui.jobs import Job, Runner  # noqa: E402
from kingpost.tui.keeping import Keeper  # noqa: E402
from kingpost.tui.opening import FRESH, Load, Loaded, Opener  # noqa: E402
from kingpost.tui.resuming import Resumer  # noqa: E402
from kingpost.tui.routes import Routes  # noqa: E402
from kingpost.tui.views.base import View  # noqa: E402
from kingpost.tui.views.loading import LoadingView  # noqa: E402
from kingpost.tui.within import Within  # noqa: E402

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.measures.base import Settings
    from kingpost.tui.desk import Desk
    from kingpost.tui.models.marks import Marks
    from kingpost.tui.models.sitting import Sitting
    from kingpost.tui.models.standings import Standings
    from kingpost.tui.views.standings import StandingsView

FAULT = 70  # exit status of a fault of the program
_SETTLED = 0.3  # seconds without another size after which the one shown is checked
PATIENCE = 2.0  # seconds that threads get to end on leaving

# Imported with the graph, so that opening one does not keep the screen waiting.
_VIEWS = (
    "standings",
    "node",
    "solvelog",
    "settings",
    "help",
    "sheets",
    "columns",
    "shortlist",
    "solves",
    "way",
    "plate",
    "doing",
    "start",
    "roles",
    "makeup",
    "agreement",
    "why",
    "losses",
    "along",
    "walk",
    "drift",
)


class KingpostApp(App[int], inherit_bindings=False):
    """Controller of the views; holds the sitting and the runner of background work."""

    # The first screen is the app's own, whose style sheet textual does not look up by itself.
    CSS_PATH = [  # noqa: RUF012
        os.path.join(os.path.dirname(__file__), name)
        for name in ("app.tcss", "views/loading.tcss", "views/start.tcss")
    ]
    ENABLE_COMMAND_PALETTE = False
    HELPERS = (Keeper, Opener, Resumer, Routes, Within, Doors, Asking)
    VIEWS = _VIEWS
    TITLE = "kingpost"

    def __init__(
        self,
        paths: list[str],
        load: Load | None,
        measure: str,
        settings: Settings | Callable[[Graph], Settings] | None,
        *,
        options: LoadOptions | Callable[[], LoadOptions] | None = None,
        kept: str = FRESH,
        store: bool = True,
        threads: int | None = None,
        looks: terminal.Looks | None = None,
        config: Config | None = None,
    ) -> None:
        super().__init__(ansi_color=True)
        self.theme = "ansi-dark"
        self.looks = looks or terminal.decide()
        self.config = config or Config()
        self.runner = Runner(self.call_later, threads)
        self.latest_news: tuple[str, str] = ("", "news")
        self.sentence = ""  # what is printed after leaving
        self._desk: Desk | None = None
        self._trouble = self.config.trouble  # said once there is a view to say it in
        self._keymaps: dict[str, dict[str, str]] = {}
        self._settling: Timer | None = None
        self.keeper = Keeper(self)
        self.resumer = Resumer(self)
        self.within = Within(self)
        self.opener = Opener(self, paths, load, options, measure, settings, kept, store)
        self.routes = Routes(self)
        self.helpers = (
            self.keeper,
            self.opener,
            self.resumer,
            self.routes,
            self.within,
            Doors(self),
            Asking(self),
        )

    # ---- start and end -------------------------------------------------------------------------

    def get_default_screen(self) -> Screen[Any]:
        return LoadingView(self.opener.paths) if self.opener.paths else self._start()

    def _start(self) -> Screen[Any]:
        from kingpost.tui.views.start import StartView

        if self._trouble:
            self.latest_news, self._trouble = (self._trouble, "bad"), ""
        return StartView(self.config.folder)

    def on_mount(self) -> None:
        loop = self._loop
        if loop is not None and not self.is_headless:
            for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
                loop.add_signal_handler(number, self._signalled, number)
        # The first frame is on its way before the heavy imports compete for the processor.
        if self.opener.paths:
            self.set_timer(0.01, self._begin)

    def _signalled(self, number: int) -> None:
        """Leave because the system says so."""
        self.leave(128 + number)
        if number == signal.SIGHUP:
            # Nobody is there any more to see the program wait for something.
            last = threading.Timer(5 * PATIENCE, os._exit, (128 + number,))
            last.daemon = True
            last.start()

    def _begin(self) -> None:
        self.opener.begin()

    def make_sitting(self, graph: Graph, measure: str) -> Sitting:
        """The sitting over a graph just loaded."""
        from kingpost.tui.models.sitting import Sitting

        return Sitting(graph, measure)

    def sit_down(self, made: Loaded, trouble: str) -> None:
        """A graph is loaded: a desk for it, with nothing on it yet."""
        from kingpost.tui.desk import Desk

        self._trouble = made.trouble or trouble or self._trouble
        self._desk = Desk(self.runner, made.sitting, self)
        self.keeper.begin(self.opener.paths, made.marks)

    def back_to_start(self, sentence: str, asked_for: bool) -> bool:
        """Back to the view in which tables are chosen, if they were chosen there."""
        if not self._chosen_in_start:
            return False
        self._desk = None
        self._pop_to_start()
        if asked_for:
            self.news(sentence)
        else:
            self.notice("nothing was opened", sentence)
        return True

    @property
    def _chosen_in_start(self) -> bool:
        """Whether Start is beneath the views that are open."""
        return any(screen.view == rooms.START for screen in self._views)

    @property
    def _views(self) -> list[View]:
        return [screen for screen in self.screen_stack if isinstance(screen, View)]

    def _pop_to_start(self) -> None:
        """Close the views down to Start, or down to the one the application began with."""
        while len(self.screen_stack) > 1 and self._views[-1].view != rooms.START:
            self.pop_screen()

    def can_start_open(self) -> bool:
        """Whether a graph is open."""
        return self._desk is not None and self._desk.table is not None

    def do_start_open(self) -> None:
        """Keep this sitting and choose another table."""
        from kingpost.tui.views.start import StartView

        self._put_away()
        told = (self.sentence, "bad") if self.sentence else ("this sitting is kept", "news")
        self.sentence = ""
        self.desk.close()
        self.within.forget()
        self._desk = None
        self.keeper.end()
        self._pop_to_start()
        self.latest_news = told
        if isinstance(self.screen, StartView):
            self.screen.look_again()
        else:
            # Above the view that read what the command line named: the toolkit cannot replace
            # the screen it began with.
            self.push_screen(self._start())

    def noted(self) -> None:
        """A table has been noted among those opened lately: Start may have been quicker."""
        from kingpost.tui.views.start import StartView

        if isinstance(self.screen, StartView):
            self.screen.look_again()

    def leave(self, status: int) -> None:
        """Leave with an exit status; the terminal is restored by the driver."""
        self._put_away()
        self.exit(status)

    def _put_away(self) -> None:
        """Keep marks and sitting: on leaving, whatever the reason."""
        self.sentence = self.keeper.close() or self.resumer.close() or self.sentence

    def send(self, sequence: str) -> None:
        """Send an escape sequence to the terminal itself."""
        if self._driver is not None:
            self._driver.write(sequence)
            self._driver.flush()

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
        with contextlib.suppress(Exception):
            self._put_away()
        place = terminal.keep_fault("".join(traceback.format_exception(error)))
        kept = f"; please report {place}" if place else ""
        self.sentence = f"a fault of the program ended the screen ({type(error).__name__}){kept}"
        self.leave(FAULT)

    def do_quit(self) -> None:
        """Quit: answered, unless tables named on the command line were still being read."""
        started = self._desk is not None or self._chosen_in_start
        self.leave(0 if started else 130)

    def do_quit_now(self) -> None:
        """Quit from anywhere."""
        self.leave(130)

    # ---- what views ask ------------------------------------------------------------------------

    @property
    def desk(self) -> Desk:
        """The desk; there is one once the graph is loaded, and no view asks before."""
        assert self._desk is not None
        return self._desk

    @property
    def sitting(self) -> Sitting:
        """The sitting at the desk."""
        return self.desk.sitting

    @property
    def view(self) -> View | None:
        """The view on top."""
        return self.screen if isinstance(self.screen, View) else None

    async def on_event(self, event: events.Event) -> None:
        # Keys are carried out here, one after the other.  Forwarded to the views they would
        # overtake each other: what is typed fast behind "/" would miss the prompt it opens.
        if isinstance(event, (events.Key, events.Paste)) and not event.is_forwarded:
            if self._screen_stack:
                self.typed(event)
            return
        await super().on_event(event)
        if isinstance(event, events.Resize) and not self.is_headless:
            if self._settling is not None:
                self._settling.stop()
            self._settling = self.set_timer(_SETTLED, self._check_size)

    def _check_size(self) -> None:
        """After a storm of sizes the last one may have been lost on its way to the view."""
        self._settling = None
        with contextlib.suppress(OSError):
            size = Size(*os.get_terminal_size(sys.__stdout__.fileno() if sys.__stdout__ else 1))
            if self.screen.size != size:
                self._size = size
                self.screen.post_message(events.Resize(size, size))
                self._settling = self.set_timer(_SETTLED, self._check_size)

    def typed(self, event: events.Key | events.Paste) -> None:
        """Give a key or pasted text to the view on top."""
        if isinstance(event, events.Key) and event.key.startswith("alt+"):
            # No key here is a chord: an Escape and a letter that came in one packet look alike.
            key = event.key.removeprefix("alt+")
            letter = key.removeprefix("shift+")
            key = letter.upper() if letter != key and len(letter) == 1 else key
            self.typed(events.Key("escape", None))
            event = events.Key(key, key if len(key) == 1 else None)
        view = self.view
        if view is not None:
            view.take(event)

    def keymap(self, view: str) -> dict[str, str]:
        """Key -> action id of a view."""
        if view not in self._keymaps:
            self._keymaps[view] = keymaps.keymap(view, self.bound)
        return self._keymaps[view]

    @property
    def bound(self) -> Mapping[str, tuple[str, ...]]:
        """Action id -> keys, of the actions that the user has bound otherwise."""
        return self.config.keys

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

    def can_solve_halt(self) -> bool:
        """Whether there is anything to halt."""
        job = self.solving or self.runner.current("load")
        return job is not None and not job.facts.get("company")

    def do_solve_halt(self) -> None:
        """Stop the solve, keeping its best iterate, or the loading."""
        job = self.solving or self.runner.current("load")
        if job is not None:
            self.runner.cancel(job)
            self.news("halting")

    # ---- what the desk tells -----------------------------------------------------------------

    def table_ready(self, table: Standings, first: bool) -> None:
        """Show a table; the first one opens the standings."""
        from kingpost.tui.views.standings import StandingsView

        table.marks = self.keeper.marks
        if table.graph is not self.sitting.graph:
            return
        if first:
            if self.within.depth:
                self.pop_screen()  # what showed how the part was solved
            self.latest_news = (self._trouble, "bad")
            self._trouble = ""
            self.push_screen(StandingsView(table))
            if not self.within.depth:
                # What is kept and taken up again is the sitting over the whole.
                self.opener.remember()
            # Once its widgets exist: the rest of a sitting that is taken up needs them.
            self.call_after_refresh(self._opened)
            return
        self.standings.show(table)
        self.resumer.filtered()
        self.refreshed()

    def _opened(self) -> None:
        if self.within.depth or self._desk is None:
            return
        shown = self.standings_shown
        if shown is None or not shown.composed:
            self.call_after_refresh(self._opened)
            return
        self.resumer.opened()

    def swept(self, job: Job) -> None:
        """A solve has news: shown where its sweeps are."""
        from kingpost.tui.views.solvelog import SolveLogView
        from kingpost.tui.views.solves import SolvesView

        if isinstance(self.screen, LoadingView):
            if self.screen.composed:
                self.screen.stage(job)
        elif isinstance(self.screen, (SolveLogView, SolvesView)):
            self.screen.refreshed()

    def refreshed(self) -> None:
        """Tell every open view that results or jobs have changed."""
        for view in self.open_views:
            view.refreshed()

    def marks_changed(self) -> None:
        """Tell every open view that a mark was made or taken off."""
        for view in self.open_views:
            view.marks_changed()

    def no_start(self, sentence: str) -> None:
        """There is nothing to show: out with the reason, of a part to the whole."""
        if self.within.depth:
            self.within.no_start(sentence)
            return
        self._desk = None
        self.opener.fail(sentence)

    @property
    def standings(self) -> StandingsView:
        """The view everything else is reached from."""
        shown = self.standings_shown
        assert shown is not None
        return shown

    @property
    def standings_shown(self) -> StandingsView | None:
        """The same, None while there are no standings yet."""
        if self._desk is None or self._desk.table is None:
            return None
        from kingpost.tui.views.standings import StandingsView

        views = reversed(self.screen_stack)
        return next((screen for screen in views if isinstance(screen, StandingsView)), None)

    @property
    def open_views(self) -> list[View]:
        """The views over the graph at hand: from its standings up.  Those beneath show another."""
        from kingpost.tui.views.standings import StandingsView

        views: list[View] = []
        for screen in reversed(self.screen_stack):
            if isinstance(screen, View):
                views.insert(0, screen)
            if isinstance(screen, (StandingsView, LoadingView)):
                break
        return views

    def seat(self, desk: Desk, marks: Marks) -> None:
        """Let another desk have the screen, with the marks of its graph."""
        self._desk = desk
        self.keeper.reseat(marks)

    # ---- going from view to view -------------------------------------------------------------

    def open_node(self, node: int, trail: Sequence[int] = (), at: int = 0) -> None:
        """Open the load path of a node, or take up the way walked before."""
        from kingpost.tui.views.node import NodeView

        view = NodeView(node)
        if trail:
            view.trail.nodes, view.trail.at = list(trail), min(max(at, 0), len(trail) - 1)
        self.push_screen(view)

    def walk_to(self, node: int) -> None:
        """Walk on to a node: in the Node view beneath what is open, else in a new one."""
        from kingpost.tui.views.node import NodeView

        walking = [view for view in self.open_views if isinstance(view, NodeView)]
        if not walking:
            self.open_node(node)
            return
        while self.screen is not walking[-1]:
            self.pop_screen()
        walking[-1].walk(node)

    def close_node(self, node: int) -> None:
        """Back, with the cursor of the standings on the node one ended at."""
        self.pop_screen()
        if self.screen is self.standings:
            self.jump_to(node)

    def jump_to(self, node: int) -> bool:
        """Put the cursor of the standings on a node; False if no row shows it."""
        row = self.standings.model.row_of(node)
        if row is None:
            return False
        self.standings.table.go(row)
        return True

    def open_settings(self, measure: str) -> None:
        """Open the form of a measure's settings."""
        from kingpost.tui.views.settings import SettingsView

        self.push_screen(SettingsView(measure, self.sitting.settings_of(measure)))

    def notice(self, title: str, text: str) -> None:
        """A sentence that must be read."""
        from kingpost.tui.views.sheets import NoticeSheet

        self.push_screen(NoticeSheet(title, text))
