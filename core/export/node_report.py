"""A look at one node, as text and as JSON."""

from __future__ import annotations

import dataclasses
import math
from typing import Any

import numpy as np

from kingpost.core.export.cells import plain_ascii, wrap
from kingpost.core.export.digits import number, score_texts
from kingpost.core.export.heading import graph_line
from kingpost.core.export.jsonable import jsonable
from kingpost.core.export.layout import Column, terminal_table
from kingpost.core.export.table import name_text, rank_text, value_text
from kingpost.core.graph import Graph
from kingpost.core.insight.node import Neighbour, NodeView, Place
from kingpost.core.result import Result
from kingpost.core.text import count, visible


def node_json(
    view: NodeView, results: dict[str, Result], graph: Graph | None = None
) -> dict[str, Any]:
    """Keys: ``node, attributes, in_degree, out_degree, in_strength, out_strength, leading,
    measures, in_neighbours, out_neighbours``; a measure that has no answer holds ``refused``.

    With the graph also ``input`` and ``account``: how its table was read, and what became of
    every row.
    """
    from kingpost.core.export.data import settings

    measures = {}
    for place in view.places:
        solved = {"stop": place.stop.value, "settings": settings(results[place.measure].settings)}
        measures[place.measure] = (
            {"refused": place.refusal}
            if place.refusal is not None
            else {
                "rank": place.rank,
                "rank_low": place.low,
                "rank_high": place.high,
                "score": place.score,
                "score_low": place.score_low,
                "score_high": place.score_high,
            }
        ) | solved
    answer = {
        "node": view.label,
        "attributes": dict(view.attributes),
        "in_degree": view.in_degree,
        "out_degree": view.out_degree,
        "in_strength": view.in_strength,
        "out_strength": view.out_strength,
        "leading": view.leading,
        "measures": measures,
        "in_neighbours": [_neighbour(item) for item in view.inward],
        "out_neighbours": [_neighbour(item) for item in view.outward],
    }
    if graph is not None:
        answer["input"] = dataclasses.asdict(graph.origin)
        answer["account"] = dataclasses.asdict(graph.account)
    found: dict[str, Any] = jsonable(answer)
    return found


def _neighbour(item: Neighbour) -> dict[str, Any]:
    return {
        "node": item.label,
        "weight": item.weight,
        "share": item.share,
        "rank": item.rank,
        "rank_low": item.low,
        "rank_high": item.high,
    }


def node_text(
    graph: Graph, view: NodeView, flow: str, width: int = 80, *, ascii_only: bool = False
) -> str:
    """A look at a node as lines of at most ``width`` columns."""
    lines = [graph_line(graph, flow)]
    lines += wrap(f"node {name_text(view.label)}", width, "  ")
    for name, value in view.attributes.items():
        lines += wrap(f"  {visible(name, 40)}: {value_text(value) or '(none)'}", width, "    ")
    lines += ["", *_places(view, graph.n, width)]
    weight_in, weight_out = (
        f"weight {number(s)} in all" for s in (view.in_strength, view.out_strength)
    )
    title = f"pointing at it: {count(view.in_degree, 'node')}, {weight_in}"
    lines += ["", title, *_side(view.inward, view.in_degree, view.leading, width)]
    title = f"it points at: {count(view.out_degree, 'node')}, {weight_out}"
    lines += ["", title, *_side(view.outward, view.out_degree, view.leading, width)]
    text = "\n".join(line.rstrip() for line in lines) + "\n"
    return plain_ascii(text) if ascii_only else text


def _places(view: NodeView, n: int, width: int) -> list[str]:
    solved = [place for place in view.places if place.refusal is None]
    table = terminal_table(
        [
            Column("  measure", [f"  {place.measure}" for place in solved]),
            Column("rank", [rank_text(p.low or 0, p.high or 0) for p in solved], ">"),
            Column("of", [f"{n:,}"] * len(solved), ">"),
            Column("score", [_score(place) for place in solved]),
            Column("", [_remark(place) for place in solved], least=0),
        ],
        width,
    )[0]
    for place in view.places:
        if place.refusal is not None:
            table += wrap(f"  {place.measure}: no answer. {visible(place.refusal)}", width, "    ")
    return table


def _score(place: Place) -> str:
    values = [place.score, place.score_low, place.score_high]
    score, low, high = (np.array([math.nan if v is None else v]) for v in values)
    return score_texts(score, low, high)[0]


def _remark(place: Place) -> str:
    told = "" if place.stop.accurate else place.stop.value
    zero = "" if place.ranked else "not told from zero"
    return ", ".join(filter(None, (told, zero)))


def _side(items: tuple[Neighbour, ...], degree: int, leading: str, width: int) -> list[str]:
    if not degree:
        return []
    ranks = ["-" if i.rank is None else rank_text(i.low or 0, i.high or 0) for i in items]
    rows = terminal_table(
        [
            Column("  node", [f"  {name_text(i.label)}" for i in items], least=10),
            Column("weight", [number(item.weight) for item in items], ">"),
            Column("share", [f"{item.share:.1%}" for item in items], ">"),
            Column(f"{leading} rank", ranks, ">"),
        ],
        width,
    )[0]
    if len(items) < degree:
        rows.append(f"  {degree - len(items):,} more (--top N, --top all)")
    return rows
