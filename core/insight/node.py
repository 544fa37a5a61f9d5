"""One node looked at closely: what is known of it, where it stands, who its neighbours are."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.result import Result, Stop
from kingpost.core.standing import UNRANKED


@dataclass(frozen=True, slots=True)
class Place:
    """Where a node stands in one measure.

    ``rank`` is its position 1..n, ``low`` to ``high`` the ranks it may truly have; all are None
    where the measure has no answer on this graph, and ``refusal`` then says why.  ``score`` is
    known to lie within ``score_low`` and ``score_high`` (infinite where nothing is known);
    ``ranked`` is False where the score cannot be told from zero.
    """

    measure: str
    stop: Stop
    rank: int | None = None
    low: int | None = None
    high: int | None = None
    score: float | None = None
    score_low: float | None = None
    score_high: float | None = None
    ranked: bool = False
    refusal: str | None = None


@dataclass(frozen=True, slots=True)
class Neighbour:
    """The other end of an edge: its id, the edge's weight, its share of all weight on that side,
    and its ranks under the leading measure (None where that has no answer)."""

    node: int
    label: Any
    weight: float
    share: float
    rank: int | None
    low: int | None
    high: int | None


@dataclass(frozen=True, slots=True)
class NodeView:
    """Everything :func:`look` found.

    ``inward`` holds those that point at the node, ``outward`` those it points at, the heaviest
    edge first and equal ones by rank, each cut to the limit asked for; ``in_degree`` and
    ``out_degree`` count them all, ``in_strength`` and ``out_strength`` add up their weights.
    ``leading`` names the measure of the neighbours' ranks.
    """

    node: int
    label: Any
    attributes: Mapping[str, Any]
    in_degree: int
    out_degree: int
    in_strength: float
    out_strength: float
    leading: str
    places: tuple[Place, ...]
    inward: tuple[Neighbour, ...]
    outward: tuple[Neighbour, ...]


def look(
    graph: Graph,
    node: int,
    results: Mapping[str, Result],
    leading: str,
    limit: int | None = None,
) -> NodeView:
    """Look at ``node`` (0..n-1) under several ``results``, keyed by measure.

    ``limit`` cuts the lists of neighbours, None keeps all.  ``leading`` must be a key of
    ``results``.
    """
    lead = results[leading]
    return NodeView(
        node=node,
        label=graph.label(node),
        attributes=attributes(graph, node),
        in_degree=int(graph.inward.offsets[node + 1] - graph.inward.offsets[node]),
        out_degree=int(graph.outward.offsets[node + 1] - graph.outward.offsets[node]),
        in_strength=float(graph.inward.row(node)[1].sum()),
        out_strength=float(graph.outward.row(node)[1].sum()),
        leading=leading,
        places=tuple(place(result, node) for result in results.values()),
        inward=_neighbours(graph, graph.inward, node, lead, limit),
        outward=_neighbours(graph, graph.outward, node, lead, limit),
    )


def attributes(graph: Graph, node: int) -> dict[str, Any]:
    """The attributes of a node as Python values; what Python cannot hold exactly, as text."""
    if graph.attributes is None:
        return {}
    found = {}
    for name, column in zip(graph.attributes.column_names, graph.attributes.columns, strict=True):
        value = column[node]
        try:
            found[name] = value.as_py()
        except (ValueError, OverflowError):  # nanoseconds, years beyond 9999
            found[name] = str(value.cast("string"))
    return found


def place(result: Result, node: int) -> Place:
    """Where ``node`` stands in one result."""
    if result.refusal is not None:
        return Place(result.measure, result.stop, refusal=result.refusal.sentence)
    standing = result.standing
    at = int(standing.position[node])
    score = result.scores[node]
    if result.exact_zero is not None and result.exact_zero[node]:
        low = high = 0.0
    else:
        ends = result.bound.interval(result.scores)
        low, high = float(ends[0][node]), float(ends[1][node])
    return Place(
        measure=result.measure,
        stop=result.stop,
        rank=at + 1,
        low=int(standing.first[at]),
        high=int(standing.last[at]),
        score=float(score),
        score_low=low,
        score_high=high,
        ranked=int(standing.rail[at]) != UNRANKED,
    )


def _neighbours(
    graph: Graph, side: Adjacency, node: int, lead: Result, limit: int | None
) -> tuple[Neighbour, ...]:
    near, weights = side.row(node)
    if lead.refusal is None:
        position = lead.standing.position[near]
        order = np.lexsort((position, -weights))[:limit]
    else:
        position = None
        order = np.argsort(-weights, kind="stable")[:limit]
    total = float(weights.sum())
    found = []
    for i in order.tolist():
        rank = low = high = None
        if position is not None:
            rank = int(position[i]) + 1
            low, high = lead.standing.range_of(int(near[i]))
        weight = float(weights[i])
        found.append(
            Neighbour(
                node=int(near[i]),
                label=graph.label(int(near[i])),
                weight=weight,
                share=weight / total,
                rank=rank,
                low=low,
                high=high,
            )
        )
    return tuple(found)
