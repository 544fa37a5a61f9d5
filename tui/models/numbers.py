"""Numbers as the screen writes them: aligned on the point, no more digits than the bound allows."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.result import Bound

_SAMPLE = 100_000


def compact(number: float) -> str:
    """``950``, ``12.3k``, ``4.99M``: at most five characters."""
    for size, unit in ((1e9, "G"), (1e6, "M"), (1e3, "k")):
        if number >= size:
            scaled = number / size
            return f"{scaled:.{0 if scaled >= 100 else 1 if scaled >= 10 else 2}f}{unit}"
    return f"{number:.0f}"


def percent(share: float) -> str:
    """``31%``; ``<1%`` for what would round to nothing, ``-`` for what is not known."""
    if not math.isfinite(share):
        return "-"
    if 0.0 < share < 0.005:
        return "<1%"
    return f"{100.0 * share:.0f}%"


def middle(value: float | tuple[float, float]) -> float:
    """A number, or the middle of a bracket."""
    return sum(value) / 2.0 if isinstance(value, tuple) else float(value)


def rank_range(first: int, last: int, width: int | None = None) -> str:
    """``4`` or ``4-9``; shortened units where the full digits would not fit ``width``."""
    if first == last:
        return f"{first:,}"
    text = f"{first:,}-{last:,}"
    if width is not None and len(text) > width:
        return f"{compact(first)}-{compact(last)}"
    return text


def small(number: float) -> str:
    """A residual or bound: ``2.1e-06``; a dash where it is not known."""
    return "-" if not math.isfinite(number) else f"{number:.1e}"


@dataclass(frozen=True, slots=True)
class ScoreFormat:
    """How the scores of one result are written: fixed decimals after scaling by a power of ten.

    ``steep`` scores, whose median is lost beside the highest, each carry their own power.
    ``rough`` scores show a digit that the bound does not prove, lest all of them read 0.
    """

    exponent: int = 0
    decimals: int = 4
    whole: bool = False
    width: int = 8
    steep: bool = False
    rough: bool = False

    def text(self, score: float) -> str:
        """One score; a dash where there is none."""
        if not math.isfinite(score):
            return "-"
        if self.whole:
            return f"{score:,.0f}"
        if self.steep:
            return f"{score:.{self.decimals}e}"
        return f"{score / 10.0**self.exponent:.{self.decimals}f}"

    @property
    def unit(self) -> str:
        """What the heading adds: a tilde for rough scores, the power of ten taken out."""
        return " ~" * self.rough + (f" 1e{self.exponent:+d}" if self.exponent else "")


def score_format(scores: Floats, bound: Bound) -> ScoreFormat:
    """Choose digits for a whole column: three significant ones at the median, unless the bound
    justifies fewer; a power of a thousand is taken out where all scores are tiny or huge.
    """
    finite = np.abs(scores[np.isfinite(scores)])
    positive = finite[finite > 0.0]
    if len(positive) == 0:
        return ScoreFormat()
    top = float(positive.max())
    sample = positive[:: max(1, len(positive) // _SAMPLE)]
    if top < 1e12 and bool(np.all(sample == np.floor(sample))) and top == math.floor(top):
        return ScoreFormat(whole=True, decimals=0, width=len(f"{top:,.0f}"))
    exponent = 0 if 1e-2 <= top < 1e5 else 3 * math.floor(math.log10(top) / 3)
    unit = 10.0**exponent
    middle = float(np.median(sample)) / unit
    if middle < top / unit * 1e-5:
        return ScoreFormat(decimals=2, width=8, steep=True)
    decimals = min(max(2 - math.floor(math.log10(middle)), 0), 6)
    least = min(max(1 - math.floor(math.log10(top / unit)), 0), decimals)
    justified = _justified(scores, bound, unit)
    rough = justified < least
    decimals = max(min(decimals, justified), least)
    width = len(f"{top / unit:.{decimals}f}")
    return ScoreFormat(exponent, decimals, False, width, rough=rough)


def _justified(scores: Floats, bound: Bound, unit: float) -> int:
    """Decimals the bound supports at the highest scores, where absolute errors are largest."""
    few = min(len(scores), 1_000)
    at = np.argpartition(-np.nan_to_num(scores, nan=-np.inf), few - 1)[:few]
    low, high = bound.interval(scores)
    reach = float(np.median((high - low)[at])) / 2.0 / unit
    if not math.isfinite(reach):
        return 6
    return 6 if reach <= 0.0 else max(0, math.floor(-math.log10(2.0 * reach)))
