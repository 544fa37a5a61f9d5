"""How scores are spread: a histogram in one line, on logarithmic axes both ways."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.core.result import Result

FINE = 240  # cells counted once; a line of any width merges them
WIDTH = 24
_PIECE = 1_000_000


@dataclass(frozen=True)
class Spread:
    """Counts of positive scores in :data:`FINE` equal steps of the logarithm, least first.

    ``zeros`` counts scores of zero (or none at all); ``low`` and ``high`` are the least and the
    greatest positive score, NaN where there is none.
    """

    counts: NDArray[np.int64]
    zeros: int
    low: float
    high: float

    def cell(self, score: float, width: int = WIDTH) -> int | None:
        """The cell of a line of ``width`` that a score falls into; None where it has none."""
        if not (score > 0.0 and math.isfinite(score) and math.isfinite(self.low)):
            return None
        return _fine(score, self.low, self.high) * width // FINE

    def bars(self, width: int = WIDTH, glyphs: Glyphs = UNICODE) -> str:
        """A bar a cell: taller by the logarithm of the count, blank for none."""
        cells = np.zeros(width, dtype=np.int64)
        np.add.at(cells, np.arange(FINE) * width // FINE, self.counts)
        top = math.log1p(int(cells.max(initial=0)))
        steps = len(glyphs.levels)
        return "".join(
            glyphs.levels[max(math.ceil(math.log1p(int(count)) / top * steps) - 1, 0)]
            if count
            else " "
            for count in cells
        )


def spread_of(result: Result) -> Spread:
    """Count the scores of a result, O(n); run it in a job."""
    scores = result.scores
    counts = np.zeros(FINE, dtype=np.int64)
    # A NaN is no score: comparisons with it are false.
    positive = scores[(scores > 0.0) & (scores < np.inf)]
    if len(positive) == 0:
        return Spread(counts, len(scores), math.nan, math.nan)
    low, high = float(positive.min()), float(positive.max())
    width = math.log(high) - math.log(low)
    for start in range(0, len(positive), _PIECE):
        part = np.log(positive[start : start + _PIECE])
        at = (part - math.log(low)) / width * FINE if width > 0.0 else np.zeros(len(part))
        counts += np.bincount(np.clip(at.astype(np.int64), 0, FINE - 1), minlength=FINE)
    return Spread(counts, len(scores) - len(positive), low, high)


def _fine(score: float, low: float, high: float) -> int:
    width = math.log(high) - math.log(low)
    if width <= 0.0:
        return 0
    at = int((math.log(score) - math.log(low)) / width * FINE)
    return min(max(at, 0), FINE - 1)
