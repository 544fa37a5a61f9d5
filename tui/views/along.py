"""Ranks along a setting: lines of the first nodes, drawn, and where the leader changes."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from kingpost.tui.jobs import Job
from kingpost.tui.models.along import along_answer
from kingpost.tui.models.answers import Answer
from kingpost.tui.rooms import ALONG
from kingpost.tui.views.answer import AnswerView

if TYPE_CHECKING:
    from kingpost.core.insight.over import Over
    from kingpost.core.measures.base import Settings


class AlongView(AnswerView):
    """Sweeps a setting of one measure; the others stay as they are in force."""

    CSS_PATH = "answer.tcss"
    view = ALONG
    asked = "ranks along a setting"

    def __init__(self, measure: str, settings: Settings, over: Over) -> None:
        super().__init__()
        self._measure, self._settings, self._over = measure, settings, over

    def work(self) -> Callable[[Job], Answer] | None:
        graph = self.kingpost.sitting.graph
        return lambda job: along_answer(graph, self._measure, self._settings, self._over, job.watch)
