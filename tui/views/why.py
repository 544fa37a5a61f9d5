"""Why a node scores what it scores, and why one node stands above another."""

from __future__ import annotations

from collections.abc import Callable

from kingpost.tui.jobs import Job
from kingpost.tui.models.answers import Answer
from kingpost.tui.models.whys import than_answer, why_answer
from kingpost.tui.rooms import THAN, WHY
from kingpost.tui.views.answer import AnswerView


class WhyView(AnswerView):
    """The terms of one node's score, and the ways supply comes by."""

    CSS_PATH = "answer.tcss"
    view = WHY
    asked = "why it scores so"

    def __init__(self, node: int) -> None:
        super().__init__()
        self._node = node

    def work(self) -> Callable[[Job], Answer] | None:
        sitting, glyphs = self.kingpost.sitting, self.looks.glyphs
        graph, result = sitting.graph, sitting.result
        if result is None:
            return None
        return lambda job: why_answer(graph, result, self._node, glyphs, job.watch)


class ThanView(AnswerView):
    """Two nodes, term by term."""

    CSS_PATH = "answer.tcss"
    view = THAN
    asked = "one against another"

    def __init__(self, first: int, second: int) -> None:
        super().__init__()
        self._first, self._second = first, second

    def work(self) -> Callable[[Job], Answer] | None:
        sitting = self.kingpost.sitting
        graph, result = sitting.graph, sitting.result
        if result is None:
            return None
        return lambda job: than_answer(graph, result, self._first, self._second, job.watch)
