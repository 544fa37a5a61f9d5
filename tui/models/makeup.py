"""What a graph is made of: its shape in words, degrees as a drawing, components to go into."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.export.account import account_pairs
from kingpost.core.export.audit_report import structure_pairs
from kingpost.core.insight.audit import Audit
from kingpost.core.standing import UNRANKED
from kingpost.core.structure import weak_components
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch
from kingpost.tui.models.chart import Cell
from kingpost.tui.models.columns import Column
from kingpost.tui.models.numbers import compact, percent
from kingpost.tui.models.pairs import Row
from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.insight.spectrum import Spectrum
    from kingpost.core.result import Result

MOST_PARTS = 1_000
_LEFT = 9
_PIECE = 100_000


# ---- shape and rows ----------------------------------------------------------------------------


def shape_rows(audit: Audit) -> list[Row]:
    """The structure, a phrase a row."""
    return [Row(name, words) for name, words in structure_pairs(audit)]


def ingest_rows(graph: Graph) -> list[Row]:
    """What became of every row of the table, and how the rows were read."""
    origin, account = graph.origin, graph.account
    rows = [Row("rows of the table", "", title=True)]
    rows += [Row(name, visible(words)) for name, words in account_pairs(account)]
    rows += [Row("note", visible(note)) for note in account.notes]
    rows.append(Row("how they were read", "", title=True))
    rows += [Row("file", visible(name, 400)) for name in origin.files]
    rows.append(Row("edge", visible(f"{origin.source} -> {origin.target}", 200)))
    rows.append(Row("weight", visible(origin.weight_words, 200)))
    rows.append(Row("same edge again", f"{origin.parallel}; self-loops: {origin.loops}"))
    rows.append(Row("bad rows", origin.bad_rows))
    if origin.nodes_file:
        joined = f"{origin.nodes_file}, by {origin.node_id}"
        rows.append(Row("node table", visible(joined, 400)))
    if origin.where_words:
        rows.append(Row("filter", visible(origin.where_words, 400)))
    return rows


def spectrum_rows(found: Spectrum) -> list[Row]:
    """The leading eigenvalues, the gap, the rate that follows and the one that was observed."""
    rows = [Row("matrix", visible(found.matrix, 200))]
    low, high = found.radius
    rows.append(Row("largest modulus", f"{low:.12g} to {high:.12g}, for certain"))
    for at, value in enumerate(found.values, 1):
        text = f"{value.real:.9g}"
        if value.imaginary:
            text += f" {'+' if value.imaginary > 0 else '-'} {abs(value.imaginary):.9g}i"
            text += f"   modulus {value.modulus:.9g}"
        if value.low is not None and value.high is not None:
            text += f"   within {value.low:.9g} .. {value.high:.9g}"
        else:
            text += f"   residual {value.residual:.1e}"
        rows.append(Row(f"{found.about} {at}", text))
    if found.zeros:
        rows.append(Row("zeros", f"{found.zeros:,} more are 0: nodes on no cycle"))
    if found.gap is not None:
        rows.append(Row("gap", f"{found.gap:.6g} (1 less the second modulus over the first)"))
    for name, rate in (("predicted rate", found.predicted), ("observed rate", found.observed)):
        if rate is not None:
            sweeps = "" if math.isinf(rate.digit) else f", {rate.digit:.3g} sweeps a digit"
            rows.append(Row(name, f"{rate.factor:.4g} a sweep{sweeps}; {visible(rate.words)}"))
    if not found.complete and found.values:
        rows.append(Row("searched", "for the head only: values further down may be missing"))
    return rows + [Row("note", visible(note)) for note in found.notes]


# ---- degrees -----------------------------------------------------------------------------------


@dataclass(frozen=True)
class Tail:
    """How many nodes have at least so many neighbours, for every number above 0 that occurs.

    ``degrees`` ascend, ``nodes`` fall, shapes (k,); ``none`` counts nodes without a neighbour.
    """

    name: str
    degrees: NDArray[np.int64]
    nodes: NDArray[np.int64]
    none: int

    def at_least(self, degree: float) -> int:
        """Nodes with at least ``degree`` neighbours."""
        at = int(np.searchsorted(self.degrees, math.ceil(degree - 1e-9)))
        return int(self.nodes[at]) if at < len(self.nodes) else 0


def tail_of(name: str, degrees: NDArray[np.int64]) -> Tail:
    """Count degrees, O(n + the highest); run it in a job."""
    counts = np.bincount(degrees, minlength=1)
    above = np.cumsum(counts[::-1])[::-1]
    found = np.flatnonzero(counts[1:]) + 1
    return Tail(name, found, above[found], int(counts[0]))


def tails(graph: Graph) -> list[Tail]:
    """In and out, or one where the graph is undirected; run it in a job."""
    if not graph.directed:
        return [tail_of("degree", graph.outward.degrees)]
    return [tail_of("in", graph.inward.degrees), tail_of("out", graph.outward.degrees)]


def degree_rows(found: list[Tail], n: int) -> list[Row]:
    """Median, upper tenth, hundredth and highest degree; nodes without a neighbour."""
    rows = []
    for tail in found:
        words = [f"{tail.none:,} nodes have none"]
        for share, name in ((0.5, "half"), (0.1, "a tenth"), (0.01, "a hundredth")):
            # The highest degree that at least this share of all nodes reach.
            reached = np.flatnonzero(tail.nodes >= share * n)
            degree = int(tail.degrees[reached[-1]]) if len(reached) else 0
            words.append(f"{name} at least {degree:,}")
        highest = int(tail.degrees[-1]) if len(tail.degrees) else 0
        rows.append(Row(tail.name, f"{', '.join(words)}, the highest {highest:,}"))
    return rows


def degree_chart(
    found: list[Tail], n: int, width: int, height: int, glyphs: Glyphs = UNICODE
) -> list[list[Cell]]:
    """Nodes with at least so many neighbours, both axes logarithmic; ``height`` rows of cells."""
    plot_w, plot_h = width - _LEFT - 2, height - 2
    top = max((int(t.degrees[-1]) for t in found if len(t.degrees)), default=0)
    if plot_w < 8 or plot_h < 3 or top == 0:
        return [[(" ", "plain")] * max(width, 0) for _ in range(max(height, 0))]
    reach, rise = max(math.log(top), 1e-9), max(math.log(max(n, 2)), 1e-9)
    grid: list[list[Cell]] = [[(" ", "plain")] * plot_w for _ in range(plot_h)]
    marks = ((glyphs.bound, "bound"), (glyphs.residual, "residual"))
    for tail, (glyph, role) in zip(found, marks, strict=False):
        for x in range(plot_w):
            nodes = tail.at_least(math.exp(x / max(plot_w - 1, 1) * reach))
            if nodes:
                y = round((1.0 - math.log(nodes) / rise) * (plot_h - 1))
                here = grid[y][x][0]
                grid[y][x] = (glyphs.both if here == glyphs.bound != glyph else glyph, role)
    rows: list[list[Cell]] = []
    ticks = _ticks(n, plot_h, lambda nodes: round((1.0 - math.log(nodes) / rise) * (plot_h - 1)))
    for y, line in enumerate(grid):
        label = _short(ticks[y]) if y in ticks else ""
        left = [(c, "quiet") for c in label.rjust(_LEFT - 1)[-(_LEFT - 1) :] + " "]
        rows.append([*left, (glyphs.axis, "rule"), *line, (" ", "plain")])
    foot = " " * _LEFT + glyphs.corner + glyphs.rule * plot_w
    rows.append([(c, "rule") for c in foot.ljust(width)[:width]])
    words = [" "] * width
    end = -1
    for x, degree in _ticks(
        top, plot_w, lambda degree: round(math.log(degree) / reach * (plot_w - 1)), flip=False
    ).items():
        text = f"{degree:,}"
        start = min(_LEFT + 1 + x, width - len(text))
        if start > end:
            words[start : start + len(text)] = text
            end = start + len(text) + 1
    rows.append([(c, "quiet") for c in words])
    return rows


def _short(count: int) -> str:
    return f"{count:,}" if count < 1_000_000 else compact(count)


def _ticks(top: int, room: int, place: Any, flip: bool = True) -> dict[int, int]:
    """Cell -> power of ten (and the highest value), at most one a cell."""
    found: dict[int, int] = {place(max(top, 1)): max(top, 1)} if flip else {}
    power = 1
    while power <= max(top, 1):
        found.setdefault(place(power), power)
        power *= 10
    if not flip:
        found.setdefault(place(max(top, 1)), max(top, 1))
    return found


# ---- components --------------------------------------------------------------------------------


@dataclass(frozen=True)
class Part:
    """A component: its number in the structure (or its root), nodes, stored edges inside, the
    node that stands first in it."""

    number: int
    nodes: int
    edges: int
    first: int


class Parts:
    """Components by falling size; a source of the row-window table.

    ``kind`` is strong or weak; ``total`` counts all of them, of which the first
    :data:`MOST_PARTS` are listed; ``singles`` those of one node.
    """

    def __init__(
        self, graph: Graph, kind: str, parts: list[Part], total: int, singles: int, membership: Any
    ) -> None:
        self.graph, self.kind, self.parts = graph, kind, parts
        self.total, self.singles = total, singles
        self._membership = membership
        widest = max((len(f"{part.edges:,}") for part in parts), default=5)
        self.head = [
            Column("place", "part", 5, lambda at: f"{at + 1:,}", right=True, frozen=True),
            Column("nodes", "nodes", 11, lambda at: f"{parts[at].nodes:,}", right=True),
            Column("share", "share", 5, self._share, right=True),
            Column(
                "edges",
                "edges inside" if graph.directed else "entries inside",
                max(widest, 14),
                lambda at: f"{parts[at].edges:,}",
                right=True,
            ),
            Column("first", "stands first in it", 40, lambda at: graph.name(parts[at].first, 120)),
        ]

    def _share(self, at: int) -> str:
        return percent(self.parts[at].nodes / max(self.graph.n, 1))

    @property
    def count(self) -> int:
        """Number of components listed."""
        return len(self.parts)

    def item(self, row: int) -> int:
        """Components are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is marked."""
        return False

    def members(self, row: int) -> NDArray[np.int64]:
        """The nodes of a component, ascending; O(n), run it in a job."""
        return np.flatnonzero(self._membership == self.parts[row].number)

    @property
    def words(self) -> str:
        """How many there are, in a sentence."""
        if not self.total:
            return "the graph has no nodes"
        shown = f", the largest {len(self.parts):,} listed" if self.total > self.count else ""
        found = count(self.total, f"{self.kind} component")
        return f"{found}, {self.singles:,} of one node{shown}"


def strong_parts(graph: Graph, result: Result | None, watch: Watch) -> Parts:
    """The strong components; run it in a job."""
    structure = graph.structure
    edges = np.zeros(structure.count, dtype=np.int64)
    edges[structure.cyclic] = structure.inner
    watch.check()
    return _parts(graph, "strong", structure.component, structure.sizes, edges, result, watch)


def weak_parts(graph: Graph, result: Result | None, watch: Watch) -> Parts:
    """The weakly connected components; run it in a job."""
    roots = weak_components(graph, watch)
    watch.check()
    sizes = np.bincount(roots, minlength=graph.n)
    # Every edge stays in its weak component.
    edges = np.bincount(roots, weights=graph.outward.degrees, minlength=graph.n).astype(np.int64)
    return _parts(graph, "weak", roots, sizes, edges, result, watch)


def _parts(
    graph: Graph,
    kind: str,
    membership: NDArray[np.uint32],
    sizes: NDArray[np.int64],
    edges: NDArray[np.int64],
    result: Result | None,
    watch: Watch,
) -> Parts:
    few = min(MOST_PARTS, int(np.count_nonzero(sizes)))
    if few == 0:
        return Parts(graph, kind, [], 0, 0, membership)
    some = np.argpartition(-sizes, few - 1)[:few]
    first = _first_of(membership, len(sizes), result, watch)
    # By size, then by edges, then by the node that stands first: always the same order.
    some = some[np.lexsort((first[some], -edges[some], -sizes[some]))]
    parts = [Part(int(c), int(sizes[c]), int(edges[c]), int(first[c])) for c in some]
    total, singles = int(np.count_nonzero(sizes)), int(np.count_nonzero(sizes == 1))
    return Parts(graph, kind, parts, total, singles, membership)


def _first_of(
    membership: NDArray[np.uint32], count: int, result: Result | None, watch: Watch
) -> NDArray[np.int64]:
    """For every component the node that stands first, by number where there is no standing."""
    n = len(membership)
    order = np.arange(n) if result is None or result.refusal else result.standing.order
    first = np.zeros(count, dtype=np.int64)
    # Written from the last to the first: what stands first is written last.
    for start in range((n - 1) // _PIECE * _PIECE, -1, -_PIECE):
        watch.check()
        part = order[start : start + _PIECE][::-1]
        first[membership[part]] = part
    return first
