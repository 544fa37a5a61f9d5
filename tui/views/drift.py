"""Drift: what has changed against another table."""

from __future__ import annotations

from collections.abc import Callable

from kingpost.tui.jobs import Job
from kingpost.tui.models.answers import Answer
from kingpost.tui.models.drifts import Other, drift_answer
from kingpost.tui.rooms import DRIFT
from kingpost.tui.views.answer import AnswerView


class DriftView(AnswerView):
    """Reads and solves the other table as this one was; Enter opens a node of this one."""

    CSS_PATH = "answer.tcss"
    view = DRIFT
    asked = "drift against another table"

    def __init__(self, other: Other) -> None:
        super().__init__()
        self._other = other

    def work(self) -> Callable[[Job], Answer] | None:
        sitting, store = self.kingpost.sitting, self.kingpost.opener.store
        graph, result = sitting.graph, sitting.result
        if result is None:
            return None
        chosen = sitting.measure(result.measure)
        return lambda job: drift_answer(graph, result, self._other, chosen, job.watch, store)
