"""The convergence chart as a grid of characters: sweeps across, a logarithmic axis up."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from kingpost.tui.terminal import UNICODE, Glyphs

Cell = tuple[str, str]  # character, role of its style
_LEFT = 9
_RIGHT = 8


@dataclass(frozen=True)
class Series:
    """What the chart shows, one entry a sweep; NaN where a value is not known.

    ``tolerance`` is the bound asked for; ``proven`` the proven order, ``n`` its highest value.
    """

    sweeps: Sequence[int]
    residual: Sequence[float]
    bound: Sequence[float]
    proven: Sequence[int | None]
    tolerance: float | None
    n: int


def chart(series: Series, width: int, height: int, glyphs: Glyphs = UNICODE) -> list[list[Cell]]:
    """``height`` rows of ``width`` cells: two curves, the tolerance, the proven order.

    The left scale is the logarithm of residual and bound, the right scale that of the proven
    order, from 1 at the foot to n at the top.
    """
    plot_w, plot_h = width - _LEFT - _RIGHT - 2, height - 2
    if plot_w < 8 or plot_h < 3 or not series.sweeps:
        return [[(" ", "plain")] * max(width, 0) for _ in range(max(height, 0))]
    grid: list[list[Cell]] = [[(" ", "plain")] * plot_w for _ in range(plot_h)]
    low, high = _range(series)

    def row(value: float) -> int:
        share = (math.log10(value) - low) / (high - low)
        return min(max(round((1.0 - share) * (plot_h - 1)), 0), plot_h - 1)

    columns = _columns(series.sweeps, plot_w)
    if series.tolerance:
        at = row(series.tolerance)
        for x in range(plot_w):
            grid[at][x] = (glyphs.tolerance, "quiet")
    _steps(grid, series, columns, glyphs)
    for values, glyph, role in (
        (series.bound, glyphs.bound, "bound"),
        (series.residual, glyphs.residual, "residual"),
    ):
        for x, value in zip(columns, values, strict=True):
            if not (math.isfinite(value) and value > 0.0):
                continue
            y = row(value)
            here = grid[y][x][0]
            both = here in (glyphs.bound, glyphs.both) and glyph != glyphs.bound
            grid[y][x] = (glyphs.both if both else glyph, role)
    return _framed(grid, series, low, high, glyphs)


def _range(series: Series) -> tuple[float, float]:
    values = [v for v in (*series.residual, *series.bound) if math.isfinite(v) and v > 0.0]
    if series.tolerance:
        values.append(series.tolerance)
    if not values:
        return -1.0, 0.0
    low, high = math.floor(math.log10(min(values))), math.ceil(math.log10(max(values)))
    return float(low), float(max(high, low + 1))


def _columns(sweeps: Sequence[int], width: int) -> list[int]:
    # A method of several stages may count anew in each.
    first, last = min(sweeps), max(sweeps)
    if last == first:
        return [0] * len(sweeps)
    # Few sweeps keep some distance, but do not spread over the whole width.
    span = max(last - first, min(width - 1, 7))
    return [round((sweep - first) / span * (width - 1)) for sweep in sweeps]


def _steps(grid: list[list[Cell]], series: Series, columns: list[int], glyphs: Glyphs) -> None:
    height, width = len(grid), len(grid[0])
    known = [(x, k) for x, k in zip(columns, series.proven, strict=True) if k is not None]
    if not known:
        return
    top = math.log(max(series.n, 2))
    for place, (x, proven) in enumerate(known):
        until = known[place + 1][0] if place + 1 < len(known) else min(x + 1, width)
        share = math.log(max(proven, 1)) / top
        y = min(max(round((1.0 - share) * (height - 1)), 0), height - 1)
        for column in range(x, max(until, x + 1)):
            if column < width and grid[y][column][0] in (" ", glyphs.tolerance):
                grid[y][column] = (glyphs.step, "step")


def _framed(
    grid: list[list[Cell]], series: Series, low: float, high: float, glyphs: Glyphs
) -> list[list[Cell]]:
    height, width = len(grid), len(grid[0])
    marks = {
        round((1.0 - (power - low) / (high - low)) * (height - 1)): power
        for power in range(int(low), int(high) + 1)
    }
    every = max(1, math.ceil(len(marks) / max(height // 2, 1)))
    has_steps = any(k is not None for k in series.proven)
    rows: list[list[Cell]] = []
    for y, line in enumerate(grid):
        power = marks.get(y)
        shown = power is not None and (int(high) - power) % every == 0
        left = f"1e{power:+03d}".rjust(_LEFT - 1) + " " if shown else " " * _LEFT
        right = ""
        if has_steps:
            right = f" {series.n:,}" if y == 0 else " 1" if y == height - 1 else ""
        row = [(c, "quiet") for c in left] + [(glyphs.axis, "rule"), *line, (glyphs.axis, "rule")]
        row += [(c, "step") for c in right.ljust(_RIGHT)[:_RIGHT]]
        rows.append(row)
    foot = " " * _LEFT + glyphs.corner + glyphs.rule * width
    rows.append([(c, "rule") for c in foot.ljust(width + _LEFT + _RIGHT + 2)])
    first, last = f"{min(series.sweeps):,}", f"sweep {max(series.sweeps):,}"
    words = " " * (_LEFT + 1) + first + last.rjust(max(width - len(first), 0))
    rows.append([(c, "quiet") for c in words.ljust(width + _LEFT + _RIGHT + 2)])
    return rows
