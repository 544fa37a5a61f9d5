"""Ranks along a parameter, for every format."""

from __future__ import annotations

import math

import numpy as np

from kingpost.core.export.answer import (
    Answer,
    Field,
    Sheet,
    graph_facts,
    nodes_field,
    read_only,
    reals,
    texts,
    whole,
)
from kingpost.core.export.data import settings as settings_facts
from kingpost.core.export.heading import graph_line, settings_words
from kingpost.core.export.table import rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.sweep import Change, Point, Sweep
from kingpost.core.measures.base import Settings
from kingpost.core.text import count, listed, visible

_COLUMNS = 8  # values shown side by side


def sweep_answer(
    graph: Graph, settings: Settings, found: Sweep, command_top: int | None = None
) -> Answer:
    """Sheets: ``ranks`` (a row for each value and node), ``values``, ``changes`` of the leader."""
    over = found.over
    flow = getattr(settings, "flow", None)
    rest = settings_words(settings).split(", ")
    told = ", ".join(word for word in rest if not word.startswith(f"{over.flag}="))
    head = [
        graph_line(graph, flow),
        f"{found.measure} along {over.flag}, {count(len(found.points), 'value')} from "
        f"{value_text(found.points[0].value)} to {value_text(found.points[-1].value)}"
        f"{', spaced by ratio' if over.log else ''}; the rest held: {told}; "
        f"weight: {visible(graph.origin.weight_words, 60)}",
        f"{count(len(found.nodes), 'node')} among the first {found.top:,} at some value; ranks as "
        "ranges where ties or error bounds leave them open",
    ]
    shown = len(found.nodes) if command_top is None else min(command_top, len(found.nodes))
    sheets = [_ranks(graph, found), _table(graph, found, shown), _values(graph, found)]
    if found.over.numeric:
        sheets.append(_changes(graph, found))
    tail = []
    if shown < len(found.nodes):
        tail.append(f"{len(found.nodes) - shown:,} more nodes (--format csv gives them)")
    tail += filter(None, (stable_words(graph, found), leader_words(graph, found)))
    tail += [
        f"no answer at {over.flag} {value_text(point.value)}: {point.refusal}"
        for point in found.points
        if point.refusal is not None
    ]
    facts = {
        **graph_facts(graph),
        "measure": found.measure,
        "settings": settings_facts(settings),
        "over": {
            "name": over.flag,
            "values": list(over.values),
            "spacing": "log" if over.log else "lin" if over.numeric else "choices",
        },
        "top": found.top,
        "always_first": [graph.label(int(node)) for node in found.nodes[found.always]],
        "same_order": found.same_order,
        "interval": None if math.isnan(found.interval) else found.interval,
        "interval_of": "logarithm of the ratio" if over.log else "difference",
        "halvings": found.halvings,
        "cut": found.cut,
    }
    return Answer(head, sheets, facts, tail)


def value_text(value: float | str) -> str:
    """A value of the parameter, safe to show."""
    return visible(value, 40) if isinstance(value, str) else f"{value:.4g}"


def _value(points: list[Point]) -> Field:
    values = [point.value for point in points]
    if any(isinstance(value, str) for value in values):
        return Field("value", texts([str(value) for value in values]), "value")
    return Field("value", reals(values), "value", [value_text(value) for value in values])


def _ranks(graph: Graph, found: Sweep) -> Sheet:
    """A row for each value and node."""
    width = len(found.nodes)
    points = [point for point in found.points for _ in range(width)]
    ends = found.ranks.reshape(-1, 2)
    fields = [
        _value(points),
        nodes_field(graph.labels, np.tile(found.nodes, len(found.points))),
        Field("rank_low", whole(ends[:, 0])),
        Field("rank_high", whole(ends[:, 1])),
        Field("score", reals(found.scores.ravel())),
    ]
    return Sheet("ranks", fields, read=False)


def _table(graph: Graph, found: Sweep, shown: int) -> Sheet:
    """Nodes downwards, some of the values across: to be read."""
    total = len(found.points)
    some = np.unique(np.linspace(0, total - 1, min(total, _COLUMNS)).round().astype(np.int64))
    fields = [nodes_field(graph.labels, found.nodes[:shown])]
    for index in some.tolist():
        ends = found.ranks[index, :shown].tolist()
        cells = ["-" if low < 0 else rank_text(low, high) for low, high in ends]
        fields.append(read_only(value_text(found.points[index].value), cells, ">"))
    heading = f"rank by {found.over.flag}"
    if len(some) < total:
        heading += f" ({len(some)} of {total:,} values)"
    return Sheet("table", fields, heading, data=False)


def _values(graph: Graph, found: Sweep) -> Sheet:
    points = list(found.points)
    leaders = nodes_field(graph.labels, [point.leader for point in points], "leader", "leader")
    fields = [
        _value(points),
        leaders,
        Field("error_bound", reals([point.error for point in points]), "error", [
            "-" if point.refusal else f"{point.error:.1e}" for point in points]),
        Field("sweeps", whole([point.sweeps for point in points]), "sweeps"),
        Field("method", texts([point.method for point in points]), "begun by"),
        Field("seconds", reals([point.seconds for point in points])),
        Field("refused", texts([point.refusal for point in points])),
    ]  # fmt: skip
    return Sheet("values", fields, "who is proven first at each value (- where nobody is)")


def _changes(graph: Graph, found: Sweep) -> Sheet:
    rows = found.changes
    fields = [
        Field("low", reals([row.low for row in rows]), "from", [f"{row.low:.8g}" for row in rows]),
        Field("high", reals([row.high for row in rows]), "to", [f"{row.high:.8g}" for row in rows]),
        nodes_field(graph.labels, [row.before for row in rows], "before", "leader before"),
        nodes_field(graph.labels, [row.after for row in rows], "after", "leader after"),
    ]
    return Sheet("changes", fields, "where the leader changes", read=bool(rows))


def stable_words(graph: Graph, found: Sweep) -> str:
    """How stable the first ranks are, in one sentence."""
    always = int(found.always.sum())
    words = (
        f"{always:,} of the first {found.top:,} are proven among them at every value"
        if always
        else f"no node is proven among the first {found.top:,} at every value"
    )
    if always:
        names = [graph.name(int(node), 40) for node in found.nodes[found.always]]
        words += f": {listed(names, 10)}"
    if found.same_order:
        many = f"{found.same_order:,} ranks are" if found.same_order > 1 else "rank is"
        words += f"; the first {many} held by the same throughout"
    return words


def leader_words(graph: Graph, found: Sweep) -> str:
    """Where the leader changes, in one sentence."""
    over = found.over
    if not over.numeric or math.isnan(found.interval):
        return ""
    unseen = "what comes and goes between two neighbouring values is not seen"
    if not found.changes:
        return f"the leader does not change from one value to the next; {unseen}"
    told = [_change_words(graph, change) for change in found.changes]
    width = f"{found.interval:.2g} wide"
    if over.log:
        width = f"a factor of 1 + {math.expm1(found.interval):.2g} wide"
    words = f"the leader changes {listed(told, 5)}; intervals are at most {width}; {unseen}"
    return f"{words}; the search was cut short" if found.cut else words


def _change_words(graph: Graph, change: Change) -> str:
    before, after = (
        "no proven one" if node < 0 else graph.name(node, 40)
        for node in (change.before, change.after)
    )
    return f"between {change.low:.8g} and {change.high:.8g} from {before} to {after}"
