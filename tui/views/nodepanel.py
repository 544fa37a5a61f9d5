"""The load path of one node: what gives score to it above, the node, what it gives to below."""

from __future__ import annotations

from typing import TYPE_CHECKING

from textual.app import ComposeResult
from textual.widget import Widget

from kingpost.core.text import visible
from kingpost.tui.models import detail
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.node import NodeModel
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.widgets.lines import Line, Rule, looks_of
from kingpost.tui.widgets.rowtable import RowTable

if TYPE_CHECKING:
    from kingpost.tui.models.marks import Marks


class NodePanel(Widget):
    """Two tables of neighbours around a node.  One cursor moves through both."""

    DEFAULT_CSS = """
    NodePanel { layout: vertical; height: 1fr; background: ansi_default; color: ansi_default; }
    NodePanel #feeders { height: 3fr; }
    NodePanel #receivers { height: 2fr; }
    """

    def __init__(self, id: str | None = None, *, cursor: bool = False) -> None:
        super().__init__(id=id)
        self._cursor = cursor
        self.model: NodeModel | None = None
        self.marks: Marks | None = None  # of the sitting, where there are any

    def compose(self) -> ComposeResult:
        yield Line(id="who")
        yield Line(id="what")
        if self._cursor:
            yield Line(id="ranks")
        yield RowTable(id="feeders", rail=False, active=self._cursor)
        yield Rule(id="centre")
        yield RowTable(id="receivers", rail=False, active=False)

    @property
    def feeders(self) -> RowTable:
        """The upper table."""
        return self.query_one("#feeders", RowTable)

    @property
    def receivers(self) -> RowTable:
        """The lower table."""
        return self.query_one("#receivers", RowTable)

    @property
    def active(self) -> RowTable:
        """The table that has the cursor."""
        return self.receivers if self.receivers.active else self.feeders

    def show(self, sitting: Sitting, model: NodeModel, way: str = "") -> None:
        """Put a node at the centre."""
        self.model = model
        self.feeders.show(model.feeders, 0, empty="nothing gives score to it")
        self.receivers.show(model.receivers, 0, empty="it gives score to nothing")
        if self._cursor:
            self.activate(self.feeders if model.feeders.count else self.receivers)
        self.describe(sitting, way)

    def describe(self, sitting: Sitting, way: str) -> None:
        """Write the lines about the node; the tables and the cursor stay."""
        model, glyphs = self.model, looks_of(self).glyphs
        assert model is not None
        result = sitting.result
        title = f"{glyphs.down} {tame(model.name, glyphs)}"
        mark = None if self.marks is None else self.marks.of(model.node)
        if mark is not None:
            title += f" {glyphs.mark} {tame(visible(mark.note, 120), glyphs)}".rstrip()
        self.query_one("#centre", Rule).title(title)
        self.query_one("#who", Line).show_by(
            lambda width: detail.who_line(model, way, width, glyphs)
        )
        if result is None or result.refusal is not None:
            self.query_one("#what", Line).show()
            return
        for ranks in self.query("#ranks").results(Line):
            ranks.show_by(lambda width: detail.ranks_line(sitting, model.node, width, glyphs))
        score = sitting.format_of(result)
        self.query_one("#what", Line).show_by(
            lambda width: detail.what_line(sitting, result, model, score, width, glyphs)
        )

    def activate(self, table: RowTable) -> None:
        """Give one of the tables the cursor."""
        for one in (self.feeders, self.receivers):
            one.activate(one is table)

    def switch(self) -> None:
        """Give the cursor to the other table, if it has rows."""
        other = self.feeders if self.receivers.active else self.receivers
        if other.count:
            self.activate(other)

    def move(self, rows: int) -> None:
        """Up is upstream, down is downstream: the cursor goes from one table into the other."""
        table = self.active
        if table.move(rows):
            return
        if rows > 0 and table is self.feeders and self.receivers.count:
            self.activate(self.receivers)
            self.receivers.go(0)
        elif rows < 0 and table is self.receivers and self.feeders.count:
            self.activate(self.feeders)

    def neighbour(self) -> int | None:
        """The node under the cursor."""
        if self.model is None:
            return None
        table = self.active
        side = self.model.receivers if table is self.receivers else self.model.feeders
        return side.node(table.row) if side.count else None
