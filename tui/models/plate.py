"""Everything known of a node as rows: its standing, its attributes, its neighbourhood drawn."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from rich.cells import cell_len

from kingpost.core.insight.nearby import nearby
from kingpost.core.insight.node import place
from kingpost.core.text import visible
from kingpost.core.watch import Watch
from kingpost.tui.models.columns import attribute_text
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.numbers import rank_range, score_format
from kingpost.tui.models.outline import outline
from kingpost.tui.models.pairs import NAME, Pairs, Row, wrapped
from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

_TEXT = 400  # characters of a value that are kept; columns beyond the screen cannot be read


class Plate(Pairs):
    """The rows about one node."""

    def __init__(self, node: int, name: str, rows: Sequence[Row]) -> None:
        super().__init__(rows)
        self.node, self.name = node, name


def plate(
    graph: Graph,
    result: Result,
    results: Sequence[tuple[str, Result]],
    node: int,
    width: int,
    glyphs: Glyphs = UNICODE,
    watch: Watch | None = None,
) -> Plate:
    """Everything known of a node, for a screen of ``width`` cells; run it in a job.

    ``results`` are pairs of a measure's letter and its answer; ``result`` says which way score
    flows.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    rows = [Row("stands", "", title=True), *_standing(results, node, watch)]
    about = _attributes(graph, node)
    if about:
        rows += [Row("attributes", "", title=True), *about]
    watch.check()
    notes, drawing = _drawn(graph, result, node, width, glyphs)
    rows = [*wrapped([*rows, *notes], width), *drawing]
    return Plate(node, graph.name(node, 200), rows)


def _standing(results: Sequence[tuple[str, Result]], node: int, watch: Watch) -> list[Row]:
    rows = []
    for letter, result in results:
        watch.check()
        found = place(result, node)
        name = f"{letter} {result.measure}"
        if found.low is None or found.high is None or found.score is None:
            rows.append(Row(name, visible(found.refusal or "no answer", _TEXT)))
            continue
        text = f"rank {rank_range(found.low, found.high)} of {len(result.scores):,}"
        form = score_format(result.scores, result.bound)
        text += f"   score {form.text(found.score)}{form.unit}"
        low, high = found.score_low, found.score_high
        if low is not None and high is not None and math.isfinite(high - low):
            text += f"   at most {max(high - found.score, found.score - low):.1e} off"
        if not found.ranked:
            text += "   cannot be told from zero"
        rows.append(Row(name, text))
    return rows


def _attributes(graph: Graph, node: int) -> list[Row]:
    if graph.attributes is None:
        return []
    table = graph.attributes
    return [
        Row(visible(name, 40), attribute_text(table.column(name)[node].as_py(), _TEXT) or "(none)")
        for name in table.column_names
    ]


def _drawn(
    graph: Graph, result: Result, node: int, width: int, glyphs: Glyphs
) -> tuple[list[Row], list[Row]]:
    """What there is to say about the drawing, and the drawing."""
    near = nearby(graph, result, node)
    names = {each: _node_name(graph, each, near.loops, glyphs) for each in near.rows}
    widest = max(cell_len(tame(name, glyphs)) for name in names.values())
    drawn = outline(near, max(width - min(max(widest, 8), NAME) - 4, 8), glyphs)
    words = [f"{glyphs.gives} gives into a line, {glyphs.takes} receives from it"]
    if near.loops:
        words.append("* gives to itself")
    if near.left_out:
        words.append(f"the strongest are drawn, {near.left_out:,} more are not")
    if drawn.hidden:
        words.append(f"{drawn.hidden:,} lines find no room here")
    notes = [Row("neighbourhood", "; ".join(words), title=True)]
    if len(near.rows) == 1:
        return notes, [Row(names[node], "no neighbours: it stands alone", node)]
    rows = [Row("give to it:", "")] if near.above else []
    for at, each in enumerate(drawn.rows):
        centre = each == near.centre
        name = f"{glyphs.down} {names[each]}" if centre else names[each]
        rows.append(Row(name, drawn.lines[at], each))
        if centre and near.below:
            rows.append(Row("it gives to:", ""))
    return notes, rows


def _node_name(graph: Graph, node: int, loops: frozenset[int], glyphs: Glyphs) -> str:
    return tame(graph.name(node, 60), glyphs) + ("*" if node in loops else "")
