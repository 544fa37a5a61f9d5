"""Plate: everything known of a node, and its neighbourhood drawn in characters."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult

from kingpost.tui.models.drawing import tame
from kingpost.tui.models.plate import Plate, plate
from kingpost.tui.rooms import PLATE
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable


class PlateView(RowsView):
    """Rows to read; Enter on a neighbour of the drawing goes there."""

    CSS_PATH = "way.tcss"
    view = PLATE

    def __init__(self, node: int) -> None:
        super().__init__()
        self._node = node
        self._plate: Plate | None = None
        self._made_for = 0

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False, headings=False)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        name = tame(self.kingpost.sitting.graph.name(self._node, 200), self.looks.glyphs)
        self.query_one("#head", Line).show((f" {name}", "head"))
        self._make()

    def on_resize(self, event: events.Resize) -> None:
        if self.composed and event.size.width != self._made_for:
            self._make()

    def refreshed(self) -> None:
        if self.composed and self.is_attached:
            self._make()

    def _make(self) -> None:
        sitting, glyphs = self.kingpost.sitting, self.looks.glyphs
        result = sitting.result
        if result is None:
            return
        width = self._made_for = self.size.width or self.app.size.width
        graph, node = sitting.graph, self._node
        shown = [result, *sitting.others()]
        results = [
            (sitting.measure(name).letter, found)
            for name in sitting.names
            if (found := sitting.results.get(name)) is not None
            and any(found is one for one in shown)
        ]
        self.kingpost.background(
            "plate",
            lambda job: plate(graph, result, results, node, width, glyphs, job.watch),
            self._show,
            words="drawing the neighbourhood",
        )

    def _show(self, found: Plate) -> None:
        if not self.composed or not self.is_attached:
            return
        self._plate = found
        self.table.show(found, self.table.row)
        self.refresh_keys()

    def node_at_hand(self) -> int | None:
        if self._plate is None or not self._plate.count:
            return None
        return self._plate.rows[min(self.table.row, self._plate.count - 1)].node

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self.refresh_keys()

    def can_node_open(self) -> bool:
        return self.node_at_hand() is not None

    def do_node_open(self) -> None:
        node = self.node_at_hand()
        if node is not None:
            self.kingpost.walk_to(node)
