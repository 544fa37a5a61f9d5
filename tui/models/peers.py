"""Ranks and scores among peers: who stands high for a node of its year, tier or team."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from kingpost.core.errors import SettingsError
from kingpost.core.insight.cohorts import Cohorts, within
from kingpost.core.text import visible
from kingpost.core.watch import Watch
from kingpost.tui.models.columns import Column
from kingpost.tui.models.numbers import rank_range

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result


def peers_of(
    graph: Graph, result: Result, attribute: str, watch: Watch | None = None
) -> tuple[Cohorts | None, str]:
    """The result rescaled among peers by an attribute, and what there is to say about it.

    None and the reason where that cannot be.  Run it in a job.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    try:
        found = within(graph, result, attribute, watch=watch)
    except SettingsError as error:
        sentence = error.sentence.replace("--within ", "").replace("--window", "the window")
        return None, f"not rescaled among peers: {sentence}"
    name = visible(found.column, 24)
    whom = f"nodes of its {name}" if found.window is None else f"{found.window:,} nearest by {name}"
    words = f"z: deviations from the mean of the {whom} (arXiv 1509.01476)"
    return found, "; ".join(part for part in (words, found.left_out) if part)


def peers_columns(found: Cohorts) -> list[Column]:
    """The rank a node has among its peers, and its score rescaled among them."""
    name = visible(found.column, 12)
    most = int(found.peers.max(initial=1))
    width = min(2 * len(f"{most:,}") + 1, 11)

    def rank(node: int) -> str:
        first = int(found.first[node])
        return "-" if first < 0 else rank_range(first, int(found.last[node]), width)

    def rescaled(node: int) -> str:
        z = float(found.scores[node])
        return "-" if np.isnan(z) else f"{z:+.2f}"

    title = f"in {name}"
    return [
        Column(
            "peers:rank",
            title,
            max(width, len(title)),
            rank,
            right=True,
            keys=lambda: np.where(found.first < 0, np.nan, found.first),
        ),
        Column(
            "peers:z",
            "z",
            7,
            rescaled,
            right=True,
            high_first=True,
            keys=lambda: found.scores,
        ),
    ]


def attributes_of(graph: Graph) -> list[tuple[str, str]]:
    """(attribute, its kind in words) of those by which nodes can be grouped."""
    import pyarrow as pa

    if graph.attributes is None:
        return []
    found = []
    for name in graph.attributes.column_names:
        kind = graph.attributes.column(name).type
        if pa.types.is_nested(kind) or pa.types.is_null(kind):
            continue
        moving = (
            pa.types.is_integer(kind)
            or pa.types.is_floating(kind)
            or pa.types.is_decimal(kind)
            or pa.types.is_temporal(kind)
        )
        found.append((name, "nodes near in it" if moving else "nodes of the same value"))
    return found
