"""Shortlist: the nodes marked, with their ranks side by side and the notes written on them."""

from __future__ import annotations

import os
from collections.abc import Sequence

from rich.cells import cell_len
from textual import events
from textual.app import ComposeResult

from kingpost.core.standing import UNRANKED
from kingpost.core.text import count, visible
from kingpost.tui.models import marks as model
from kingpost.tui.models.columns import Column
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.marks import Mark, Marks
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.rooms import SHORTLIST
from kingpost.tui.views.rows import RowsView
from kingpost.tui.views.sheets import Choice, ChoiceSheet, PromptSheet
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable

LOW = 14
_NAME, _NOTE = 48, 120


class Rows:
    """The marks as they were on opening, as a source for the row-window table.

    One that is taken off stays until the view is closed, so that it can be put back.
    """

    def __init__(self, marks: Marks, sitting: Sitting) -> None:
        self._marks = marks
        self.listed: list[Mark] = list(marks)
        self._sitting = sitting
        names = [cell_len(tame(visible(mark.name, _NAME))) for mark in self.listed[:400]]
        longest = max(names, default=4)
        self.head = [
            Column(
                "node",
                "node",
                min(max(longest, 6), 24),
                lambda at: visible(self.listed[at].name, 4 * _NAME),
                frozen=True,
                stretch=min(max(longest, 6), _NAME),
            ),
            *(self._ranks(name) for name in sitting.measures_shown()),
            Column("note", "note", 30, lambda at: visible(self.listed[at].note, _NOTE)),
        ]

    def _ranks(self, measure: str) -> Column:
        width = min(2 * len(f"{self._sitting.graph.n:,}") + 1, 11)

        def text(at: int) -> str:
            return model.rank_texts(self.listed[at], self._sitting).get(measure, "-")

        title = measure if len(measure) <= max(width, 6) else measure[:5]
        return Column(f"rank:{measure}", title, max(len(title), width), text, right=True)

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.listed)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """No rail: neighbours in this list are no neighbours in the standings."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is found here."""
        return False

    def kept(self, row: int) -> bool:
        """Whether the mark is still on the list."""
        return self._marks.holds(self.listed[row])


class ShortlistView(RowsView):
    """The marks of this graph; Enter opens a node, Escape goes back."""

    CSS_PATH = "shortlist.tcss"
    view = SHORTLIST

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="below")
        yield Line(id="note")
        yield Rule(id="news")
        yield KeyLine(id="keys")

    @property
    def marks(self) -> Marks:
        """The marks of the sitting."""
        return self.kingpost.keeper.marks

    def opened(self) -> None:
        self._rows = Rows(self.marks, self.kingpost.sitting)
        at = self.kingpost.standings.node_at_hand()
        nodes = [mark.node for mark in self._rows.listed]
        self.table.show(
            self._rows,
            nodes.index(at) if at in nodes and at is not None else 0,
            empty="no node is marked yet; Esc goes back, x there marks the row's node",
        )
        self._describe()

    def refreshed(self) -> None:
        if self.composed:
            listed = self._rows.listed
            self._rows = Rows(self.marks, self.kingpost.sitting)
            self._rows.listed = listed
            self.table.show(self._rows, self.table.row)

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < LOW, "-low")

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self._describe()

    def _describe(self) -> None:
        name = visible(self.kingpost.sitting.graph.origin.name, 40)
        marked = f"   {count(len(self.marks), 'node')} marked"
        self.query_one("#head", Line).show((f" {name}", "head"), (marked, "plain"))
        mark = self.mark
        line = self.query_one("#note", Line)
        if mark is None:
            line.show()
            return
        off = "" if self.marks.holds(mark) else "taken off; x puts it back   "
        gone = "" if mark.node is not None else "this graph has no such node   "
        note = visible(mark.note, 400) or "no note; i writes one"
        line.show((f" {visible(mark.name, 24)}", "strong"), (f"   {off}{gone}{note}", "plain"))

    @property
    def mark(self) -> Mark | None:
        """The mark under the cursor."""
        at = self.table.item()
        return None if at is None else self._rows.listed[at]

    def node_at_hand(self) -> int | None:
        mark = self.mark if self.composed else None
        return None if mark is None else mark.node

    def row_at_hand(self) -> list[str]:
        at = self.table.item()
        return [] if at is None else [column.text(at) for column in self._rows.head]

    def marks_changed(self) -> None:
        if self.composed:
            self.table.refresh()
            self._describe()

    def do_step_back(self) -> None:
        self.app.pop_screen()

    # ---- what is done with a mark --------------------------------------------------------------

    def can_mark_toggle(self) -> bool:
        return self.mark is not None

    can_note_write = can_shortlist_write = can_mark_toggle

    def can_node_open(self) -> bool:
        result = self.kingpost.sitting.result
        return self.node_at_hand() is not None and result is not None and result.refusal is None

    def do_node_open(self) -> None:
        node = self.node_at_hand()
        if node is not None:
            self.kingpost.open_node(node)

    def can_shortlist_jump(self) -> bool:
        return self.node_at_hand() is not None

    def do_shortlist_jump(self) -> None:
        node = self.node_at_hand()
        if node is None:
            return
        if self.kingpost.standings.model.row_of(node) is None:
            self.kingpost.news("the filter of the standings hides it; f there changes it", "bad")
            return
        # The shortlist may have been opened from a view above the standings.
        while self.app.screen is not self.kingpost.standings:
            self.app.pop_screen()
        self.kingpost.jump_to(node)

    def do_mark_toggle(self) -> None:
        mark = self.mark
        if mark is not None:
            self.kingpost.keeper.take_off(mark)

    def do_note_write(self) -> None:
        mark = self.mark
        if mark is not None:
            name = visible(mark.name, 40)
            self.kingpost.keeper.ask_note(name, mark.note, node=mark.node, mark=mark)

    def do_shortlist_write(self) -> None:
        origin = self.kingpost.sitting.graph.origin.name.split(" +")[0]
        stem = "".join(c for c in os.path.splitext(origin)[0] if c.isprintable() and c != "/")
        sheet = PromptSheet("write to", f"{stem[:60] or 'graph'}_shortlist.csv")
        self.app.push_screen(sheet, self._named)

    def _named(self, words: str | None) -> None:
        path = os.path.expanduser((words or "").strip())
        if not path:
            return
        if not os.path.lexists(path):
            self._write(path)
            return
        choices = [
            Choice("keep", "keep the old file", "w asks for another name"),
            Choice("replace", "replace it", "what it held is lost"),
        ]
        sheet = ChoiceSheet(f"{visible(path, 50)} exists", choices)
        self.app.push_screen(
            sheet, lambda chosen: self._write(path) if chosen == "replace" else None
        )

    def _write(self, path: str) -> None:
        listed: Sequence[Mark] = [mark for mark in self._rows.listed if self.marks.holds(mark)]
        sitting = self.kingpost.sitting

        def work(job: object) -> int:
            from kingpost.core.export.files import check_target, replacing

            check_target(path)
            with replacing(path) as sink:
                sink.write(model.csv_table(listed, sitting))
            return len(listed)

        self.kingpost.background(
            "write",
            work,
            lambda rows: self.kingpost.news(f"wrote {count(rows, 'row')} to {visible(path, 60)}"),
            words="writing the shortlist",
        )
