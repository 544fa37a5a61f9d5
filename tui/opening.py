"""Opening tables: from paths to a sitting, by way of what has to be asked on the way.

A helper of the application.  Reading goes on while the offer to take up the last sitting waits
for its answer.
"""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING, Any

from kingpost.core.errors import KingpostError
from kingpost.tui.models import resumption
from kingpost.tui.models.resumption import Kept
from kingpost.tui.views.loading import LoadingView

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.ingest.glance import Peek
    from kingpost.core.measures.base import Settings
    from kingpost.tui.app import KingpostApp
    from kingpost.tui.jobs import Job
    from kingpost.tui.models.marks import Marks
    from kingpost.tui.models.sitting import Sitting

ASK, TAKE, FRESH = "ask", "take", "fresh"  # what becomes of a sitting that was kept

Load = Callable[["Job"], "Graph"]
MakeOptions = Callable[[], "LoadOptions"]


@dataclasses.dataclass(frozen=True)
class Loaded:
    """What the loading job hands over."""

    sitting: Sitting
    settings: Settings | None
    marks: Marks
    trouble: str
    nodes: dict[str, int]
    options: dict[str, Any]


@dataclasses.dataclass(frozen=True)
class Unclear:
    """The loading job found columns that somebody has to choose."""

    peek: Peek
    options: LoadOptions
    sentence: str


class Opener:
    """The tables being opened, or open."""

    def __init__(
        self,
        app: KingpostApp,
        paths: list[str],
        load: Load | None,
        options: LoadOptions | MakeOptions | None,
        measure: str,
        settings: Settings | Callable[[Graph], Settings] | None,
        kept: str = ASK,
        store: bool = True,
    ) -> None:
        self._app = app
        self.paths = list(paths)
        self._load_given, self._options = load, options
        self._measure, self._settings = measure, settings
        self._how, self.store = kept, store
        self.notes: list[str] = []  # told where they stay to be read: after leaving
        self._offer: Kept | None = None
        self._taken: Kept | None = None
        self._loaded: Loaded | Unclear | None = None
        self._trouble = ""
        self._ask = False

    @property
    def first_measure(self) -> str:
        """The measure that is solved first where no sitting is taken up."""
        return self._measure

    # ---- reading -------------------------------------------------------------------------------

    def open(
        self, paths: list[str], options: Mapping[str, Any] | None = None, *, ask: bool = False
    ) -> None:
        """Open other tables than those the application was started with, reading them by
        ``options`` or, with ``ask``, once somebody has chosen which column is what.
        """
        self.paths, self._load_given, self._ask = list(paths), None, ask
        self._options = lambda: _known_options(options or {})
        self._settings, self._how = None, ASK
        self._offer = self._taken = self._loaded = None
        self._app.push_screen(LoadingView(self.paths))
        self._app.set_timer(0.01, self.begin)

    def begin(self) -> None:
        """Look for a sitting that was kept, and start reading."""
        self._trouble = ""
        if self._how != FRESH:
            try:
                self._offer = resumption.read(self.paths)
            except KingpostError as error:
                self._trouble = error.sentence
            if self._how == TAKE:
                if self._offer is None and not self._trouble:
                    self._trouble = "no sitting over these tables was kept; this is a new one"
                self._taken, self._offer = self._offer, None
        self._show_offer()
        self._read()

    def _read(self) -> None:
        self._loaded = None
        kept = self._taken
        if isinstance(self._app.screen, LoadingView):
            self._app.screen.again()
        self._app.runner.start(
            "load",
            lambda job: self._work(job, kept or self._offer),
            self._done,
            failed=self.fail,
            news=self._stage,
            words="reading the edge table",
            replace=True,
        )

    def _options_now(self) -> LoadOptions:
        from kingpost.core.ingest import LoadOptions

        options = self._options() if callable(self._options) else self._options
        options = options or LoadOptions()
        if self._taken is not None and options == LoadOptions():
            # Read as they were read then; what the command line says goes first.
            return _known_options(self._taken.options)
        return options

    def _work(self, job: Job, kept: Kept | None) -> Loaded | Unclear:
        from importlib import import_module

        from kingpost.core import warm
        from kingpost.core.errors import UnclearColumns
        from kingpost.core.ingest import LoadOptions, peek
        from kingpost.core.open import open_graph

        warm.expect(self._measure)
        app, options = self._app, self._options_now()
        if self._ask:
            job.watch.report("looking at the columns")
            return Unclear(peek(self.paths), options, "no columns were chosen")
        try:
            graph = (
                self._load_given(job)
                if self._load_given is not None
                else open_graph(
                    self.paths,
                    options=options,
                    watch=job.watch,
                    store=self.store,
                    tell=self.notes.append,
                )
            )
        except UnclearColumns as error:
            job.watch.report("looking at the columns")
            return Unclear(peek(self.paths, options=options), options, error.sentence)
        sitting = app.make_sitting(graph, self._measure)
        settings = self._settings(graph) if callable(self._settings) else self._settings
        import_module("kingpost.tui.desk")
        for name in app.VIEWS:
            import_module(f"kingpost.tui.views.{name}")
        marks, trouble = app.keeper.fetch(self.paths, graph)
        nodes = app.resumer.locate(graph, kept)
        plain = LoadOptions()
        changed = {
            item.name: getattr(options, item.name)
            for item in dataclasses.fields(options)
            if getattr(options, item.name) != getattr(plain, item.name)
        }
        return Loaded(sitting, settings, marks, trouble, nodes, changed)

    def _stage(self, job: Job) -> None:
        if isinstance(self._app.screen, LoadingView):
            self._app.screen.stage(job)

    def _done(self, made: Loaded | Unclear) -> None:
        self._loaded = made
        if self._offer is None:
            self._go_on()
        elif isinstance(self._app.screen, LoadingView):
            self._show_offer()
            self._app.screen.wait_for_answer()

    def _go_on(self) -> None:
        """Nothing is left to be asked about a sitting that was kept."""
        made, self._loaded = self._loaded, None
        if isinstance(made, Unclear):
            self._ask_columns(made)
        elif made is not None:
            self._sit_down(made)

    def _sit_down(self, made: Loaded) -> None:
        kept = self._taken
        measure, settings = self._measure, made.settings
        self._app.sit_down(made, self._trouble)
        self._app.resumer.begin(self.paths, made.options, kept, made.nodes)
        if kept is not None and settings is None:
            measure = made.sitting.current
        elif settings is not None:
            made.sitting.settings[measure] = settings
            made.sitting.current = measure
        self._app.desk.solve(measure, settings)

    def give_up(self) -> None:
        """Stop reading and go back to where the tables were chosen."""
        runner = self._app.runner
        reading = runner.jobs("load")
        for job in reading:
            runner.cancel(job)  # and fails
        if not reading:
            if self._app.solving is not None:
                self._app.desk.close()
            self.fail("nothing was opened", asked_for=True)

    def fail(self, sentence: str, asked_for: bool = False) -> None:
        """Nothing is opened: back to where the tables were chosen, or out.

        What was ``asked_for`` needs no notice that has to be closed.
        """
        self._offer = self._taken = self._loaded = None
        if self._app.back_to_start(sentence, asked_for or "cancelled before" in sentence):
            return
        self._app.sentence = sentence
        cancelled = any(job.watch.cancelled for job in self._app.runner.jobs("load"))
        self._app.leave(130 if cancelled or "cancelled before" in sentence else 2)

    # ---- the sitting that was kept ---------------------------------------------------------------

    def _show_offer(self) -> None:
        view = self._app.screen
        if not isinstance(view, LoadingView):
            return
        if self._offer is None:
            view.offer("", "", "")
            return
        changed = ""
        if [list(one) for one in self._offer.tables] != resumption.stamps(self.paths):
            changed = "the table has changed since; what no longer fits is left out"
        made = self._loaded
        if isinstance(made, Loaded) and made.options != dict(self._offer.options):
            changed = "the table was read with other options then; what does not fit is left out"
        when = resumption.clock(self._offer.when)
        view.offer(f"a sitting of {when} was kept", resumption.words(self._offer), changed)

    def can_sitting_resume(self) -> bool:
        """Whether a kept sitting waits for an answer."""
        return self._offer is not None

    def do_sitting_resume(self) -> None:
        """Take up the sitting that was kept."""
        self._taken, self._offer = self._offer, None
        self._show_offer()
        made = self._loaded
        before = None if self._taken is None else self._taken.options
        same = isinstance(made, Loaded) and made.options == before
        if before and self._load_given is None and not same:
            self._read()  # as they were read then
        else:
            self._go_on()

    can_sitting_fresh = can_sitting_resume

    def do_sitting_fresh(self) -> None:
        """Begin a new sitting; the old one is kept until this one ends."""
        self._offer = None
        self._show_offer()
        self._go_on()

    # ---- columns that somebody has to choose ---------------------------------------------------

    def _ask_columns(self, unclear: Unclear) -> None:
        from kingpost.tui.views.roles import RolesView

        self._app.push_screen(
            RolesView(self.paths, unclear.peek, unclear.options),
            lambda options: self._columns_chosen(options, unclear.sentence),
        )

    def _columns_chosen(self, options: LoadOptions | None, sentence: str) -> None:
        if options is None:
            self.fail(sentence, asked_for=True)
            return
        self._options, self._load_given, self._ask = options, None, False
        self._read()

    # ---- tables opened before --------------------------------------------------------------------

    def remember(self) -> None:
        """Note these tables among those opened lately, away from the screen."""
        graph, paths = self._app.sitting.graph, [os.path.abspath(path) for path in self.paths]
        options = self._app.resumer.options

        def work(job: Job) -> None:
            from kingpost.tui.models import recent

            recent.note(paths, graph.n, graph.m, options)

        if self._load_given is None and "-" not in self.paths:
            self._app.background(
                "noting", work, lambda _: self._app.noted(), words="noting the table"
            )


def _known_options(given: Mapping[str, Any]) -> LoadOptions:
    """Options as they were noted down, without those that this version does not know."""
    from kingpost.core.ingest import LoadOptions

    known = {item.name for item in dataclasses.fields(LoadOptions)}
    return LoadOptions(**{name: value for name, value in given.items() if name in known})
