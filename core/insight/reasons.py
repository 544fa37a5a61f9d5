"""Why two measures place a node so differently: what in the structure around it says so.

Each reason is a fact that can be checked, not a verdict: in-degree, who feeds the node and how
many others those feed, which component it lies in, how old it is.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.insight.contributions import Contributions, contributions
from kingpost.core.insight.terms import flow_of, has_terms
from kingpost.core.result import Result
from kingpost.core.text import count, visible

_AGE_WORDS = ("year", "date", "created", "published", "since")
_STEEP = 0.25  # a share of the score that makes one feeder worth naming


@dataclass(frozen=True, slots=True)
class Reason:
    """One fact: ``kind`` is degree, feeders, component or age; ``words`` are safe to show."""

    kind: str
    words: str


def explain(
    graph: Graph,
    results: Mapping[str, Result],
    node: int,
    high: str,
    low: str,
    age: str | None = None,
) -> tuple[Reason, ...]:
    """Facts about ``node``, which ``results[high]`` places far above ``results[low]``."""
    top, bottom = results[high], results[low]
    flow = flow_of(top)
    found = [*_component(graph, bottom, node, low), _degree(graph, node, flow)]
    if has_terms(top):
        found += _feeders(graph, top, bottom, node)
    if age is not None:
        found += _age(graph, node, age)
    return tuple(found)


def _component(graph: Graph, bottom: Result, node: int, low: str) -> list[Reason]:
    zero = bottom.exact_zero
    if zero is None or not zero[node]:
        return []
    if low == "eigenvector":
        where = "nothing of the dominating strong component leads to it"
    elif low == "degree":
        where = "no edge feeds it"
    else:
        where = "no score can reach it"
    return [Reason("component", f"{where}: its {low} score is exactly 0")]


def _degree(graph: Graph, node: int, flow: Flow) -> Reason:
    degrees = graph.pull(flow).degrees
    mine = int(degrees[node])
    place = 1 + int(np.count_nonzero(degrees > mine))
    if not graph.directed:
        one, many = "is linked to it", "are linked to it"
    elif flow == "along":
        one, many = "points at it", "point at it"
    else:
        one, many = "is pointed at by it", "are pointed at by it"
    whom = one if mine == 1 else many
    return Reason("degree", f"{count(mine, 'node')} {whom} (rank {place:,} by that count)")


def _feeders(graph: Graph, top: Result, bottom: Result, node: int) -> list[Reason]:
    given = contributions(graph, top, node)
    if len(given.neighbours) == 0 or not given.amount[0] > 0:
        return []
    best, share = int(given.neighbours[0]), float(given.share[0])
    spread = graph.push(flow_of(top)).degrees
    rank = int(top.standing.position[best]) + 1
    name = graph.name(best, 60)
    feeds = int(spread[best])
    if share >= _STEEP:
        told = "it feeds nothing else" if feeds == 1 else f"it feeds {count(feeds, 'node')} in all"
        words = f"{share:.0%} of its {top.measure} score comes from {name} (rank {rank:,}); {told}"
        return [Reason("feeders", words)]
    return [Reason("feeders", _many(top, bottom, given, spread))]


def _many(top: Result, bottom: Result, given: Contributions, spread: NDArray[np.int64]) -> str:
    near, share = given.neighbours, given.share
    order = np.cumsum(share)
    half = int(np.searchsorted(order, 0.5 * order[-1])) + 1
    typical = _weighted_median(spread[near].astype(np.float64), share)
    ranks = top.standing.position[near] + 1
    words = (
        f"half of what feeds it comes from {count(half, 'node')} of {len(near):,}, of median "
        f"{top.measure} rank {int(np.median(ranks[:half])):,}"
    )
    if "surfer" in (top.measure, bottom.measure):
        split = "; surfer divides a feeder's score among all it feeds" if typical > 1 else ""
        words += f"; such a feeder feeds {count(int(typical), 'node')}{split}"
    return words


def _weighted_median(values: Floats, weights: Floats) -> float:
    order = np.argsort(values, kind="stable")
    total = np.cumsum(weights[order])
    return float(values[order][np.searchsorted(total, total[-1] / 2)])


def age_column(graph: Graph, asked: str | None = None) -> str | None:
    """The attribute that tells how old nodes are: the one asked for, else one called like it.

    Raises:
        SettingsError: if the attribute asked for is missing or is no number or date.
    """
    table = graph.attributes
    names: list[str] = [] if table is None else table.column_names
    if asked is not None:
        if table is None or asked not in names:
            have = f"there are {', '.join(map(visible, names))}" if names else "there are none"
            raise SettingsError(f"no node attribute is called {asked}; {have}")
        if not _ordered(table.column(asked).type):
            kind = table.column(asked).type
            raise SettingsError(f"the attribute {asked} is {kind}; an age is a number or a date")
        return asked
    for name in names:
        if table is not None and name.lower() in _AGE_WORDS and _ordered(table.column(name).type):
            return name
    return None


def _ordered(kind: pa.DataType) -> bool:
    return bool(
        pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_temporal(kind)
    )


def _age(graph: Graph, node: int, column: str) -> list[Reason]:
    assert graph.attributes is not None
    values = graph.attributes.column(column)
    mine = values[node]
    if not mine.is_valid:
        return []
    known = len(values) - values.null_count
    older = pc.sum(pc.less(values, mine)).as_py() or 0
    newer = pc.sum(pc.greater(values, mine)).as_py() or 0
    if newer >= older:
        words = f"older than {newer / known:.0%} of the nodes"
    else:
        words = f"newer than {older / known:.0%} of the nodes"
    return [Reason("age", f"{visible(column, 40)} {visible(str(mine), 40)}, {words}")]
