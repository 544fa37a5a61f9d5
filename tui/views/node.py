"""Node: walking the load path, neighbour by neighbour, and back the way one came."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult

from kingpost.tui.models.drawing import fit, tame
from kingpost.tui.models.node import MANY, NodeModel, Trail, centre
from kingpost.tui.rooms import NODE
from kingpost.tui.views.base import View
from kingpost.tui.views.nodepanel import NodePanel
from kingpost.tui.widgets.lines import KeyLine, Rule

_WAY = 3  # names of the way come that are shown


class NodeView(View):
    """One node at the centre; Enter walks on to the highlighted neighbour."""

    CSS_PATH = "node.tcss"
    view = NODE

    def __init__(self, node: int) -> None:
        super().__init__()
        self.trail = Trail()
        self.trail.walk(node)
        self._shown = (-1, 0)  # the node and the result at the centre

    def compose(self) -> ComposeResult:
        yield NodePanel(id="panel", cursor=True)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    @property
    def panel(self) -> NodePanel:
        """The widget."""
        return self.query_one("#panel", NodePanel)

    def opened(self) -> None:
        self._centre(self.trail.nodes[self.trail.at])

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 14, "-low")

    def refreshed(self) -> None:
        if not self.composed:
            return
        node, result = self.trail.nodes[self.trail.at], self.kingpost.sitting.result
        if self._shown == (node, id(result)):
            self.panel.describe(self.kingpost.sitting, self._way())
        else:
            self._centre(node)

    def _centre(self, node: int) -> None:
        sitting, glyphs = self.kingpost.sitting, self.looks.glyphs
        graph, result = sitting.graph, sitting.result
        if result is None:
            return
        degree = sum(
            int(side.offsets[node + 1] - side.offsets[node])
            for side in (graph.inward, graph.outward)
        )
        if degree <= MANY:
            self._show(centre(graph, result, node, glyphs))
            return
        self.tell(f"sorting {degree:,} neighbours")
        self.kingpost.background(
            "node",
            lambda job: centre(graph, result, node, glyphs),
            self._show,
            words="sorting the neighbours",
        )

    def _show(self, model: NodeModel) -> None:
        if not self.composed or not self.is_attached:
            return
        self._shown = (model.node, id(self.kingpost.sitting.result))
        marks = self.kingpost.keeper.marks
        model.feeders.marks = model.receivers.marks = self.panel.marks = marks
        self.panel.show(self.kingpost.sitting, model, self._way())
        self.refresh_keys()
        self.tell(*self.kingpost.latest_news)

    def _way(self) -> str:
        graph, glyphs = self.kingpost.sitting.graph, self.looks.glyphs
        names = [tame(graph.name(node, 24), glyphs) for node in self.trail.before[-_WAY:]]
        names = [fit(name, 16, glyphs=glyphs).rstrip() for name in names]
        if len(self.trail.before) > _WAY:
            names.insert(0, glyphs.ellipsis)
        words = [f"came by: {f' {glyphs.way} '.join(names)}"] if names else []
        ahead = self.trail.ahead
        if ahead is not None:
            name = tame(graph.name(ahead, 24), glyphs)
            words.append(f"forth: {fit(name, 16, glyphs=glyphs).rstrip()}")
        return "   ".join(words)

    def node_at_hand(self) -> int | None:
        return self.trail.nodes[self.trail.at]

    def row_at_hand(self) -> list[str]:
        return self.kingpost.standings.cells_of(self.trail.nodes[self.trail.at])

    def marks_changed(self) -> None:
        if self.composed:
            self.panel.describe(self.kingpost.sitting, self._way())

    # ---- actions -----------------------------------------------------------------------------

    def do_row_up(self) -> None:
        self.panel.move(-1)

    def do_row_down(self) -> None:
        self.panel.move(1)

    def do_page_ahead(self) -> None:
        self.panel.active.page(1)

    def do_page_return(self) -> None:
        self.panel.active.page(-1)

    def do_row_first(self) -> None:
        self.panel.active.go(0)

    def do_row_last(self) -> None:
        self.panel.active.go(self.panel.active.count - 1)

    def do_columns_left(self) -> None:
        self.panel.active.sideways(-1)

    def do_columns_right(self) -> None:
        self.panel.active.sideways(1)

    def do_other_table(self) -> None:
        self.panel.switch()

    def can_node_open(self) -> bool:
        return self.panel.neighbour() is not None

    def do_node_open(self) -> None:
        node = self.panel.neighbour()
        if node is not None:
            self.walk(node)

    def walk(self, node: int) -> None:
        """Make a node the centre; the way walked so far grows by it."""
        self.trail.walk(node)
        self._centre(node)

    def can_walk_back(self) -> bool:
        return self.trail.at > 0

    def do_walk_back(self) -> None:
        node = self.trail.back()
        if node is not None:
            self._centre(node)

    def can_walk_on(self) -> bool:
        return self.trail.at + 1 < len(self.trail.nodes)

    def do_walk_on(self) -> None:
        node = self.trail.on()
        if node is not None:
            self._centre(node)

    def do_step_back(self) -> None:
        self.kingpost.close_node(self.trail.nodes[self.trail.at])
