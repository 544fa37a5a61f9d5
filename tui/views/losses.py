"""What if a node were lost; and each of the first nodes, one at a time."""

from __future__ import annotations

from collections.abc import Callable

from kingpost.tui.jobs import Job
from kingpost.tui.models.answers import Answer
from kingpost.tui.models.losses import loss_answer, losses_answer
from kingpost.tui.rooms import LOSS, LOSSES
from kingpost.tui.views.answer import AnswerView


class LossView(AnswerView):
    """Standings without one node, against those with it."""

    CSS_PATH = "answer.tcss"
    view = LOSS
    asked = "what if it were lost"

    def __init__(self, node: int) -> None:
        super().__init__()
        self._node = node

    def work(self) -> Callable[[Job], Answer] | None:
        sitting = self.kingpost.sitting
        graph, result = sitting.graph, sitting.result
        if result is None:
            return None
        return lambda job: loss_answer(graph, result, self._node, job.watch)


class LossesView(AnswerView):
    """The loss of each of the first nodes."""

    CSS_PATH = "answer.tcss"
    view = LOSSES
    asked = "losses one by one"

    def work(self) -> Callable[[Job], Answer] | None:
        sitting = self.kingpost.sitting
        graph, result = sitting.graph, sitting.result
        if result is None:
            return None
        return lambda job: losses_answer(graph, result, watch=job.watch)
