"""The shortest ways between two nodes, as rows to step through; and finding the other end."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from rich.cells import cell_len

from kingpost.core.insight.way import Way, shortest_way
from kingpost.core.labels import containing, locate
from kingpost.core.standing import UNRANKED
from kingpost.core.watch import Watch
from kingpost.tui.models.columns import Column
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.node import weight_format
from kingpost.tui.models.numbers import rank_range
from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

_NAME = 48
MOST_CHOICES = 100
_WORDS = {
    "along": "along the edges",
    "against": "against the edges",
    "either": "edges taken either way",
}


@dataclass(frozen=True)
class Target:
    """What a name led to: one node, several to choose from, or none; ``more`` beyond those."""

    nodes: tuple[int, ...]
    more: int = 0


def targets(graph: Graph, text: str) -> Target:
    """The node that reads ``text``, else those that contain it; run it in a job."""
    node = locate(graph.labels, text)
    if node is not None:
        return Target((node,))
    hits = np.flatnonzero(containing(graph.labels, text))
    few = tuple(int(i) for i in hits[:MOST_CHOICES])
    return Target(few, len(hits) - len(few))


class Steps:
    """One way as a source of the row-window table: a row a node."""

    def __init__(self, graph: Graph, result: Result, way: Way, glyphs: Glyphs = UNICODE) -> None:
        self.way = way
        standing, refused = result.standing, result.refusal is not None
        width = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)
        weight = weight_format(np.array(way.weights))
        widest = max(cell_len(tame(graph.name(node, _NAME))) for node in way.nodes[:400])

        def by(at: int) -> str:
            if at == 0:
                return "starts"
            edge = weight(way.weights[at - 1])
            return f"by {edge}" if way.along[at - 1] else f"back by {edge}"

        def rank(at: int) -> str:
            return "-" if refused else rank_range(*standing.range_of(way.nodes[at]), width)

        edges = [by(at) for at in range(min(len(way.nodes), 400))]
        self.head = [
            Column("step", "step", 4, str, right=True, frozen=True),
            Column(
                "node",
                "node",
                min(max(widest, 6), 24),
                lambda at: graph.name(way.nodes[at], 4 * _NAME),
                frozen=True,
                stretch=min(max(widest, 6), _NAME),
            ),
            Column("edge", "edge of weight", max(14, *map(len, edges)), by),
            Column("rank", f"{result.measure} rank", max(width, 11), rank, right=True),
        ]

    @property
    def count(self) -> int:
        """Number of nodes on the way."""
        return len(self.way.nodes)

    def item(self, row: int) -> int:
        """Steps are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is marked."""
        return False


def ways(graph: Graph, start: int, goal: int, watch: Watch | None = None) -> list[Way]:
    """The shortest way along and the one against the edges; where neither is, one that takes
    them either way; run it in a job.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    courses = ("along", "against") if graph.directed else ("along",)
    found = [shortest_way(graph, start, goal, course, watch) for course in courses]
    if graph.directed and found == [None, None]:
        found = [shortest_way(graph, start, goal, "either", watch)]
    return [way for way in found if way is not None]


def course_words(way: Way, directed: bool = True) -> str:
    """``3 edges along the edges``."""
    edges = f"{way.edges:,} step" + ("" if way.edges == 1 else "s")
    return f"{edges} {_WORDS[way.course]}" if directed else edges
