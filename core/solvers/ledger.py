"""One log for work that is done in several parts."""

from __future__ import annotations

import time
from collections.abc import Generator
from dataclasses import replace
from typing import TypeVar

from kingpost.core.result import Iteration

T = TypeVar("T")


class Ledger:
    """Numbers the lines of all parts on, so that sweeps, edge visits and seconds only grow."""

    def __init__(self) -> None:
        self.log: list[Iteration] = []
        self.sweeps = self.visits = 0
        self._began = time.perf_counter()

    @property
    def seconds(self) -> float:
        """Seconds since the ledger was opened."""
        return time.perf_counter() - self._began

    def line(
        self,
        residual: float,
        bound: float,
        part: str = "",
        eigenvalue: tuple[float, float] | None = None,
    ) -> Iteration:
        """Add a line of the caller's own, after it has counted ``sweeps`` and ``visits``."""
        made = Iteration(
            self.sweeps,
            residual,
            bound,
            self.visits,
            self.seconds,
            eigenvalue=eigenvalue,
            part=part,
        )
        self.log.append(made)
        return made

    def relay(
        self, work: Generator[Iteration, None, T], part: str = ""
    ) -> Generator[Iteration, None, T]:
        """Pass on the lines of a part of the work and return what it returns.

        ``part`` names the part in every line, before what the line says itself.
        """
        sweeps, visits = self.sweeps, self.visits
        while True:
            try:
                line = next(work)
            except StopIteration as end:
                found: T = end.value
                return found
            line = replace(
                line,
                index=sweeps + line.index,
                edge_visits=visits + line.edge_visits,
                seconds=self.seconds,
                part=": ".join(dict.fromkeys(word for word in (part, line.part) if word)),
            )
            self.sweeps, self.visits = line.index, line.edge_visits
            self.log.append(line)
            yield line
