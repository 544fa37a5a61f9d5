"""Scores as text: as many digits as their error bound justifies, and no more than a reader wants.

A score ``s`` known to within ``e`` is printed to the decimal place ``p`` with ``p >= 2 e``.
Rounding adds at most ``p / 2``, so the printed number is within one unit of its last digit of
the exact score.
"""

from __future__ import annotations

import math

import numpy as np

from kingpost.core.export.cells import width
from kingpost.core.graph import Floats

SIGNIFICANT = 7  # of the highest score shown; a reader compares rows, not ulps


def score_texts(scores: Floats, low: Floats, high: Floats) -> list[str]:
    """Texts of some scores, for one column.

    ``low`` and ``high`` are the ends of each score's interval, same shape.  Exact whole
    numbers get thousands separators.  ``~`` marks a number of which not even the first digit is
    justified.  Zero that is exact reads ``0``; NaN reads ``-``.
    """
    error = np.maximum(high - scores, scores - low)
    finite = scores[np.isfinite(scores)]
    if len(finite) == 0:
        return ["-"] * len(scores)
    if not error.any() and (finite == np.rint(finite)).all() and np.abs(finite).max() < 2**53:
        return [f"{int(score):,}" if math.isfinite(score) else "-" for score in scores]
    top = float(np.abs(finite).max())
    places = SIGNIFICANT - 1 - _magnitude(top)
    plain = 1e-4 <= top < 1e9
    return [
        _text(float(score), float(reach), places if plain else None)
        for score, reach in zip(scores, error, strict=True)
    ]


def _magnitude(number: float) -> int:
    """Exponent of ten of the first digit of a number; 0 for zero."""
    return math.floor(math.log10(abs(number))) if number else 0


def _text(score: float, error: float, places: int | None) -> str:
    """One score; ``places`` is the most decimals of the column, None for powers of ten."""
    if not math.isfinite(score):
        return "-"
    if score == 0 and error == 0:
        return "0"
    justified = math.floor(-math.log10(2 * error)) if 0 < error < math.inf else None
    if justified is None:
        justified = 400 if error == 0 else -400
    digits = justified + _magnitude(score) + 1
    if digits < 1:
        return f"~{score:.2g}"
    if places is None or abs(score) < 10.0 ** (2 - places):
        return f"{score:.{min(digits, SIGNIFICANT if places is None else 3) - 1}e}"
    decimals = min(places, justified)
    if decimals >= 0:
        return f"{score:.{decimals}f}"
    return f"{round(round(score, decimals)):,}"


def on_the_point(texts: list[str]) -> list[str]:
    """The same texts, padded so that their decimal points stand under each other."""
    heads = [text.split(".", 1)[0].split("e", 1)[0] for text in texts]
    tails = [text[len(head) :] for text, head in zip(texts, heads, strict=True)]
    before = max(map(width, heads), default=0)
    after = max(map(width, tails), default=0)
    return [h.rjust(before) + t.ljust(after) for h, t in zip(heads, tails, strict=True)]


def number(value: float) -> str:
    """A weight or a sum of weights: whole ones with separators, others in six digits."""
    if math.isfinite(value) and abs(value) < 1e15 and value == int(value):
        return f"{value:,.0f}"
    return f"{value:.6g}"


def small(value: float) -> str:
    """A bound or residual in two digits, rounded up: ``1.3e-11``; ``0``; ``unknown`` for NaN."""
    if math.isnan(value):
        return "unknown"
    if math.isinf(value) or value == 0:
        return "none known" if value else "0"
    scale = 10.0 ** (_magnitude(value) - 1)
    up = math.ceil(value / scale * (1 - 1e-15)) * scale
    return f"{up:.2g}" if 0.999e-3 < up < 1e4 else f"{up:.1e}"
