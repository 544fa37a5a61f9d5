"""Rates of convergence: what a spectrum predicts, what a log shows."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from kingpost.core.result import Iteration

# Parts of a log that prove or prepare, and do not bring the scores nearer.
_BESIDE = ("certificate", "certified", "downstream", "spectral radius", "condensation")
_FLOOR = 1e-13


@dataclass(frozen=True, slots=True)
class Rate:
    """A factor by which the error falls a sweep.

    Attributes:
        factor: from 0 up; 1 and more is no convergence.
        digit: sweeps to one more decimal digit; infinite where the factor is 1 or more.
        words: of what, or over which sweeps.
        first, last: the sweeps it was observed between; 0, 0 for a prediction.
    """

    factor: float
    digit: float
    words: str
    first: int = 0
    last: int = 0


def predicted_rate(factor: float, words: str) -> Rate:
    """The rate that a quotient of moduli predicts."""
    return Rate(factor, _digit(factor), words)


def observed_rate(log: Sequence[Iteration]) -> Rate | None:
    """The mean factor a sweep over the longest stretch of one kind in which residuals fell.

    It ends at the least residual, or at the first below 1e-13: behind that is rounding.  None for
    fewer than three sweeps.
    """
    best: list[Iteration] = []
    stretch: list[Iteration] = []
    head = None
    for line in [*log, None]:
        if line is not None and not (math.isfinite(line.residual) and line.residual > 0):
            continue
        name = None if line is None else line.part.split(": ")[0]
        if line is not None and line.part.split(": ")[-1] in _BESIDE and name == head:
            continue
        if name != head or line is None:
            if head not in _BESIDE and len(stretch) > len(best):
                best = stretch
            head, stretch = name, []
        if line is not None and not (stretch and line.index == stretch[-1].index):
            stretch.append(line)
    if not best:
        return None
    end = min(range(len(best)), key=lambda k: max(best[k].residual, _FLOOR))
    first, last = best[0], best[end]
    if last.index - first.index < 2:
        return None
    factor = (last.residual / first.residual) ** (1 / (last.index - first.index))
    words = f"mean of sweeps {first.index:,} to {last.index:,} of the solve"
    return Rate(factor, _digit(factor), words, first.index, last.index)


def _digit(factor: float) -> float:
    if factor >= 1:
        return math.inf
    return -1 / math.log10(factor) if factor > 0 else 0.0
