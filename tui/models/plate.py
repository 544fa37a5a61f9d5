"""Everything known of a node as rows: its standing, its attributes, its neighbourhood drawn."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from rich.cells import cell_len

from kingpost.core.insight.nearby import nearby
from kingpost.core.insight.node import place
from kingpost.core.standing import UNRANKED
from kingpost.core.text import visible
from kingpost.core.watch import Watch
from kingpost.tui.models.columns import Column, attribute_text
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.numbers import rank_range, score_format
from kingpost.tui.models.outline import outline
from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

_NAME = 24
_TEXT = 400  # characters of a value that are kept; columns beyond the screen cannot be read


@dataclass(frozen=True)
class Row:
    """A line of the plate; ``node`` where it stands for one that can be gone to."""

    name: str
    text: str
    node: int | None = None
    title: bool = False


class Plate:
    """Rows as a source of the row-window table."""

    def __init__(self, node: int, name: str, rows: Sequence[Row]) -> None:
        self.node, self.name, self.rows = node, name, list(rows)
        widest = max((cell_len(tame(row.name)) for row in rows), default=8)
        most = max((len(row.text) for row in rows), default=1)
        self.head = [
            Column(
                "name",
                "",
                min(max(widest, 8), _NAME),
                lambda at: self.rows[at].name,
                frozen=True,
                stretch=min(max(widest, 8), _NAME),
            ),
            Column("text", "", most, lambda at: self.rows[at].text),
        ]

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.rows)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Titles stand out as what was found does elsewhere."""
        return self.rows[row].title


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
    rows += _drawn(graph, result, node, width, glyphs)
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
            text += f"   within {low:.9g} .. {high:.9g}"
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


def _drawn(graph: Graph, result: Result, node: int, width: int, glyphs: Glyphs) -> list[Row]:
    near = nearby(graph, result, node)
    names = {each: _node_name(graph, each, near.loops, glyphs) for each in near.rows}
    widest = max(cell_len(tame(name, glyphs)) for name in names.values())
    frozen = min(max(widest, 8), _NAME)
    drawn = outline(near, max(width - frozen - 4, 8), glyphs)
    how = f"{glyphs.gives} gives into a line, {glyphs.takes} receives from it"
    left = f"; the strongest are drawn, {near.left_out:,} more are not" if near.left_out else ""
    hidden = f"; {drawn.hidden:,} lines find no room here" if drawn.hidden else ""
    loops = "; * gives to itself" if near.loops else ""
    rows = [Row("neighbourhood", f"{how}{loops}{left}{hidden}", title=True)]
    if len(near.rows) == 1:
        return [*rows, Row(names[node], "no neighbours: it stands alone", node)]
    for at, each in enumerate(drawn.rows):
        if at == 0 and near.above:
            rows.append(Row("give to it:", ""))
        name = names[each]
        if each == near.centre:
            name = f"{glyphs.down} {name}"
        rows.append(Row(name, drawn.lines[at], each))
        if each == near.centre and near.below:
            rows.append(Row("it gives to:", ""))
    return rows


def _node_name(graph: Graph, node: int, loops: frozenset[int], glyphs: Glyphs) -> str:
    return tame(graph.name(node, 60), glyphs) + ("*" if node in loops else "")
