"""How far the solved measures agree: a matrix, the nodes they place furthest apart, a scatter."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Graph
from kingpost.core.insight.agree import Agreement, Apart, agree
from kingpost.core.result import Result
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import Answer, Listing, Page, names_width
from kingpost.tui.models.chart import Cell
from kingpost.tui.models.columns import Column
from kingpost.tui.models.numbers import compact, percent, rank_range
from kingpost.tui.terminal import UNICODE, Glyphs

APART = 100
FINE = 256  # bins counted once a side; a drawing of any size merges them
_LEFT = 7


@dataclass(frozen=True)
class Scatter:
    """Nodes by their ranks in two measures, on logarithmic axes from rank 1 to rank n.

    ``counts[y, x]`` counts the nodes whose mean rank in ``down`` falls into bin y and that in
    ``across`` into bin x, shape (FINE, FINE).
    """

    across: str
    down: str
    n: int
    counts: NDArray[np.int64]

    def bin(self, rank: float) -> int:
        """The bin of a mean rank."""
        return int(bins(np.array([rank]), self.n)[0])


def bins(ranks: NDArray[np.float64], n: int) -> NDArray[np.int64]:
    """The bins of mean ranks, by equal steps of the logarithm."""
    span = math.log(max(n, 2))
    at = (np.log(ranks) / span * FINE).astype(np.int64)
    return np.clip(at, 0, FINE - 1)


def scatter(found: Agreement, across: str, down: str, watch: Watch | None = None) -> Scatter:
    """Count the nodes of an agreement, O(n); run it in a job."""
    watch = watch or Watch()
    x, y = found.ranks[across], found.ranks[down]
    counts = np.zeros(FINE * FINE, dtype=np.int64)
    for start in range(0, x.n, 1_000_000):
        watch.check()
        part = slice(start, start + 1_000_000)
        cells = bins(y.mean[part], x.n) * FINE + bins(x.mean[part], x.n)
        counts += np.bincount(cells, minlength=FINE * FINE)
    return Scatter(across, down, x.n, counts.reshape(FINE, FINE))


def merged(counts: NDArray[np.int64], width: int, height: int) -> NDArray[np.int64]:
    """The counts in ``height`` rows and ``width`` columns of cells."""
    rows = np.zeros((height, FINE), dtype=np.int64)
    np.add.at(rows, np.arange(FINE) * height // FINE, counts)
    cells = np.zeros((height, width), dtype=np.int64)
    np.add.at(cells.T, np.arange(FINE) * width // FINE, rows.T)
    return cells


def density(count: int, most: int, glyphs: Glyphs = UNICODE) -> str:
    """A glyph for so many nodes in a cell, by the logarithm; blank for none."""
    if count <= 0:
        return " "
    steps = len(glyphs.density)
    share = math.log(count) / math.log(most) if most > 1 else 0.0
    return glyphs.density[min(int(share * steps), steps - 1)]


def density_words(most: int, glyphs: Glyphs = UNICODE) -> str:
    """What the glyphs stand for: the least count of each."""
    steps = len(glyphs.density)
    told: list[str] = []
    before = 0
    for at, glyph in enumerate(glyphs.density):
        least = max(math.ceil(max(most, 1) ** (at / steps) - 1e-9), 1)
        if least > max(most, 1) or least == before:
            continue
        told.append(f"{glyph} {compact(least) if least >= 1_000 else least}+")
        before = least
    return "  ".join(told)


def scatter_chart(
    found: Scatter,
    here: tuple[float, float] | None,
    width: int,
    height: int,
    glyphs: Glyphs = UNICODE,
) -> list[list[Cell]]:
    """The scatter in ``height`` rows of ``width`` cells, first ranks at the top left.

    ``here`` are the mean ranks (across, down) of the node to mark.
    """
    plot_w, plot_h = width - _LEFT - 1, height - 3
    if plot_w < 8 or plot_h < 3 or found.n == 0:
        return [[(" ", "plain")] * max(width, 0) for _ in range(max(height, 0))]
    cells = merged(found.counts, plot_w, plot_h)
    most = int(cells.max())
    grid: list[list[Cell]] = [
        [(density(int(count), most, glyphs), "bar") for count in row] for row in cells
    ]
    if here is not None:
        x, y = (found.bin(rank) for rank in here)
        grid[y * plot_h // FINE][x * plot_w // FINE] = (glyphs.here, "cursor")
    ticks = _ticks(found.n)
    beside = {found.bin(rank) * plot_h // FINE: compact(rank) for rank in reversed(ticks)}
    out: list[list[Cell]] = []
    for y, line in enumerate(grid):
        label = beside.get(y, "").rjust(_LEFT - 1)[-(_LEFT - 1) :]
        out.append([*((c, "quiet") for c in label + " "), (glyphs.axis, "rule"), *line])
    foot = " " * _LEFT + glyphs.corner + glyphs.rule * plot_w
    out.append([(c, "rule") for c in foot[:width]])
    words, end = [" "] * width, -1
    for rank in ticks:
        text = compact(rank)
        start = min(_LEFT + 1 + found.bin(rank) * plot_w // FINE, width - len(text))
        if start > end:
            words[start : start + len(text)] = text
            end = start + len(text)
    out.append([(c, "quiet") for c in words])
    told = f" nodes a cell: {density_words(most, glyphs)}   {glyphs.here} the highlighted"
    out.append([(c, "quiet") for c in told.ljust(width)[:width]])
    return out


def _ticks(n: int) -> list[int]:
    """1, 10, 100 and so on, and n."""
    found = [10**power for power in range(len(str(max(n, 1))))]
    return [rank for rank in found if rank < n] + [max(n, 1)]


# ---- pages -------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Compared:
    """The agreement of some results and the scatter of one pair of them."""

    graph: Graph
    agreement: Agreement
    drawn: Scatter


def compared(graph: Graph, results: Mapping[str, Result], watch: Watch | None = None) -> Compared:
    """Compare results, by measure; draw the pair that agrees least; run it in a job.

    Raises:
        SettingsError: for fewer than two answers.
    """
    found = agree(graph, results, apart=APART, watch=watch)
    # NaN, where one measure ties all nodes, is no disagreement.
    least = min(found.pairs, key=lambda pair: math.inf if math.isnan(pair.tau_b) else pair.tau_b)
    return Compared(graph, found, scatter(found, least.a, least.b, watch))


def agreement_answer(found: Compared) -> Answer:
    """Pages: the nodes placed furthest apart under the scatter of a pair; the matrix."""
    agreement = found.agreement
    head = f"agreement of {', '.join(agreement.names)}"
    head += "; proven ties are ties"
    return Answer(head, (_apart_page(found), _matrix_page(agreement)))


def _apart_page(found: Compared) -> Page:
    graph, agreement, drawn = found.graph, found.agreement, found.drawn
    apart = agreement.apart
    across, down = agreement.ranks[drawn.across].mean, agreement.ranks[drawn.down].mean

    def draw(width: int, height: int, glyphs: Glyphs, row: int) -> list[list[Cell]]:
        node = apart[row].node if row < len(apart) else None
        here = None if node is None else (float(across[node]), float(down[node]))
        return scatter_chart(drawn, here, width, height, glyphs)

    def words(row: int) -> str:
        return apart_words(graph, apart[row])

    digits = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)
    names = [graph.name(one.node, 96) for one in apart]
    head = [
        Column(
            "node", "placed apart", names_width(names, 12), lambda at: names[at], frozen=True,
            stretch=names_width(names, 12, 40),
        ),
        Column("factor", "apart", 7, lambda at: _times(apart[at].factor), right=True),
        *(_rank_column(apart, name, digits) for name in agreement.names),
    ]  # fmt: skip
    title = f"{drawn.across} rank across, {drawn.down} down; m another pair"
    listing = Listing(head, len(apart), lambda at: apart[at].node)
    empty = "every node has the same rank in all of them" if graph.n else "the graph has no nodes"
    return Page("nodes apart", title, listing, words=words, draw=draw, empty=empty)


def _rank_column(apart: tuple[Apart, ...], name: str, digits: int) -> Column:
    return Column(
        name,
        name,
        max(len(name), digits),
        lambda at: rank_range(*apart[at].ranks[name], digits),
        right=True,
    )


def _times(factor: float) -> str:
    return f"{factor:,.0f}x" if factor >= 10 else f"{factor:.1f}x"


def apart_words(graph: Graph, row: Apart) -> str:
    """Where two measures place a node, and what in the structure says why."""
    high, low = (rank_range(*row.ranks[name]) for name in (row.high, row.low))
    reasons = "; ".join(reason.words for reason in row.reasons)
    return f"{graph.name(row.node, 60)}: {row.high} {high}, {row.low} {low}. {reasons}"


_BLOCKS = (("tau-b, Spearman", "tau_b", "spearman"), ("overlap, first {top:,}", "rbo", "top"))


def _matrix_page(found: Agreement) -> Page:
    """Two matrices, each with one coefficient below the diagonal and another above it."""
    names = found.names
    values = {(pair.a, pair.b): pair for pair in found.pairs}
    rows: list[tuple[str, list[str]]] = []
    for title, below, above in _BLOCKS:
        if rows:
            rows.append(("", [""] * len(names)))
        rows.append((title.format(top=found.top), list(names)))
        for y, name in enumerate(names):
            cells = []
            for x, other in enumerate(names):
                if x == y:
                    cells.append(".")
                    continue
                pair = values.get((name, other)) or values[(other, name)]
                cells.append(coefficient(getattr(pair, above if x > y else below)))
            rows.append((name, cells))
    width = max(len(name) for name, _ in rows)

    def cell(x: int) -> Callable[[int], str]:
        return lambda at: rows[at][1][x]

    columns = [
        Column(f"c{x}", "", max(len(name), 7), cell(x), right=True) for x, name in enumerate(names)
    ]
    head = [Column("name", "", width, lambda at: rows[at][0], frozen=True, stretch=width), *columns]
    words = (
        "tau-b and Spearman weigh all nodes alike, from -1 to 1. Rank-biased overlap weighs the "
        f"head, from 0 to 1: with p {found.p:g} the first {found.top:,} ranks have "
        f"{percent(found.head_weight)} of its weight. First {found.top:,}: the part of them shared"
    )
    for name, why in found.refused.items():
        words = f"{name} has no answer here and is left out: {why}. {words}"
    listing = Listing(head, len(rows))
    return Page(
        "how far",
        "named first: below the diagonal; named second: above it",
        listing,
        words=lambda row: words,
    )


def coefficient(value: float) -> str:
    """A coefficient with four decimals; a dash where it is not defined."""
    return "-" if math.isnan(value) else f"{value:.4f}"


def couples(found: Agreement) -> list[tuple[str, str, str]]:
    """(across, down, what is known of them) for every two measures, to choose from."""
    values = {(pair.a, pair.b): pair for pair in found.pairs}
    return [
        (a, b, f"tau-b {coefficient(values[(a, b)].tau_b)}, overlap of the head "
               f"{coefficient(values[(a, b)].rbo)}")
        for a, b in combinations(found.names, 2)
    ]  # fmt: skip
