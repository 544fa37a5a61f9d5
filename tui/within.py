"""Going into a part of the graph: a desk of its own over the induced subgraph, and back again.

Marks go along by name: those of nodes inside stay marks there, and marks made inside are marks
outside.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from kingpost.core.text import visible
from kingpost.tui.views.loading import LoadingView
from kingpost.tui.widgets.lines import Line

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.tui.app import KingpostApp
    from kingpost.tui.desk import Desk
    from kingpost.tui.jobs import Job
    from kingpost.tui.models.marks import Marks


class EnteringView(LoadingView):
    """How the part is solved, until its standings are there."""

    CSS_PATH = "views/loading.tcss"

    def __init__(self, name: str, part: Graph) -> None:
        super().__init__([f"{name} of {visible(part.origin.name, 60)}"])
        self._words = f"{part.n:,} nodes, {part.m:,} edges: ranking inside it"

    def opened(self) -> None:
        super().opened()
        self.query_one("#stages", Line).show((f" {self._words}", "plain"))

    def do_step_back(self) -> None:
        self.kingpost.within.leave()


@dataclass
class _Outer:
    """What one comes back to: the desk, which of its nodes the part's nodes are, its marks."""

    desk: Desk
    nodes: Any
    marked: dict[str, int | None]  # name -> node of the marks there were


class Within:
    """The way in and out; ``depth`` says how many parts deep one is."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app
        self._outer: list[_Outer] = []

    @property
    def depth(self) -> int:
        """0 for the graph that was loaded."""
        return len(self._outer)

    @property
    def home(self) -> Desk:
        """The desk over the graph that was loaded."""
        return self._outer[0].desk if self._outer else self._app.desk

    def enter(self, members: Callable[[Job], Any], words: str) -> None:
        """Go into the nodes that ``members(job)`` gives, called ``words``."""
        outer = self._app.desk
        graph, marks = outer.sitting.graph, list(self._app.keeper.marks)

        def work(job: Job) -> tuple[Graph, Any, Marks]:
            from kingpost.core.subgraph import induced
            from kingpost.tui.models.marks import locate

            nodes = members(job)
            part = induced(graph, nodes, job.watch)
            return part, nodes, locate(part, [dataclasses.replace(mark) for mark in marks])

        def made(found: tuple[Graph, Any, Marks]) -> None:
            if self._app.desk is outer:
                self._entered(outer, found, words)

        self._app.news(f"cutting out {words}")
        self._app.background("within", work, made, words=f"cutting out {words}")

    def _entered(self, outer: Desk, found: tuple[Graph, Any, Marks], words: str) -> None:
        from kingpost.tui.desk import Desk

        part, nodes, marks = found
        before = outer.sitting
        name = f"{before.within}, {words}" if before.within else words
        sitting = dataclasses.replace(
            before,
            graph=part,
            settings={},
            results={},
            solves=[],
            formats={},
            makeup={},
            within=name,
        )
        settings = _portable(before.settings_of(before.current))
        marked = {mark.name: mark.node for mark in self._app.keeper.marks}
        self._outer.append(_Outer(outer, nodes, marked))
        outer.away = True
        self._app.seat(Desk(self._app.runner, sitting, self._app), marks)
        self._app.push_screen(EnteringView(name, part))
        self._app.desk.solve(before.current, settings)

    def leave(self) -> None:
        """Back to the graph one came from."""
        from kingpost.tui.models.marks import Marks

        outer = self._outer.pop()
        for job in self._app.runner.jobs("solve"):
            if job.facts.get("desk") is self._app.desk:
                self._app.runner.cancel(job)
        self._app.desk.away = True
        marks = []
        for mark in self._app.keeper.marks:
            # A mark made inside is of a node inside; any other was known before.
            inside = None if mark.node is None else int(outer.nodes[mark.node])
            node = outer.marked.get(mark.name) if inside is None else inside
            marks.append(dataclasses.replace(mark, node=node))
        self._app.seat(outer.desk, Marks(marks))
        self._app.pop_screen()
        outer.desk.resume()

    def forget(self) -> None:
        """Another table is opened: nothing is left to come back to."""
        for outer in self._outer:
            outer.desk.close()
        self._outer = []

    def no_start(self, sentence: str) -> None:
        """The first solve inside failed: back, with the reason."""
        self.leave()
        self._app.notice("this part cannot be ranked", sentence)


def _portable(settings: Any) -> Any:
    """The settings without what names nodes, which need not be inside."""
    plain = type(settings)()
    changes = {}
    for item in dataclasses.fields(settings):
        value = getattr(settings, item.name)
        named = item.name in ("component", "teleport", "beta") and isinstance(value, str)
        if named or isinstance(value, (dict, list, tuple)):
            changes[item.name] = getattr(plain, item.name)
    return dataclasses.replace(settings, **changes)
