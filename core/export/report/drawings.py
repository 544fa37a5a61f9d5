"""The drawings of a report: convergence, and where a node stands in every measure."""

from __future__ import annotations

import math

from kingpost.core.export.digits import small
from kingpost.core.export.report.blocks import RIGHT, Cells, Chart, Table
from kingpost.core.export.report.charts import Curve, Frame, apart, powers, whole_ticks
from kingpost.core.result import Result

_ROWS = 12  # sweeps told in a table that stands for the drawing


def convergence(result: Result) -> Chart | None:
    """Residual and proven error by sweep, on a logarithmic axis; None for a log of one line."""
    lines = [line for line in result.log if math.isfinite(line.residual)]
    if len({line.index for line in lines}) < 2:
        return None
    tol = float(getattr(result.settings, "tol", 0.0) or 0.0)
    pairs = {
        "residual": [(line.index, line.residual) for line in lines],
        "proven error": [(line.index, line.bound) for line in lines if math.isfinite(line.bound)],
    }
    seen = [y for points in pairs.values() for _, y in points if y > 0] + ([tol] if tol > 0 else [])
    if not seen:
        return None
    low, high = max(min(seen), 1e-300), max(seen)
    ticks = powers(low, high * 1.0001)
    frame = Frame(
        (lines[0].index, lines[-1].index),
        (min(low, ticks[0][0]), max(high, ticks[-1][0])),
        log_y=True,
    )
    frame.axes(
        whole_ticks(lines[0].index, lines[-1].index), ticks, "sweep over the edges",
        "share of the sum of the scores",
    )  # fmt: skip
    curves = [
        Curve(name, [(x, max(y, low)) for x, y in points], *style)
        for (name, points), style in zip(
            pairs.items(), [("other", "ring"), ("main", "dot")], strict=True
        )
        if points
    ]
    ends = [frame.along(curve.points[-1][1]) for curve in curves]
    heights = apart([*ends, *([frame.along(tol)] if tol > 0 else [])])
    for curve, height in zip(curves, heights, strict=False):
        frame.curve(curve, height)
    if tol > 0:
        frame.level(tol, "asked for")
    last = lines[-1]
    title = (
        f"{result.measure}: after {last.index:,} sweeps the residual is {small(last.residual)}"
        + (f" and the proven error {small(result.bound.value)}" if result.bound.value >= 0 else "")
        + (f"; {small(tol)} was asked for" if tol > 0 else "")
    )
    caption = (
        f"Convergence of {title}. Solid with dots: what is proven; dashed with rings: the "
        "residual, which proves nothing by itself; dotted: what was asked for."
    )
    return Chart(frame.svg(f"Convergence of {title}"), caption, _log_table(result))


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
