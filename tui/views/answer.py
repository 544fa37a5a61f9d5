"""An answer: pages of what an insight found, worked out away from the screen."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from rich.cells import cell_len
from textual import events
from textual.app import ComposeResult

from kingpost.core.text import visible
from kingpost.tui.jobs import Job
from kingpost.tui.models.answers import NOWHERE, Answer, Page
from kingpost.tui.models.drawing import wrap
from kingpost.tui.models.pairs import Pairs, Row, wrapped
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.grid import Grid
from kingpost.tui.widgets.lines import KeyLine, Line, Piece, Rule
from kingpost.tui.widgets.rowtable import RowTable

_LINES = 3  # of words about the row


class AnswerView(RowsView):
    """Works its answer out on opening; Tab turns the pages, leaving ends the work.

    ``lane`` is shared by all answers that replace each other; a view beneath keeps its own.
    """

    CSS_PATH = "answer.tcss"
    asked: ClassVar[str] = "the answer"

    def __init__(self) -> None:
        super().__init__()
        self.answer: Answer | None = None
        self._at = 0
        self._job: Job | None = None
        self._rows: Pairs | None = None

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="pages")
        yield Rule(id="top")
        yield Grid(id="chart")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="below")
        yield Line(id="words", rows=_LINES)
        yield Line(id="caution", rows=2)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    # ---- working it out ----------------------------------------------------------------------

    def work(self) -> Callable[[Job], Answer] | None:
        """What works the answer out, to be run in a job; None where it cannot be asked."""
        raise NotImplementedError

    def opened(self) -> None:
        self.ask()

    def ask(self) -> None:
        """Work the answer out, anew if it was before."""
        work = self.work()
        if work is None:
            return
        self.query_one("#head", Line).show((f" {self.asked}", "head"))
        self._blank("being worked out; Esc ends it")
        self._job = self.kingpost.runner.start(
            f"answer:{self.view}",
            work,
            self._answered,
            words=self.asked,
            failed=self._failed,
            news=self._progress,
            replace=True,
        )

    def _blank(self, sentence: str) -> None:
        self.answer = None
        self.set_class(False, "-chart")
        self.set_class(True, "-silent")
        self.query_one("#top", Rule).title("")
        self.table.headings(False)
        self.table.show(Pairs([]), 0, empty=sentence)
        self.refresh_keys()

    def _answered(self, found: Answer) -> None:
        if not self.composed or not self.is_attached:
            return
        self._job, self.answer = None, found
        self._at = min(self._at, len(found.pages) - 1)
        if self.app.screen is self:
            self.kingpost.news("")
        self._turn()

    def _failed(self, sentence: str) -> None:
        if not self.composed or not self.is_attached:
            return
        self._job = None
        self.refuse(sentence)

    def refuse(self, sentence: str) -> None:
        """Say why there is no answer; what leads to one is in the sentence."""
        self._blank("")
        if self.app.screen is self:
            self.kingpost.news("")
        self.query_one("#head", Line).show((f" {self.asked}", "head"))
        self.query_one("#top", Rule).title("no answer")
        rows = [Row("because", visible(sentence, 600))]
        self.table.show(Pairs(wrapped(rows, self.size.width or self.app.size.width)))

    def _progress(self, job: Job) -> None:
        progress = job.progress
        if progress is None or self.app.screen is not self:
            return
        amount = f" {progress.done:,}" if progress.done else ""
        amount += f" of {progress.total:,}" if progress.total else ""
        self.tell(f"{visible(progress.stage, 40)}{amount} {visible(progress.unit, 20)}".rstrip())

    # ---- showing it ---------------------------------------------------------------------------

    @property
    def page(self) -> Page | None:
        """The page shown."""
        return None if self.answer is None else self.answer.pages[self._at]

    def _turn(self, row: int = 0) -> None:
        answer, page = self.answer, self.page
        if answer is None or page is None:
            return
        self.set_class(page.draw is not None, "-chart")
        self.set_class(not answer.caution, "-harmless")
        self.set_class(page.listing is None, "-silent")
        self.query_one("#head", Line).show((f" {answer.head}", "head"))
        self.query_one("#pages", Line).show_by(self._page_pieces)
        self.query_one("#top", Rule).title(page.title)
        self._fill(row)

    def _fill(self, row: int) -> None:
        page = self.page
        if page is None:
            return
        if page.listing is None:
            self._rows = Pairs(wrapped(page.rows, self.size.width or self.app.size.width))
            self.table.headings(False)
            self.table.show(self._rows, row)
        else:
            page.listing.marks = self.kingpost.keeper.marks
            self.table.headings(any(column.title for column in page.listing.head))
            self.table.show(page.listing, row, empty=page.empty)
        self._describe()

    def _describe(self) -> None:
        """What is about the row under the cursor."""
        answer, page = self.answer, self.page
        if answer is None or page is None or not self.composed:
            return
        row, width = self.table.row, max((self.size.width or 80) - 2, 10)
        words = page.words(row) if page.listing is not None and page.listing.count else ""
        lines = wrap(words, width)
        if len(lines) > _LINES:
            lines = [*lines[: _LINES - 1], " ".join(lines[_LINES - 1 :])]
        self.query_one("#words", Line).show_rows([[(f" {line}", "plain")] for line in lines])
        caution = wrap(answer.caution, width)[:2]
        self.query_one("#caution", Line).show_rows([[(f" {line}", "strong")] for line in caution])
        draw = page.draw
        if draw is not None:
            self.query_one("#chart", Grid).show(
                lambda width, height, glyphs: draw(width, height, glyphs, row)
            )
        self.refresh_keys()

    def _page_pieces(self, width: int) -> list[Piece]:
        if self.answer is None:
            return []
        names = [page.name for page in self.answer.pages]
        if sum(cell_len(name) + 4 for name in names) > width:
            names = [names[self._at]]
        here = self.answer.pages[self._at].name
        pieces: list[Piece] = [(" ", "plain")]
        for name in names:
            shown = f"[{name}]" if name == here else f" {name} "
            pieces += [(shown, "strong" if name == here else "quiet"), (" ", "plain")]
        return pieces

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 18, "-low")
        self.set_class(event.size.height < 12, "-lowest")
        if self.composed and self.answer is not None:
            self.call_after_refresh(lambda: self._fill(self.table.row))

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self._describe()

    # ---- actions -----------------------------------------------------------------------------

    def node_at_hand(self) -> int | None:
        page = self.page
        if page is None or not self.table.count:
            return None
        if page.listing is None:
            return None if self._rows is None else self._rows.rows[self.table.row].node
        node = page.listing.node(self.table.row)
        return None if node == NOWHERE else node

    def row_at_hand(self) -> list[str]:
        page, row = self.page, self.table.row
        if page is None or page.listing is None or not page.listing.count:
            return []
        return [column.text(row) for column in page.listing.head]

    def marks_changed(self) -> None:
        if self.composed and self.page is not None and self.page.listing is not None:
            self.page.listing.marks = self.kingpost.keeper.marks
            self.table.refresh()

    def can_node_open(self) -> bool:
        return self.node_at_hand() is not None

    def do_node_open(self) -> None:
        node = self.node_at_hand()
        if node is not None:
            self.kingpost.walk_to(node)

    def can_other_table(self) -> bool:
        return self.answer is not None and len(self.answer.pages) > 1

    def do_other_table(self) -> None:
        if self.answer is not None:
            self._at = (self._at + 1) % len(self.answer.pages)
            self._turn()

    def do_step_back(self) -> None:
        if self._job is not None:
            self.kingpost.runner.cancel(self._job)
            self.kingpost.news("")
        self.app.pop_screen()
