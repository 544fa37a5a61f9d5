"""Way: the shortest way between two nodes, node by node; Enter goes to one of them."""

from __future__ import annotations

from rich.cells import cell_len
from textual import events
from textual.app import ComposeResult

from kingpost.core.insight.way import Way
from kingpost.tui.jobs import Job
from kingpost.tui.models import detail
from kingpost.tui.models.drawing import fit, tame
from kingpost.tui.models.ways import Steps, course_words, ways
from kingpost.tui.rooms import WAY
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable


class WayView(RowsView):
    """Searches on opening, away from the screen; leaving ends the search."""

    CSS_PATH = "way.tcss"
    view = WAY

    def __init__(self, start: int, goal: int) -> None:
        super().__init__()
        self._start, self._goal = start, goal
        self._ways: list[Way] = []
        self._at = 0
        self._job: Job | None = None

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="below")
        yield Line(id="ruler")
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        graph, glyphs = self.kingpost.sitting.graph, self.looks.glyphs
        names = [tame(graph.name(node, 120), glyphs) for node in (self._start, self._goal)]

        def line(width: int) -> list[tuple[str, str]]:
            room = max((width - 18) // 2, 6)
            ends = [fit(name, min(cell_len(name), room), glyphs=glyphs).rstrip() for name in names]
            return [
                (" way from ", "plain"), (ends[0], "head"), (" to ", "plain"), (ends[1], "head"),
            ]  # fmt: skip

        self.query_one("#head", Line).show_by(line)
        self.tell("searching the shortest way; Esc ends the search")
        self._job = self.kingpost.background(
            "way",
            lambda job: ways(graph, self._start, self._goal, job.watch),
            self._found_ways,
            words="searching the way",
        )

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 12, "-low")

    def _found_ways(self, found: list[Way]) -> None:
        if not self.composed or not self.is_attached:
            return
        self._ways, self._at, self._job = found, 0, None
        self.kingpost.news("")
        self._show()

    def _show(self) -> None:
        sitting = self.kingpost.sitting
        result = sitting.result
        if not self._ways or result is None:
            self.query_one("#top", Rule).title("no way leads from one to the other")
            self.tell("they lie in different weak components; Esc goes back", "bad")
            return
        directed = sitting.graph.directed
        way = self._ways[self._at]
        title = course_words(way, directed)
        for other in self._ways:
            if other is not way:
                title += f"   (Tab: {course_words(other, directed)})"
        if len(self._ways) == 1 and directed and way.course != "either":
            title += f"   (none {'against' if way.course == 'along' else 'along'} them)"
        if way.course == "either":
            title += "   (none along or against them alone)"
        self.query_one("#top", Rule).title(title)
        self.table.show(Steps(sitting.graph, result, way, self.looks.glyphs), 0)
        self._ruler()
        self.refresh_keys()

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        self._ruler()

    def _ruler(self) -> None:
        node = self.node_at_hand()
        if node is not None:
            sitting, glyphs = self.kingpost.sitting, self.looks.glyphs
            self.query_one("#ruler", Line).show_by(
                lambda width: detail.ruler_line(sitting, node, width, glyphs)
            )

    def node_at_hand(self) -> int | None:
        if not self._ways:
            return None
        nodes = self._ways[self._at].nodes
        return nodes[min(self.table.row, len(nodes) - 1)]

    # ---- actions -----------------------------------------------------------------------------

    def can_other_table(self) -> bool:
        return len(self._ways) > 1

    def do_other_table(self) -> None:
        self._at = (self._at + 1) % len(self._ways)
        self._show()

    def can_node_open(self) -> bool:
        return self.node_at_hand() is not None

    def do_node_open(self) -> None:
        node = self.node_at_hand()
        if node is not None:
            self.kingpost.walk_to(node)

    def do_step_back(self) -> None:
        if self._job is not None:
            self.kingpost.runner.cancel(self._job)
            self.kingpost.news("")
        self.app.pop_screen()
