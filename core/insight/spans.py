"""Rank ranges from intervals alone, of all nodes or of a few, in pieces that can be cancelled."""

from __future__ import annotations

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.insight.align import Ints
from kingpost.core.parallel import each
from kingpost.core.result import Result
from kingpost.core.watch import Watch

_PIECE = 250_000


def intervals(result: Result) -> tuple[Floats, Floats]:
    """Lower and upper ends of every score, shape (n,) each; exact zeros are points."""
    low, high = result.bound.interval(result.scores)
    if result.exact_zero is not None:
        low[result.exact_zero] = high[result.exact_zero] = 0.0
    return low, high


def spans(low: Floats, high: Floats, watch: Watch, some: Ints | None = None) -> Ints:
    """First and last rank, from 1, that scores in ``[low, high]`` may have; shape (k, 2).

    The first is one more than the number of scores surely above, the last n less those surely
    below.  ``some`` asks for the ranks of these positions only.
    """
    n = len(low)
    lows, highs = np.sort(low), np.sort(high)
    watch.check()
    if some is not None:
        low, high = low[some], high[some]
    found = np.empty((len(low), 2), np.int64)

    def piece(start: int) -> None:
        watch.check()
        part = slice(start, start + _PIECE)
        found[part, 0] = 1 + n - np.searchsorted(lows, high[part], side="right")
        found[part, 1] = n - np.searchsorted(highs, low[part], side="left")

    each(piece, range(0, len(low), _PIECE), watch.threads)
    return found
