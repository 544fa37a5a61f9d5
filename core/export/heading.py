"""What stands above and below a ranking: in short sentences, everything needed to trust it."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from kingpost.core.export.digits import small
from kingpost.core.export.rows import Ranking
from kingpost.core.graph import Graph
from kingpost.core.measures.base import Settings
from kingpost.core.result import BoundKind
from kingpost.core.standing import OPEN, PROVEN, TIED, UNRANKED
from kingpost.core.text import count, visible

RAIL = {PROVEN: "┃", OPEN: "╎", TIED: "=", UNRANKED: " "}
RAIL_ASCII = {PROVEN: "|", OPEN: ":", TIED: "=", UNRANKED: " "}

_BOUND_WORDS = {
    BoundKind.EXACT: "rounding only",
    BoundKind.COMPONENTWISE: "a bound for each score by itself",
    BoundKind.L1: "the absolute errors of all scores add up to no more",
    BoundKind.BRACKET: "from a bracket of the eigenvalue; for the vector an estimate",
    BoundKind.STATISTICAL: "a standard error, no hard bound",
    BoundKind.NONE: "no bound is known",
}


def graph_line(graph: Graph, flow: str | None = None) -> str:
    """``harbour.parquet  402 nodes  6,118 edges  score flows along caller -> callee``."""
    origin = graph.origin
    parts = [visible(origin.name, 60), count(graph.n, "node"), count(graph.m, "edge")]
    if not graph.directed:
        parts.append("undirected")
    elif flow is not None:
        arrow = f"{visible(origin.source, 40)} -> {visible(origin.target, 40)}"
        parts.append(f"score flows {flow} {arrow}")
    if origin.where_words is not None:
        parts.append(visible(origin.where_words, 200))
    return "  ".join(parts)


def settings_words(settings: Any) -> str:
    """``damping=0.85, dangling=teleport, tol=1e-10``: the settings that matter, in order.

    The flow has its own place; None means the default that the conventions name.
    """
    words = []
    shared = {item.name for item in dataclasses.fields(Settings)}
    for item in sorted(dataclasses.fields(settings), key=lambda f: f.name in shared):
        value = getattr(settings, item.name)
        if item.name == "flow" or value is None:
            continue
        words.append(f"{item.name.replace('_', '-')}={_setting(value)}")
    return ", ".join(words)


def _setting(value: Any) -> str:
    if isinstance(value, float):
        return f"{value:g}"
    if isinstance(value, np.ndarray):
        return f"({len(value):,} values)"
    if isinstance(value, dict):
        return f"({count(len(value), 'node')})"
    return visible(str(value), 40)


def header(ranking: Ranking) -> list[str]:
    """The sentences above a ranking, each safe to show and not yet broken into lines."""
    graph, result = ranking.graph, ranking.result
    flow = getattr(result.settings, "flow", None)
    bound = result.bound
    kind = f"{bound.kind.value}: {_BOUND_WORDS[bound.kind]}"
    lines = [
        graph_line(graph, flow),
        f"{result.measure}  {settings_words(result.settings)}  "
        f"weight: {visible(graph.origin.weight_words, 60)}",
        f"{result.stop.value}: {visible(result.reason)}{kept_words(result)}",
        f"error at most {small(bound.value)} of the sum of the scores ({kind})"
        if bound.kind is not BoundKind.NONE
        else "error: no bound is known",
        f"order proven to {ranking.standing.proven:,} of {graph.n:,}",
    ]
    if words := _conventions(ranking):
        lines.append(f"conventions  {words}")
    return lines


def kept_words(result: Any) -> str:
    """Where a result was not solved just now: that it was kept, and since when."""
    return "" if result.solved_on is None else f"; from the store, solved on {result.solved_on}"


def _conventions(ranking: Ranking) -> str:
    told = {"flow", "weight"}  # by the first two lines
    return "; ".join(
        f"{visible(name.replace('_', ' '))}: {visible(words)}"
        for name, words in ranking.conventions.items()
        if name not in told
    )


def legend(ascii_only: bool = False) -> str:
    """What each rail mark says."""
    rail = RAIL_ASCII if ascii_only else RAIL
    return (
        f"{rail[PROVEN]} proven above the next  {rail[OPEN]} not proven yet  "
        f"{rail[TIED]} tied  blank: not told from zero"
    )
