"""Kingpost in a notebook: ``graph.rank(...)`` and a result as an Arrow table.

    >>> import kingpost.core as kp
    >>> graph = kp.from_edges([("web", "identity"), ("kiosk", "identity"), ("identity", "vault")])
    >>> graph
    <Graph edges: 4 nodes, 3 edges, directed>
    >>> result = graph.rank("surfer", damping=0.9)
    >>> [row["node"] for row in result.top(2).to_pylist()]
    ['vault', 'identity']
    >>> result.proven_order == graph.n and result.bound.value < 1e-10
    True

A measure that has no answer on a graph returns a Result all the same; it says why:

    >>> graph.rank("eigenvector").refusal.instead
    'use --measure katz, which counts walks and is exact here'
"""

from __future__ import annotations

import contextlib
import dataclasses
import difflib
from typing import Any

import numpy as np
import pyarrow as pa

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.graph import Graph
from kingpost.core.measures import measure as find_measure
from kingpost.core.measures.base import finish
from kingpost.core.result import Result
from kingpost.core.standing import OPEN, PROVEN, TIED, UNRANKED
from kingpost.core.store.results import keep_result, solve
from kingpost.core.text import visible
from kingpost.core.watch import Watch

RAIL_WORDS = {
    PROVEN: "proven",
    OPEN: "not proven",
    TIED: "tied",
    UNRANKED: "not told from zero",
}


def rank(
    graph: Graph, measure: str = "surfer", watch: Watch | None = None, **settings: Any
) -> Result:
    """Solve one measure with settings by name; see :meth:`kingpost.core.graph.Graph.rank`."""
    chosen = find_measure(measure)
    known = {item.name for item in dataclasses.fields(chosen.settings)}
    for name in settings:
        if name not in known:
            near = difflib.get_close_matches(name, sorted(known), 1)
            advice = f"did you mean {near[0]}? " if near else ""
            raise SettingsError(
                f"{measure} has no setting {visible(name, 40)!r}; {advice}"
                f"it takes {', '.join(sorted(known))}"
            )
    watch = watch or Watch()
    result = finish(solve(chosen, graph, chosen.settings(**settings), watch))
    if graph.drawer is not None and result.refusal is None:
        _ = result.standing  # it is kept with its order
        with contextlib.suppress(Interrupted):  # the answer is there, kept or not
            keep_result(chosen, graph, result, watch)
    return dataclasses.replace(result, labels=graph.labels)


def table(result: Result, rows: int | None = None) -> pa.Table:
    """The first ``rows`` rows of a result; see :meth:`kingpost.core.result.Result.to_arrow`."""
    if result.refusal is not None:
        raise SettingsError(f"{result.measure} has no answer here: {result.refusal.sentence}")
    standing = result.standing
    count = len(result.scores) if rows is None else max(0, min(rows, len(result.scores)))
    nodes = standing.order[:count]
    low, high = result.bound.interval(result.scores)
    if result.exact_zero is not None:
        low[result.exact_zero] = high[result.exact_zero] = 0.0
    reach = np.maximum(high - result.scores, result.scores - low)[nodes]
    words = pa.array([RAIL_WORDS[mark] for mark in range(len(RAIL_WORDS))])
    rail = pa.DictionaryArray.from_arrays(
        pa.array(standing.rail[:count].astype(np.int8)), words
    ).cast(pa.string())
    where = pa.array(nodes)
    columns = {
        "rank": pa.array(np.arange(1, count + 1)),
        "rank_low": pa.array(standing.first[:count]),
        "rank_high": pa.array(standing.last[:count]),
        "node": where if result.labels is None else result.labels.take(where),
        "score": pa.array(result.scores[nodes]),
        "bound": pa.array(reach, mask=~np.isfinite(reach)),
        "rail": rail,
    }
    return pa.table(columns)
