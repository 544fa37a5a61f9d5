"""Standings: the ranking with its proof rail, and why the highlighted row stands where it does."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult
from textual.containers import Horizontal

from kingpost.core.insight.contributions import Contributions, contributions
from kingpost.core.text import visible
from kingpost.tui.models import detail, rowquery
from kingpost.tui.models.drawing import wrap
from kingpost.tui.models.node import MANY, centre
from kingpost.tui.models.standings import Arrangement, Found, Standings, search
from kingpost.tui.rooms import STANDINGS
from kingpost.tui.views.columns import ColumnsSheet
from kingpost.tui.views.nodepanel import NodePanel
from kingpost.tui.views.rows import RowsView
from kingpost.tui.views.sheets import Choice, ChoiceSheet, PromptSheet
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable
from kingpost.tui.widgets.spread import SpreadRule

BESIDE = 150  # columns from which the node view stands beside the table
LOW = 17  # lines below which only the table is shown
_SLOWER = 5  # times as long on a slow link
_REST = 0.06  # seconds the cursor rests before the lines below follow it


class StandingsView(RowsView):
    """The table of the current measure; everything else is reached from here."""

    CSS_PATH = "standings.tcss"
    view = STANDINGS

    def __init__(self, table: Standings) -> None:
        super().__init__()
        self.model = table
        self._detailed: tuple[int, int] | None = None
        self._timer: object | None = None

    def compose(self) -> ComposeResult:
        yield Line(id="graph")
        yield Line(id="terms")
        yield SpreadRule(id="top")
        with Horizontal(id="body"):
            yield RowTable(id="table")
            yield NodePanel(id="beside")
        yield Rule(id="below")
        yield Line(id="ruler")
        yield Line(id="supports")
        yield Rule(id="news")
        yield KeyLine(id="keys")

    @property
    def table(self) -> RowTable:
        """The widget."""
        return self.query_one("#table", RowTable)

    def opened(self) -> None:
        self.show(self.model)

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < LOW, "-low")
        self.set_class(event.size.height < 8, "-lowest")
        self.set_class(event.size.width >= BESIDE, "-wide")
        if self.composed and self.has_class("-wide"):
            self._detailed = None
            self._detail()

    def show(self, table: Standings) -> None:
        """Show a table, or the same one newly arranged."""
        self.model = table
        arranged = table.arrangement
        column = table.column(arranged.sort)
        rising = bool(column and column.high_first == arranged.turned)
        empty = "no row fulfils the condition; f changes it, Esc shows all rows"
        if not arranged.where:
            empty = "the graph has no nodes"
        self.table.show(table, table.cursor, sorted_by=(arranged.sort, rising), empty=empty)
        self._detailed = None
        self._show_lines()
        self._detail()
        self.refresh_keys()

    def _show_lines(self) -> None:
        model = self.model
        flow, within = self.kingpost.sitting.flow, self.kingpost.sitting.within
        self.query_one("#graph", Line).show_by(
            lambda width: detail.graph_line(model.graph, flow, model.count, width, within)
        )
        self.query_one("#terms", Line).show_by(
            lambda width: detail.terms_line(model.graph, model.result, width)
        )
        where = model.arrangement.where
        title = f"where {visible(where, 200)}" if where else ""
        self.query_one("#top", SpreadRule).show_spread(title, model.spread)

    def refreshed(self) -> None:
        if not self.composed:
            return
        self._detailed = None
        self._detail()
        self.refresh_keys()

    # ---- the highlighted row -----------------------------------------------------------------

    def on_row_table_moved(self, message: RowTable.Moved) -> None:
        if message.table.id != "table":
            return
        self.model.cursor = self.table.row
        # While a key is held down only the table moves; its lines follow once it rests.
        if self._timer is None:
            self._timer = self.set_timer(_REST * (_SLOWER if self.looks.slow else 1), self._rested)

    def _rested(self) -> None:
        self._timer = None
        self._detail()

    def _detail(self) -> None:
        if not self.composed or not self.is_attached:
            return
        node = self.model.node
        result = self.model.result
        glyphs = self.looks.glyphs
        self.query_one("#top", SpreadRule).mark(None if node is None else result.scores[node])
        ruler, supports = self.query_one("#ruler", Line), self.query_one("#supports", Line)
        if result.refusal is not None:
            sentence = detail.on_screen(result.refusal.sentence)
            ruler.show_by(lambda width: [(f" {wrap(sentence, width - 2)[0]}", "strong")])
            supports.show_by(
                lambda width: [(f" {' '.join(wrap(sentence, width - 2)[1:])}", "plain")]
            )
            return
        if node is None:
            ruler.show()
            supports.show()
            return
        if self._detailed == (node, id(result)):
            return
        self._detailed = (node, id(result))
        sitting = self.kingpost.sitting
        ruler.show_by(lambda width: detail.ruler_line(sitting, node, width, glyphs))
        graph = self.model.graph
        if self._degree(node) > MANY:
            supports.show((" held up by  ...", "plain"))
            self.kingpost.background(
                "detail",
                lambda job: contributions(graph, result, node),
                lambda given: self._supported(node, given),
            )
        else:
            self._supported(node, contributions(graph, result, node))
        if self.has_class("-wide"):
            panel = self.query_one("#beside", NodePanel)
            if self._degree(node) <= MANY:
                panel.show(self.kingpost.sitting, centre(graph, result, node, glyphs))

    def _degree(self, node: int) -> int:
        graph = self.model.graph
        return sum(
            int(side.offsets[node + 1] - side.offsets[node])
            for side in (graph.inward, graph.outward)
        )

    def _supported(self, node: int, given: Contributions) -> None:
        if node != self.model.node or not self.composed or not self.is_attached:
            return
        graph, glyphs = self.model.graph, self.looks.glyphs
        self.query_one("#supports", Line).show_by(
            lambda width: detail.supports_line(graph, given, width, glyphs)
        )

    def do(self, action_id: str) -> None:
        super().do(action_id)
        # The next key may come before the table has told where its cursor went.
        if self.composed:
            self.model.cursor = min(self.table.row, max(self.model.count - 1, 0))

    def catch_up(self) -> None:
        """Let the model know where the cursor is: keys typed fast overtake the news of it."""
        if self.composed:
            self.model.cursor = self.table.row

    def possible(self, action_id: str) -> bool:
        self.catch_up()
        return super().possible(action_id)

    def node_at_hand(self) -> int | None:
        return self.model.node

    def row_at_hand(self) -> list[str]:
        return [] if self.model.node is None else self.cells_of(self.model.node)

    def cells_of(self, node: int) -> list[str]:
        """What the table shows, or would show, of a node."""
        return [column.text(node) for column in self.model.head]

    def marks_changed(self) -> None:
        if self.composed:
            self.table.repaint()

    # ---- looking and investigating -------------------------------------------------------------

    def can_node_open(self) -> bool:
        return self.model.node is not None and self.model.result.refusal is None

    def do_node_open(self) -> None:
        node = self.model.node
        if node is not None:
            self.kingpost.open_node(node)

    def do_rows_sort(self) -> None:
        arranged = self.model.arrangement
        choices = [
            Choice(column.key, column.title, self._sort_words(column.key))
            for column in self.model.head
            if column.keys is not None
        ]
        self.app.push_screen(ChoiceSheet("sort by", choices, arranged.sort), self._sort)

    def _sort_words(self, key: str) -> str:
        column = self.model.column(key)
        arranged = self.model.arrangement
        falling = bool(column and column.high_first)
        if key == arranged.sort:
            falling = falling == arranged.turned
            return "turns the order round: " + ("highest first" if falling else "lowest first")
        return "highest first" if falling else "lowest first"

    def _sort(self, key: str | None) -> None:
        if key is None:
            return
        arranged = self.model.arrangement
        turned = not arranged.turned if key == arranged.sort else False
        self.kingpost.desk.arrange(sort=key, turned=turned)

    def do_rows_filter(self) -> None:
        self._ask_filter(self.model.arrangement.where, "")

    def _ask_filter(self, text: str, wrong: str) -> None:
        model = self.model
        known = rowquery.columns(model.graph, model.result, model.others)
        hint = f"SQL over {', '.join(visible(name, 30) for name in known)}"
        hint += "" if wrong else "; empty for all rows; e.g. rank <= 20 and node like 'a%'"
        self.app.push_screen(PromptSheet("rows where", text, hint=hint, wrong=wrong), self._filter)

    def _filter(self, text: str | None) -> None:
        text = None if text is None else text.strip()
        if text is not None and text != self.model.arrangement.where:
            self.kingpost.desk.arrange(lambda wrong: self._refiltered(text, wrong), where=text)

    def _refiltered(self, text: str, wrong: str) -> None:
        """A condition that cannot be used comes back, with what is wrong, to be mended."""
        if self.app.screen is self:
            self._ask_filter(text, wrong)
        else:
            self.kingpost.news(wrong, "bad")

    def do_columns_choose(self) -> None:
        self.app.push_screen(ColumnsSheet())

    def do_find_ask(self) -> None:
        found = self.model.found
        self.app.push_screen(PromptSheet("find", found.text if found else ""), self.find)

    def find(self, text: str | None) -> None:
        """Find the rows whose name contains a text."""
        if not text:
            return
        model, arranged = self.model, self.model.arrangement
        self.kingpost.background(
            "find",
            lambda job: search(model, arranged, text),
            lambda found: self._searched(found, model, arranged),
            words="finding",
        )

    def _searched(self, found: Found, model: Standings, arranged: Arrangement) -> None:
        if model is not self.model or arranged is not model.arrangement:
            # Another table, or another order, has come meanwhile: what was typed counts there too.
            self.find(found.text)
            return
        model.found = found
        self.table.refresh()
        shown = visible(found.text, 40)
        if len(found.rows) == 0:
            self.kingpost.news(f"no name contains {shown!r}", "bad")
            return
        row = self.table.row
        self._to(row if found.holds(row) else found.after(row))
        self.refresh_keys()

    def can_find_next(self) -> bool:
        return self.model.found is not None and len(self.model.found.rows) > 0

    can_find_before = can_find_next

    def do_find_next(self) -> None:
        if self.model.found:
            self._to(self.model.found.after(self.table.row))

    def do_find_before(self) -> None:
        if self.model.found:
            self._to(self.model.found.before(self.table.row))

    def _to(self, row: int | None) -> None:
        if row is None or self.model.found is None:
            return
        self.table.go(row)
        found = self.model.found
        words = (
            f"{found.place(row):,} of {len(found.rows):,} names with {visible(found.text, 40)!r}"
        )
        self.kingpost.news(words)

    def can_step_back(self) -> bool:
        where, found = self.model.arrangement.where, self.model.found
        return bool(self.kingpost.latest_news[0] or where or found or self.kingpost.within.depth)

    def do_step_back(self) -> None:
        if self.kingpost.latest_news[0] and not self.kingpost.solving:
            self.kingpost.news("")
        elif self.model.found is not None:
            self.model.found = None
            self.table.refresh()
        elif self.model.arrangement.where:
            self.kingpost.desk.arrange(where="")
        elif self.kingpost.within.depth:
            self.kingpost.within.leave()
