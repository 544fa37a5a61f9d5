"""The shortest way from one node to another: along the edges, against them, or either way."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.watch import Watch

COURSES = ("along", "against", "either")
_PIECE = 2_000_000  # edges visited between two looks at whether to stop


@dataclass(frozen=True)
class Way:
    """A shortest way, counted in edges.

    Attributes:
        course: ``along`` (every edge from tail to head), ``against``, or ``either``.
        nodes: from the first to the last, k + 1 of them.
        weights: weight of each of the k edges.
        along: whether each of the k edges is walked from its tail to its head.
    """

    course: str
    nodes: tuple[int, ...]
    weights: tuple[float, ...]
    along: tuple[bool, ...]

    @property
    def edges(self) -> int:
        """Number of edges."""
        return len(self.weights)


def shortest_way(
    graph: Graph, start: int, goal: int, course: str = "along", watch: Watch | None = None
) -> Way | None:
    """A way from ``start`` to ``goal`` with the fewest edges; None where there is none.

    Breadth-first search, O(n + m), neighbours in the order of their numbers: of several ways of
    one length always the same is found.  Weights play no part.

    Raises:
        ValueError: for a course that is none of :data:`COURSES`.
        Interrupted: if ``watch`` was cancelled.
    """
    if course not in COURSES:
        raise ValueError(f"no course is called {course!r}")
    if start == goal:
        return Way(course, (start,), (), ())
    watch = watch or Watch()
    nodes = _search(graph, start, goal, course, watch)
    if nodes is None:
        return None
    weights, along = [], []
    for u, v in pairwise(nodes):
        forth = course != "against" and _weight(graph.outward, u, v) is not None
        weight = _weight(graph.outward, u, v) if forth else _weight(graph.outward, v, u)
        weights.append(0.0 if weight is None else weight)
        along.append(forth)
    return Way(course, tuple(nodes), tuple(weights), tuple(along))


def _search(graph: Graph, start: int, goal: int, course: str, watch: Watch) -> list[int] | None:
    from kingpost.core.kernels.way import UNSEEN, step, step_either

    out, back = graph.outward, graph.inward
    before = np.full(graph.n, UNSEEN, dtype=np.uint32)
    queue = np.empty(graph.n, dtype=np.uint32)
    before[start], queue[0] = start, start
    head, tail = 0, 1
    while head < tail and before[goal] == UNSEEN:
        watch.check()
        watch.report("searching a way", head, graph.n, "nodes")
        if course == "either":
            head, tail = step_either(
                out.offsets, out.neighbours, back.offsets, back.neighbours,
                queue, head, tail, before, goal, _PIECE,
            )  # fmt: skip
        else:
            side = out if course == "along" else back
            head, tail = step(
                side.offsets, side.neighbours, queue, head, tail, before, goal, _PIECE
            )
    if before[goal] == UNSEEN:
        return None
    nodes = [goal]
    while nodes[-1] != start:
        nodes.append(int(before[nodes[-1]]))
    return nodes[::-1]


def _weight(side: Adjacency, u: int, v: int) -> float | None:
    """Weight of the edge ``u -> v``, None where there is none; rows are ascending."""
    low, high = int(side.offsets[u]), int(side.offsets[u + 1])
    at = low + int(np.searchsorted(side.neighbours[low:high], v))
    if at >= high or int(side.neighbours[at]) != v:
        return None
    return 1.0 if side.weights is None else float(side.weights[at])
