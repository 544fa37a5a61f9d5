"""A node, its neighbours, and every edge among them: small enough to be drawn."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from kingpost.core.graph import Graph
from kingpost.core.insight.contributions import contributions, shares_given
from kingpost.core.insight.terms import flow_of
from kingpost.core.result import Result

MOST = 40


@dataclass(frozen=True)
class Nearby:
    """The neighbourhood of one node in the direction score flows.

    Attributes:
        centre: the node.
        above: nodes that give score to it, by falling contribution; one that also receives
            stands here only.
        below: nodes that only receive from it, by falling share of what it gives.
        edges: pairs (giver, receiver) of nodes among all of these, self-loops left out, by
            giver and receiver in ascending order.
        loops: those among them with an edge to themselves.
        left_out: neighbours beyond the limit.
    """

    centre: int
    above: tuple[int, ...]
    below: tuple[int, ...]
    edges: tuple[tuple[int, int], ...]
    loops: frozenset[int]
    left_out: int

    @property
    def rows(self) -> tuple[int, ...]:
        """All nodes from top to bottom."""
        return (*self.above, self.centre, *self.below)


def nearby(graph: Graph, result: Result, node: int, most: int = MOST) -> Nearby:
    """The induced neighbourhood of ``node``, at most ``most`` nodes in all.

    Where there are more, the strongest givers and receivers stay, an equal number of each as far
    as there are as many.  O(k log k) in its k neighbours, and a search in each row that stays.
    """
    feeders = [int(i) for i in contributions(graph, result, node).neighbours if i != node]
    given = shares_given(graph, result, node)[0]
    feeds = set(feeders)
    takers = [int(i) for i in given if i != node and int(i) not in feeds]
    room = max(most - 1, 0)
    few = min(len(takers), max(room // 2, room - len(feeders)))
    above, below = feeders[: room - few], takers[:few]
    kept = np.array(sorted([*above, node, *below]), dtype=np.uint32)
    push = graph.push(flow_of(result))
    edges: list[tuple[int, int]] = []
    loops = []
    for giver in kept.tolist():
        row = push.neighbours[push.offsets[giver] : push.offsets[giver + 1]]
        if len(row) == 0:
            continue
        at = np.minimum(np.searchsorted(row, kept), len(row) - 1)
        for receiver in kept[row[at] == kept].tolist():
            if receiver == giver:
                loops.append(giver)
            else:
                edges.append((giver, receiver))
    left_out = len(feeders) + len(takers) - len(above) - len(below)
    return Nearby(node, tuple(above), tuple(below), tuple(edges), frozenset(loops), left_out)
