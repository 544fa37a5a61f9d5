"""Agreement: how far the solved measures agree, and the nodes on which they do not."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from kingpost.tui.jobs import Job
from kingpost.tui.models.agreement import (
    Compared,
    agreement_answer,
    compared,
    couples,
    scatter,
)
from kingpost.tui.models.answers import Answer
from kingpost.tui.rooms import AGREEMENT
from kingpost.tui.views.answer import AnswerView

if TYPE_CHECKING:
    from kingpost.core.result import Result


class AgreementView(AnswerView):
    """Compares what is solved; ``m`` draws another pair."""

    CSS_PATH = "answer.tcss"
    view = AGREEMENT
    asked = "agreement of the solved measures"

    def __init__(self) -> None:
        super().__init__()
        self._found: Compared | None = None
        self._of: list[Result] = []

    def _results(self) -> list[Result]:
        sitting = self.kingpost.sitting
        found = [sitting.results[name] for name in sitting.measures_shown()]
        return [one for one in found if one.refusal is None]

    def work(self) -> Callable[[Job], Answer] | None:
        self._found, self._of = None, self._results()
        results, graph = {one.measure: one for one in self._of}, self.kingpost.sitting.graph
        if len(results) < 2:
            self.refuse(
                "agreement takes two measures that are solved for the same flow; Esc goes back, "
                "where m chooses another measure to solve"
            )
            return None

        def work(job: Job) -> Answer:
            found = compared(graph, results, job.watch)
            job.facts["compared"] = found
            return agreement_answer(found)

        return work

    def _answered(self, found: Answer) -> None:
        job = self._job
        if job is not None:
            self._found = job.facts["compared"]
        super()._answered(found)

    def refreshed(self) -> None:
        # Another measure has been solved, or the same anew.
        if self.composed and self.is_attached:
            now = self._results()
            if len(now) != len(self._of) or any(
                a is not b for a, b in zip(now, self._of, strict=True)
            ):
                self.ask()

    # ---- actions -----------------------------------------------------------------------------

    def can_pair_choose(self) -> bool:
        return self._found is not None

    def do_pair_choose(self) -> None:
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        found = self._found
        if found is None:
            return
        pairs = couples(found.agreement)
        choices = [
            Choice(str(at), f"{a} across, {b} down", words)
            for at, (a, b, words) in enumerate(pairs)
        ]
        drawn = (found.drawn.across, found.drawn.down)
        here = next(at for at, (a, b, _) in enumerate(pairs) if (a, b) == drawn)

        def chosen(key: str | None) -> None:
            if key is not None and self._found is found:
                across, down, _ = pairs[int(key)]
                self._draw(found, across, down)

        self.app.push_screen(
            ChoiceSheet("ranks drawn against each other", choices, str(here)), chosen
        )

    def _draw(self, found: Compared, across: str, down: str) -> None:
        row = self.table.row

        def drawn(made: Compared) -> None:
            if self._found is not found or not self.is_attached:
                return
            self._found, self.answer = made, agreement_answer(made)
            self._at = 0
            self._turn(row)

        self.kingpost.background(
            "answer:pair",
            lambda job: Compared(
                found.graph, found.agreement, scatter(found.agreement, across, down, job.watch)
            ),
            drawn,
            words="counting nodes by their ranks",
        )
