"""A report's section on a parameter: the first nodes' ranks along it."""

from __future__ import annotations

import math

from kingpost.core.export.report.blocks import RIGHT, Block, Bullets, Cells, Chart, Heading, Table
from kingpost.core.export.report.charts import Curve, Frame, apart
from kingpost.core.export.report.material import Material
from kingpost.core.export.sweep_answer import leader_words, stable_words
from kingpost.core.export.table import rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.sweep import Sweep

_LINES = 8
_TICKS = 9  # values named below the axis


def along(material: Material) -> list[Block]:
    """The section, nothing without a sweep."""
    found = material.sweep
    if found is None:
        return []
    graph = material.graph
    words = [stable_words(graph, found), leader_words(graph, found)]
    words += [
        f"no answer at {found.over.flag} {point.value}: {point.refusal}"
        for point in found.points
        if point.refusal is not None
    ]
    return [
        Heading(f"Along {found.over.flag}"),
        drawing(graph, found),
        Bullets([f"{text[0].upper()}{text[1:]}." for text in words if text]),
    ]


def drawing(graph: Graph, found: Sweep) -> Chart:
    """Ranks of the first few nodes by value; ranks on a logarithmic axis, the first on top."""
    values = [float(point.value) for point in found.points]
    kept = range(min(_LINES, len(found.nodes)))
    names = [graph.name(int(found.nodes[k]), 24) for k in kept]
    ranks = found.ranks[:, : len(names)]
    deepest = max(int(ranks.max(initial=1)), 2)
    frame = Frame(
        (values[0], values[-1]), (1.0, float(deepest)), log_x=found.over.log, log_y=True, down=True
    )
    step = max(1, math.ceil(len(values) / _TICKS))
    below = [1, 2, 5, *(d * 10**k for k in range(1, 12) for d in (1, 2, 5))]
    frame.axes(
        [(value, f"{value:.4g}") for value in values[::step]],
        [(float(rank), f"{rank:,}") for rank in below if rank <= deepest][:9],
        found.over.flag,
        "rank",
    )
    curves = []
    for k in kept:
        points = [
            (value, math.sqrt(int(low) * int(high)))
            for value, (low, high) in zip(values, ranks[:, k], strict=True)
            if low > 0
        ]
        style = ("main", "dot") if k % 2 == 0 else ("other", "ring")
        if points:
            curves.append(Curve(names[k], points, *style))
    heights = apart([frame.along(curve.points[-1][1]) for curve in curves])
    for curve, height in zip(curves, heights, strict=True):
        frame.curve(curve, height)
    title = f"Ranks by {found.measure} along {found.over.flag} from {values[0]:g} to {values[-1]:g}"
    caption = (
        f"{title}: {', '.join(names)}. Solid and dashed lines only tell neighbours apart; a rank "
        "that ties or error bounds leave open is drawn in the middle of its range."
    )
    words = f"{title} for {', '.join(names)}"
    return Chart(frame.svg(words), caption, _table(found, names, values))


def _table(found: Sweep, names: list[str], values: list[float]) -> Table:
    columns = [Cells(found.over.flag, [f"{value:.4g}" for value in values], RIGHT, head=True)]
    for k, name in enumerate(names):
        cells = [
            rank_text(int(low), int(high)) if low > 0 else "-" for low, high in found.ranks[:, k]
        ]
        columns.append(Cells(name, cells, RIGHT))
    return Table("Ranks", columns)
