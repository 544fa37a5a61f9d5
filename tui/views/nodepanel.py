"""The load path of one node: what gives score to it above, the node, what it gives to below."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.widget import Widget

from kingpost.tui.models import detail
from kingpost.tui.models.drawing import fit, ruler, tame
from kingpost.tui.models.node import NodeModel
from kingpost.tui.models.numbers import rank_range, score_format
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.widgets.lines import Line, Rule, looks_of
from kingpost.tui.widgets.rowtable import RowTable


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

    def compose(self) -> ComposeResult:
        yield Line(id="who")
        yield Line(id="what")
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

    def show(self, sitting: Sitting, model: NodeModel, came_by: str = "") -> None:
        """Put a node at the centre."""
        self.model = model
        glyphs = looks_of(self).glyphs
        self.feeders.show(model.feeders, 0, empty="nothing gives score to it")
        self.receivers.show(model.receivers, 0, empty="it gives score to nothing")
        self.query_one("#centre", Rule).title(f"{glyphs.down} {tame(model.name, glyphs)}")
        if self._cursor:
            self.activate(self.feeders if model.feeders.count else self.receivers)
        self.relabel(sitting, came_by)

    def relabel(self, sitting: Sitting, came_by: str = "") -> None:
        """Write the two lines about the node for the present width."""
        model = self.model
        assert model is not None
        width = self.size.width or 80
        glyphs = looks_of(self).glyphs
        result = sitting.result
        about = "   ".join(f"{name} {value}" for name, value in model.attributes if value)
        way = f"came by: {came_by}" if came_by else ""
        room = max(width - len(way) - 3, 8)
        name = fit(model.name, min(len(model.name), max(room // 2, 8)), glyphs=glyphs)
        left = fit(f"   {tame(about, glyphs)}", max(room - len(name), 0), glyphs=glyphs)
        self.query_one("#who", Line).show((f" {name}", "head"), (left, "plain"), (f" {way}", "quiet"))
        if result is None or result.refusal is not None:
            self.query_one("#what", Line).show()
            return
        score = score_format(result.scores, result.bound)
        first, last = result.standing.range_of(model.node)
        text = f" {result.measure} {score.text(float(result.scores[model.node]))}{score.unit}"
        text += f" ({rank_range(first, last)})   {detail.parts_words(model.given)}"
        ranks = {letter: low for letter, (_, low, _) in sitting.ranks(model.node).items()}
        end = f" {sitting.graph.n:,}"
        track = width - len(text) - len(end) - 7
        pieces: list[tuple[str, str]] = [(text, "plain")]
        if track >= 8:
            pieces.append(("   1 ", "plain"))
            pieces += detail.track_pieces(ruler(ranks, sitting.graph.n, track, glyphs), glyphs)
            pieces.append((end, "plain"))
        self.query_one("#what", Line).show(*pieces)

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
