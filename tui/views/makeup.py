"""Makeup: what the graph is made of, page by page; a component can be gone into."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from textual import events
from textual.app import ComposeResult

from kingpost.core.insight.audit import examine
from kingpost.core.text import visible
from kingpost.tui.jobs import Job
from kingpost.tui.models import makeup as model
from kingpost.tui.models.makeup import Parts, Tail
from kingpost.tui.models.pairs import Pairs, Row, wrapped
from kingpost.tui.rooms import MAKEUP
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.grid import Grid
from kingpost.tui.widgets.lines import KeyLine, Line, Piece, Rule
from kingpost.tui.widgets.rowtable import RowTable

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

SHAPE, DEGREES, STRONG, WEAK, INGEST, SPECTRUM = (
    "shape",
    "degrees",
    "strong components",
    "weak components",
    "rows read",
    "spectrum",
)
PAGES = (SHAPE, DEGREES, STRONG, WEAK, INGEST, SPECTRUM)
_SHORT = {STRONG: "strong", WEAK: "weak", INGEST: "rows"}


class MakeupView(RowsView):
    """Tab turns the pages; each is worked out once, away from the screen, when it is opened."""

    CSS_PATH = "makeup.tcss"
    view = MAKEUP

    def __init__(self) -> None:
        super().__init__()
        self._at = 0
        self._rows: list[Row] = []
        self._parts: Parts | None = None
        self._job: Job | None = None

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="pages")
        yield Rule(id="top")
        yield Grid(id="chart")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    @property
    def page(self) -> str:
        """The page shown."""
        return PAGES[self._at]

    def opened(self) -> None:
        graph, within = self.kingpost.sitting.graph, self.kingpost.sitting.within
        name = visible(graph.origin.name, 60) + (f", {within}" if within else "")
        words = f"   {graph.n:,} nodes  {graph.m:,} edges"
        words += "" if graph.directed else "  undirected"
        self.query_one("#head", Line).show((f" makeup of {name}", "head"), (words, "plain"))
        self._turn()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 14, "-low")
        if self.composed and self._rows:
            self.call_after_refresh(self._write)

    # ---- pages -------------------------------------------------------------------------------

    def _turn(self) -> None:
        """Show the page one has turned to, from what is known or by working it out."""
        self.query_one("#pages", Line).show_by(self._page_pieces)
        self.set_class(self.page == DEGREES, "-chart")
        self._rows, self._parts = [], None
        if self._job is not None:
            self.kingpost.runner.cancel(self._job)
            self._job = None
        known = self.kingpost.sitting.makeup.get(self._key)
        if known is not None:
            self._show(known)
            return
        self.query_one("#top", Rule).title("being worked out")
        self.table.show(Pairs([]), 0, empty="being worked out; Tab turns on, Esc goes back")
        page, key, sitting = self.page, self._key, self.kingpost.sitting
        graph, result = sitting.graph, sitting.result

        def done(found: Any) -> None:
            sitting.makeup[key] = found
            if self.composed and self.is_attached and self._key == key:
                self._job = None
                self.kingpost.news("")
                self._show(found)

        work = _WORK[page]
        self._job = self.kingpost.runner.start(
            "makeup",
            lambda job: work(graph, result, job),
            done,
            words=f"working out: {page}",
            failed=self._failed,
            news=self._progress,
            replace=True,
        )
        self.refresh_keys()

    @property
    def _key(self) -> tuple[str, int]:
        # The spectrum belongs to a result; what stands first in a component does too.
        bound = self.page in (STRONG, WEAK, SPECTRUM)
        return self.page, id(self.kingpost.sitting.result) if bound else 0

    def _failed(self, sentence: str) -> None:
        if self.composed and self.is_attached:
            self.table.show(Pairs([Row("no answer", sentence)]), 0)
            self.query_one("#top", Rule).title(self.page)

    def _progress(self, job: Job) -> None:
        progress = job.progress
        if progress is None or self.app.screen is not self:
            return
        amount = f" {progress.done:,}" if progress.done else ""
        amount += f" of {progress.total:,}" if progress.total else ""
        self.tell(f"{visible(progress.stage, 40)}{amount} {visible(progress.unit, 20)}".rstrip())

    def _page_pieces(self, width: int) -> list[Piece]:
        names = [_SHORT.get(page, page) for page in PAGES]
        if sum(len(page) + 4 for page in PAGES) < width:
            names = list(PAGES)
        pieces: list[Piece] = [(" ", "plain")]
        for at, name in enumerate(names):
            here = at == self._at
            pieces.append((f"[{name}]" if here else f" {name} ", "strong" if here else "quiet"))
            pieces.append((" ", "plain"))
        return pieces

    def _show(self, found: Any) -> None:
        title = self.page
        if isinstance(found, Parts):
            self._parts = found
            title = found.words
            self.table.headings(True)
            self.table.show(found, 0, empty="the graph has no nodes, so it has no components")
        elif self.page == DEGREES:
            title = self._degrees(found)
        else:
            self._rows = found
            self._write()
        self.query_one("#top", Rule).title(title)
        self.refresh_keys()

    def _write(self) -> None:
        if self._rows:
            width = self.size.width or self.app.size.width
            self.table.headings(False)
            self.table.show(Pairs(wrapped(self._rows, width)), self.table.row)

    def _degrees(self, found: list[Tail]) -> str:
        n, glyphs = self.kingpost.sitting.graph.n, self.looks.glyphs
        self.query_one("#chart", Grid).show(
            lambda width, height, glyphs: model.degree_chart(found, n, width, height, glyphs)
        )
        self._rows = model.degree_rows(found, n)
        self._write()
        signs = zip(found, (glyphs.bound, glyphs.residual), strict=False)
        told = ", ".join(f"{sign} {tail.name}" for tail, sign in signs)
        return f"nodes by neighbours, so many or more: {told}; both axes logarithmic"

    # ---- actions -----------------------------------------------------------------------------

    def do_other_table(self) -> None:
        self._at = (self._at + 1) % len(PAGES)
        self._turn()

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self.refresh_keys()

    def can_part_open(self) -> bool:
        parts = self._parts
        if parts is None or not parts.count:
            return False
        return 1 < parts.parts[self.table.row].nodes < parts.graph.n

    def do_part_open(self) -> None:
        parts, row = self._parts, self.table.row
        if parts is None:
            return
        words = f"{parts.kind} component {row + 1:,}"
        self.kingpost.within.enter(lambda job: parts.members(row), words)

    def do_step_back(self) -> None:
        if self._job is not None:
            self.kingpost.runner.cancel(self._job)
            self.kingpost.news("")
        self.app.pop_screen()


def _shape(graph: Graph, result: Result | None, job: Job) -> list[Row]:
    return model.shape_rows(examine(graph, job.watch))


def _spectrum(graph: Graph, result: Result | None, job: Job) -> list[Row]:
    from kingpost.core.insight.spectrum import MEASURES, spectrum

    if result is not None and result.measure in MEASURES:
        found = spectrum(graph, result.measure, result=result, watch=job.watch)
    else:
        found = spectrum(graph, "eigenvector", watch=job.watch)
    return model.spectrum_rows(found)


_WORK: dict[str, Callable[[Graph, Result | None, Job], Any]] = {
    SHAPE: _shape,
    DEGREES: lambda graph, result, job: model.tails(graph),
    STRONG: lambda graph, result, job: model.strong_parts(graph, result, job.watch),
    WEAK: lambda graph, result, job: model.weak_parts(graph, result, job.watch),
    INGEST: lambda graph, result, job: model.ingest_rows(graph),
    SPECTRUM: _spectrum,
}
