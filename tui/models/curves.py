"""Curves drawn in characters: values along an axis, each curve by a glyph of its own."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from kingpost.tui.models.chart import Cell
from kingpost.tui.models.numbers import compact
from kingpost.tui.terminal import UNICODE, Glyphs

_LEFT = 9
LETTERS = "abcdefghijklmnopqrstuvwxyz"
_MOST = 10  # values marked at the side


@dataclass(frozen=True)
class Curve:
    """One curve: its glyph, the role of its style, its values (NaN for none)."""

    glyph: str
    role: str
    values: Sequence[float]


@dataclass(frozen=True)
class Axes:
    """What the curves are drawn on.

    ``places`` are the points along the axis, ascending, and ``labels`` what is written under the
    first and the last (and as many between as fit); ``low`` and ``high`` the ends of the values;
    ``log`` whether they go by the logarithm; ``top_low`` whether the least stands at the top, as
    rank 1 does.
    """

    places: Sequence[float]
    labels: Sequence[str]
    low: float
    high: float
    log: bool = False
    top_low: bool = False


def curves_chart(
    axes: Axes,
    curves: Sequence[Curve],
    width: int,
    height: int,
    glyphs: Glyphs = UNICODE,
    front: int | None = None,
) -> list[list[Cell]]:
    """``height`` rows of ``width`` cells; curve ``front`` is drawn over the others, and stands out.

    Between two points a curve is a thin line; where curves meet, the first of them is seen.
    """
    plot_w, plot_h = width - _LEFT - 2, height - 2
    if plot_w < 8 or plot_h < 3 or not axes.places:
        return [[(" ", "plain")] * max(width, 0) for _ in range(max(height, 0))]
    grid: list[list[Cell]] = [[(" ", "plain")] * plot_w for _ in range(plot_h)]
    across = [_column(axes, place, plot_w) for place in axes.places]
    order = [at for at in range(len(curves)) if at != front]
    order = order[::-1] + ([front] if front is not None and front < len(curves) else [])
    for lines in (True, False):  # points over all lines
        for at in order:
            curve = curves[at]
            role = "strong" if at == front else curve.role
            rows = [_row(axes, value, plot_h) for value in curve.values]
            for one in range(len(rows)):
                y = rows[one]
                if y is None:
                    continue
                if not lines:
                    grid[y][across[one]] = (curve.glyph, "cursor" if at == front else curve.role)
                    continue
                after = rows[one + 1] if one + 1 < len(rows) else None
                if after is not None:
                    _line(grid, (across[one], y), (across[one + 1], after), glyphs, role)
    return _framed(axes, grid, across, plot_w, plot_h, width, glyphs)


def _column(axes: Axes, place: float, width: int) -> int:
    first, last = axes.places[0], axes.places[-1]
    return 0 if last == first else round((place - first) / (last - first) * (width - 1))


def _row(axes: Axes, value: float, height: int) -> int | None:
    if not math.isfinite(value) or (axes.log and value <= 0):
        return None
    low, high = axes.low, axes.high
    if axes.log:
        low, high, value = math.log(low), math.log(high), math.log(value)
    share = 0.0 if high <= low else (value - low) / (high - low)
    if not -1e-9 <= share <= 1 + 1e-9:
        return None  # beyond what is drawn
    return round((share if axes.top_low else 1.0 - share) * (height - 1))


def _line(
    grid: list[list[Cell]], start: tuple[int, int], end: tuple[int, int], glyphs: Glyphs, role: str
) -> None:
    (x, y), (x_end, y_end) = start, end
    for at in range(x + 1, x_end):
        row = round(y + (y_end - y) * (at - x) / (x_end - x))
        if grid[row][at][0] in (" ", glyphs.track) or role == "strong":
            grid[row][at] = (glyphs.track, role if role == "strong" else "quiet")


def _framed(
    axes: Axes,
    grid: list[list[Cell]],
    across: list[int],
    plot_w: int,
    plot_h: int,
    width: int,
    glyphs: Glyphs,
) -> list[list[Cell]]:
    marks: dict[int, str] = {}
    for value in _ticks(axes):
        row = _row(axes, value, plot_h)
        if row is not None:
            marks.setdefault(row, _text(value))
    out: list[list[Cell]] = []
    for y, line in enumerate(grid):
        label = marks.get(y, "").rjust(_LEFT - 1)[-(_LEFT - 1) :]
        out.append([*((c, "quiet") for c in label + " "), (glyphs.axis, "rule"), *line])
    foot = " " * _LEFT + glyphs.corner + glyphs.rule * plot_w
    out.append([(c, "rule") for c in foot.ljust(width)[:width]])
    words = [" "] * width
    for start, text in _spaced(axes.labels, across, width):
        words[start : start + len(text)] = text
    out.append([(c, "quiet") for c in words])
    return out


def _spaced(labels: Sequence[str], across: list[int], width: int) -> list[tuple[int, str]]:
    """Where labels go: the first, the last, and every so manieth between, as many as fit."""
    last = len(across) - 1

    def placed(at: int) -> tuple[int, str]:
        text = labels[at][:width]
        start = _LEFT + 1 + across[at] - (len(text) - 1) // 2
        return min(max(start, 0), width - len(text)), text

    for step in range(1, last + 1):
        chosen = [placed(at) for at in range(0, last, step)]
        end = placed(last)
        chosen = [one for one in chosen if one[0] + len(one[1]) + 1 < end[0]]
        chosen.append(end)
        if all(a + len(text) + 1 < b for (a, text), (b, _) in pairwise(chosen)):
            return chosen
    return [placed(last)]


def _text(value: float) -> str:
    if value == 0 or 1e-2 <= abs(value) < 1_000:
        return f"{value:.3g}"
    return compact(value) if value >= 1_000 else f"{value:.0e}"


def _ticks(axes: Axes) -> list[float]:
    """Ends first, then round values between."""
    ends = [axes.low, axes.high]
    if axes.log:
        low, high = math.floor(math.log10(axes.low)), math.ceil(math.log10(axes.high))
        step = max(1, math.ceil((high - low) / _MOST))
        return [*ends, *(10.0**power for power in range(low, high + 1, step))]
    return [*ends, *(axes.low + (axes.high - axes.low) * part / 4 for part in (1, 2, 3))]
