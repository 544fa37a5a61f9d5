"""Going further from the node at hand in any view: the way to another node, its plate.

A helper of the application (see ``View.possible``): its ``do_`` methods carry out actions.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from kingpost.core.text import visible

if TYPE_CHECKING:
    from kingpost.tui.app import KingpostApp
    from kingpost.tui.models.marks import Mark
    from kingpost.tui.models.ways import Target

_MOST_MARKS = 200
_BY_NAME = "by name"


class Routes:
    """Ways and plates."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app

    def _node(self) -> int | None:
        view = self._app.view
        return None if view is None else view.node_at_hand()

    def can_node_plate(self) -> bool:
        """Whether there is a node to say everything of."""
        return self._node() is not None

    def do_node_plate(self) -> None:
        """Open the plate of the node at hand."""
        from kingpost.tui.views.plate import PlateView

        node = self._node()
        if node is not None:
            self._app.push_screen(PlateView(node))

    can_way_find = can_node_plate

    def do_way_find(self) -> None:
        """Ask whereto, first among the marked nodes."""
        start = self._node()
        if start is not None:
            self.choose(start, "shortest way to", lambda goal: self._open(start, goal))

    def choose(self, start: int, title: str, then: Callable[[int], None]) -> None:
        """Ask for another node than ``start``, marked or named; ``then`` is told which."""
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        def go(goal: int) -> None:
            if goal == start:
                self._app.news("it is that node already; choose another", "bad")
            else:
                then(goal)

        marked: list[Mark] = [
            mark for mark in self._app.keeper.marks if mark.node is not None and mark.node != start
        ]
        if not marked:
            self._ask_name(title, go, "", "")
            return
        choices = [Choice(_BY_NAME, "another node, by its name")]
        choices += [
            Choice(str(mark.node), visible(mark.name, 60), visible(mark.note, 80))
            for mark in marked[:_MOST_MARKS]
        ]

        def chosen(key: str | None) -> None:
            if key == _BY_NAME:
                self._ask_name(title, go, "", "")
            elif key is not None:
                go(int(key))

        self._app.push_screen(ChoiceSheet(title, choices, str(marked[0].node)), chosen)

    def _ask_name(self, title: str, then: Callable[[int], None], text: str, wrong: str) -> None:
        from kingpost.tui.views.sheets import PromptSheet

        def named(answer: str | None) -> None:
            if answer:
                self._search(title, then, answer)

        hint = "a name, or a part of one; marked nodes are offered here too (x marks)"
        self._app.push_screen(
            PromptSheet(title, text, hint="" if wrong else hint, wrong=wrong), named
        )

    def _search(self, title: str, then: Callable[[int], None], text: str) -> None:
        from kingpost.tui.models.ways import targets

        graph = self._app.sitting.graph
        view = self._app.view

        def found(target: Target) -> None:
            if self._app.view is view:  # whoever has gone elsewhere no longer asks
                self._matched(title, then, text, target)

        self._app.background("find", lambda job: targets(graph, text), found, words="finding")

    def _matched(self, title: str, then: Callable[[int], None], text: str, target: Target) -> None:
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        graph = self._app.sitting.graph
        if len(target.nodes) == 1 and not target.more:
            then(target.nodes[0])
            return
        if not target.nodes:
            self._ask_name(
                title, then, text, f"no name contains {visible(text, 40)!r}; try another"
            )
            return
        more = f"; {target.more:,} more contain it too: write more of the name" * bool(target.more)
        choices = [Choice(str(node), graph.name(node, 60)) for node in target.nodes]

        def chosen(key: str | None) -> None:
            if key is not None:
                then(int(key))

        self._app.push_screen(ChoiceSheet(f"{title}{more}", choices), chosen)

    def _open(self, start: int, goal: int) -> None:
        from kingpost.tui.views.way import WayView

        self._app.push_screen(WayView(start, goal))
