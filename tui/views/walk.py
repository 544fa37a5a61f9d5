"""A walk from a node: where a walker is after each step, how soon it forgets where it began."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, cast

from kingpost.tui.jobs import Job
from kingpost.tui.models.answers import Answer
from kingpost.tui.models.walks import walk_answer
from kingpost.tui.rooms import WALK
from kingpost.tui.views.answer import AnswerView

if TYPE_CHECKING:
    from kingpost.core.graph import Flow


class WalkView(AnswerView):
    """The walk is that of the surfer, with a damping of its own."""

    CSS_PATH = "answer.tcss"
    view = WALK
    asked = "a walk from it"

    def __init__(self, node: int, damping: float) -> None:
        super().__init__()
        self._node, self._damping = node, damping

    def work(self) -> Callable[[Job], Answer] | None:
        sitting, glyphs = self.kingpost.sitting, self.looks.glyphs
        graph, flow = sitting.graph, cast("Flow", sitting.flow)
        return lambda job: walk_answer(graph, self._node, self._damping, flow, glyphs, job.watch)
