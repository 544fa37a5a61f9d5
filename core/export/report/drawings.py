"""The drawings of a report: convergence, and where a node stands in every measure."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from itertools import pairwise

from kingpost.core.export.digits import small
from kingpost.core.export.report.blocks import RIGHT, Cells, Chart, Table
from kingpost.core.export.report.charts import Curve, Frame, apart, powers, whole_ticks
from kingpost.core.result import Iteration, Result
from kingpost.core.text import count

_ROWS = 12  # sweeps told in a table that stands for the drawing


def convergence(result: Result) -> Chart | None:
    """Residual and proven error by sweep, on a logarithmic axis; None for a log of one line.

    A method that solves one part of the graph after another begins a new line with each.
    """
    lines = [line for line in result.log if math.isfinite(line.residual)]
    if len(lines) < 2:
        return None
    tol = float(getattr(result.settings, "tol", 0.0) or 0.0)
    bounded = [line for line in lines if math.isfinite(line.bound)]
    seen = [value for line in lines for value in (line.residual, line.bound)]
    seen = [value for value in [*seen, tol] if math.isfinite(value) and value > 0]
    if not seen:
        return None
    low = min(seen)
    ticks = powers(low, max(seen))
    indices = _counted(lines)
    last = int(max(indices.values()))
    frame = Frame((1.0, float(max(last, 2))), (min(low, ticks[0][0]), ticks[-1][0]), log_y=True)
    frame.axes(
        whole_ticks(1, last), ticks, "sweep over the edges", "share of the sum of the scores"
    )
    curves = []
    for name, some, value, style in (
        ("residual", lines, _residual, ("other", "ring")),
        ("proven error", bounded, _bound, ("main", "dot")),
    ):
        if some:
            points = [(indices[id(line)], max(value(line), low)) for line in some]
            curves.append(Curve(name, points, *style, _pieces(some, value)))
    heights = apart(
        [frame.along(curve.points[-1][1]) for curve in curves]
        + ([frame.along(tol)] if tol > 0 else [])
    )
    for curve, height in zip(curves, heights, strict=False):
        frame.curve(curve, height)
    if tol > 0:
        frame.level(tol, "asked for", heights[-1])
    title = (
        f"{result.measure}: after {count(last, 'sweep')} the residual is "
        f"{small(lines[-1].residual)} and the proven error {small(float(result.bound.value))}"
        + (f"; {small(tol)} was asked for" if tol > 0 else "")
    )
    caption = (
        f"Convergence of {title}. Solid with dots: what is proven; dashed with rings: the "
        "residual, which proves nothing by itself; dotted: what was asked for."
    )
    if any(len(curve.pieces) > 1 for curve in curves):
        caption += " A line that ends belongs to a part of the graph that was solved by itself."
    return Chart(frame.svg(f"Convergence of {title}"), caption, _log_table(result))


def _residual(line: Iteration) -> float:
    return line.residual


def _bound(line: Iteration) -> float:
    return line.bound


def _counted(lines: Sequence[Iteration]) -> dict[int, float]:
    """The sweep of every line, counted on where a part counts anew."""
    found: dict[int, float] = {}
    base = before = 0
    for line in lines:
        if line.index < before:
            base += before
        before = line.index
        found[id(line)] = float(base + line.index)
    return found


def _pieces(
    lines: Sequence[Iteration], value: Callable[[Iteration], float]
) -> list[tuple[int, int]]:
    """Ranges of lines of one part of the work: within one nothing jumps up a thousandfold."""
    cuts = [
        i
        for i in range(1, len(lines))
        if lines[i].part != lines[i - 1].part or value(lines[i]) > 1e3 * value(lines[i - 1])
    ]
    return list(pairwise([0, *cuts, len(lines)]))


def _log_table(result: Result) -> Table:
    lines = list(result.log)
    step = max(1, math.ceil(len(lines) / _ROWS))
    kept = lines[::step] + ([lines[-1]] if (len(lines) - 1) % step else [])
    return Table(
        "Sweeps",
        [
            Cells("sweep", [f"{line.index:,}" for line in kept], RIGHT, head=True),
            Cells("residual", [_number(line.residual) for line in kept], RIGHT),
            Cells("proven error", [_number(line.bound) for line in kept], RIGHT),
        ],
    )


def _number(value: float) -> str:
    return f"{value:.1e}" if math.isfinite(value) else "-"


def ruler(name: str, places: dict[str, tuple[str, int, int]], n: int) -> Chart | None:
    """Where a node stands in every measure, on one logarithmic line.

    ``places`` maps a measure to its letter and the first and last rank the node may have.
    """
    if n < 2 or not places:
        return None
    frame = Frame((1.0, float(n)), (0.0, 1.0), log_x=True, height=92)
    frame.axes(
        [(1.0, "1"), *((10.0**k, f"{10**k:,}") for k in range(1, 12) if 10**k < 0.5 * n),
         (float(n), f"{n:,}")],
        [], "rank, logarithmic", "",
    )  # fmt: skip
    spots = sorted(places.items(), key=lambda item: item[1][1])
    xs = [frame.across(math.sqrt(low * high)) for _, (_, low, high) in spots]
    level = frame.along(0.25)
    for (_, (letter, _, _)), x, text_x in zip(spots, xs, apart(xs, 12.0), strict=True):
        frame.spot(x, level)
        frame.words(text_x, level - 10, letter, "middle")
    words = ", ".join(f"{measure} ({letter}) {low:,}" if low == high else
                      f"{measure} ({letter}) {low:,}-{high:,}"
                      for measure, (letter, low, high) in places.items())  # fmt: skip
    return Chart(frame.svg(f"Ranks of {name}: {words}"), f"Ranks among {n:,}: {words}.")
