"""The graphs that other software may have made of the same table.

Weights kept or not, self-loops, parallel rows, direction: each choice gives another matrix, and
scores from elsewhere solve the equation of one of them.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from kingpost.core.graph import Adjacency, Floats, Graph
from kingpost.core.ingest.assemble import Ends, assemble
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.watch import Watch

# Another graph of the same table, by what became of parallel rows ("count", "last", ...).
Reload = Mapping[str, Callable[[], Graph]]

WEIGHT_WORDS = {
    "asis": "as read",
    "none": "ignored: every edge counts 1",
    "inverse": "inverted: 1/w",
    "count": "ignored: every row counts 1",
    "first": "of the first of parallel rows",
    "last": "of the last of parallel rows",
}
LOOP_WORDS = {"keep": "kept", "drop": "dropped", "twice": "counted twice"}


@dataclass(frozen=True, slots=True)
class Choice:
    """How a variant differs from the table as read: weights, self-loops, direction."""

    weights: str = "asis"
    loops: str = "keep"
    undirected: bool = False

    @property
    def changes(self) -> int:
        """Number of choices that are not those of the table as read."""
        return self.apart(Choice())

    def apart(self, other: Choice) -> int:
        """Number of choices in which two differ."""
        return (
            (self.weights != other.weights)
            + (self.loops != other.loops)
            + (self.undirected != other.undirected)
        )


def choices(graph: Graph, reload: Reload) -> list[Choice]:
    """Every choice that makes a difference on this graph, the fewest changes first."""
    weights = ["asis"]
    if graph.weighted:
        weights += ["none", "inverse"]
    weights += [name for name in reload if name not in weights]
    loops = ["keep", "drop"] if graph.loop_count else ["keep"]
    ways = [False, True] if graph.directed else [False]
    kinds = [Choice(w, loop, way) for w in weights for loop in loops for way in ways]
    if "count" not in weights and graph.directed:  # u -> v and v -> u are two rows
        kinds += [Choice("count", loop, True) for loop in loops]
    kinds += [
        Choice(choice.weights, "twice", choice.undirected)
        for choice in kinds
        if choice.loops == "drop" and (choice.undirected or not graph.directed)
    ]
    return sorted(kinds, key=lambda choice: choice.changes)


class Variants:
    """Makes the graph of any choice; tables that are read again are kept."""

    def __init__(self, graph: Graph, reload: Reload, watch: Watch) -> None:
        self._graph, self._reload, self._watch = graph, reload, watch
        self._read: dict[str, Graph] = {}

    def make(self, choice: Choice) -> Graph:
        """The graph of one choice."""
        graph = self._graph
        if choice.weights in self._reload:
            if choice.weights not in self._read:
                self._read = {choice.weights: self._reload[choice.weights]()}  # one at a time
            graph = self._read[choice.weights]
        return varied(graph, choice, self._watch)


def varied(graph: Graph, choice: Choice, watch: Watch) -> Graph:
    """``graph`` with a choice applied."""
    if choice.weights == "inverse" and graph.weighted:
        graph = reweighted(graph, lambda w: 1.0 / w)
    if choice.weights == "count" and graph.account.merged == 0:
        graph = reweighted(graph, None)
    if choice.undirected and graph.directed:
        graph = undirected(graph, watch)
    if choice.weights == "none":  # last: of two rows that meet, each counts once
        graph = reweighted(graph, None)
    if choice.loops == "drop":
        graph = without_loops(graph, watch)
    elif choice.loops == "twice":
        graph = loops_twice(graph)
    return graph


def reweighted(graph: Graph, change: Callable[[Floats], Floats] | None) -> Graph:
    """The same edges with other weights; None gives every edge 1."""

    def side(rows: Adjacency) -> Adjacency:
        kept = None if change is None or rows.weights is None else change(rows.weights)
        return Adjacency(rows.offsets, rows.neighbours, kept)

    outward = side(graph.outward)
    inward = outward if graph.inward is graph.outward else side(graph.inward)
    return _replaced(graph, outward, inward, graph.directed)


def undirected(graph: Graph, watch: Watch) -> Graph:
    """Every edge both ways; two that meet are summed."""
    return _assembled(graph, LoadOptions(directed=False), watch)


def without_loops(graph: Graph, watch: Watch) -> Graph:
    """The graph without edges from a node to itself."""
    if graph.directed:
        return _assembled(graph, LoadOptions(loops="drop"), watch)
    return _assembled(graph, LoadOptions(directed=False, loops="drop"), watch)


def loops_twice(graph: Graph) -> Graph:
    """An undirected graph in which a loop counts at both of its ends."""
    rows = graph.outward
    weights = np.ones(len(rows.neighbours)) if rows.weights is None else rows.weights.copy()
    owner = np.repeat(np.arange(graph.n, dtype=np.uint32), rows.degrees)
    weights[owner == rows.neighbours] *= 2.0
    both = Adjacency(rows.offsets, rows.neighbours, weights)
    return _replaced(graph, both, both, False)


def _assembled(graph: Graph, options: LoadOptions, watch: Watch) -> Graph:
    rows = graph.outward
    source = np.repeat(np.arange(graph.n, dtype=np.uint32), rows.degrees)
    target, weights = rows.neighbours.copy(), rows.weights
    if not graph.directed:  # both rows hold every edge: one is enough
        once = source <= target
        source, target = source[once], target[once]
        weights = None if weights is None else weights[once]
    kept = None if weights is None else weights.copy()
    built = assemble(Ends(source, target, kept), graph.labels, options, watch)
    return _replaced(graph, built.outward, built.inward, options.directed)


def _replaced(graph: Graph, outward: Adjacency, inward: Adjacency, directed: bool) -> Graph:
    # A new object, so that nothing computed of the old one and kept with it is taken over.
    return dataclasses.replace(graph, outward=outward, inward=inward, directed=directed)
