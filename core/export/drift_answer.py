"""What changed between two tables, for every format."""

from __future__ import annotations

import numpy as np

from kingpost.core.export.answer import (
    CAUTION,
    Answer,
    Field,
    Sheet,
    graph_facts,
    nodes_field,
    percent,
    reals,
    solve_facts,
    spans,
    texts,
    whole,
)
from kingpost.core.export.heading import graph_line, settings_words
from kingpost.core.export.table import name_text, rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.drift import FALLEN, GONE, KINDS, NEW, RISEN, Cause, Drift, EdgeChange
from kingpost.core.insight.terms import flow_of
from kingpost.core.result import Result
from kingpost.core.text import visible

_HEADINGS = {
    RISEN: "risen (times: the rank changed at least so much)",
    FALLEN: "fallen",
    NEW: "new",
    GONE: "gone",
}


def drift_answer(
    graphs: tuple[Graph, Graph], results: tuple[Result, Result], found: Drift, top: int | None
) -> Answer:
    """Sheets: ``moves`` (all that is new, gone, risen or fallen), ``edges`` behind the rises."""
    counts = found.counts()
    flow = flow_of(results[0])
    head = [
        f"before  {graph_line(graphs[0], flow)}",
        f"after   {graph_line(graphs[1], flow)}",
        f"{results[0].measure}  {settings_words(results[0].settings)}  "
        f"weight: {visible(graphs[0].origin.weight_words, 60)}",
        f"{counts['risen']:,} risen, {counts['fallen']:,} fallen, {counts['new']:,} new, "
        f"{counts['gone']:,} gone; {counts['same']:,} where the ranks possible before and after "
        "overlap: no change",
    ]
    kinds = (RISEN, FALLEN, NEW, GONE)
    everything = np.concatenate([found.ordered(kind, top) for kind in kinds])
    sheets = [_moves("moves", found, everything, read=False)]
    for kind in kinds:
        places = found.ordered(kind, top)
        if len(places):
            sheets.append(_moves(KINDS[kind], found, places, kind))
    sheets.append(_edges(found))
    facts = {
        "before": {**graph_facts(graphs[0]), "solve": solve_facts(results[0])},
        "after": {**graph_facts(graphs[1]), "solve": solve_facts(results[1])},
        "counts": dict(counts),
        "sentences": [cause_sentence(found, cause) for cause in found.causes],
    }
    tail = [cause_sentence(found, cause) for cause in found.causes]
    for kind in kinds:
        left = counts[KINDS[kind]] - len(found.ordered(kind, top))
        if left:
            tail.append(f"{left:,} more {KINDS[kind]} (--top N, --top all)")
    return Answer(head, sheets, facts, [*tail, CAUTION])


def _moves(name: str, found: Drift, places: np.ndarray, kind: int = 0, read: bool = True) -> Sheet:
    times = [
        f"{factor:,.0f}x" if factor >= 10 else f"{factor:.2f}x"
        for factor in (found.factor[places].tolist() if read else [])
    ]
    before, after = (
        list(map(tuple, side[places].tolist())) for side in (found.before, found.after)
    )
    node = nodes_field(found.ids.labels, places)
    fields = (
        [node] if read else [Field("change", texts([KINDS[k] for k in found.kind[places]])), node]
    )
    if read:
        hidden = {NEW: "before", GONE: "after"}.get(kind)
        fields += [item for item in spans("rank_before", "before", before) if hidden != "before"]
        fields += [item for item in spans("rank_after", "after", after) if hidden != "after"]
        if kind in (RISEN, FALLEN):
            fields.append(Field("factor", reals(found.factor[places]), "times", times))
        return Sheet(name, fields, _HEADINGS[kind], data=False)
    for title, side in (("before", found.before), ("after", found.after)):
        fields.append(Field(f"rank_{title}_low", whole(side[places, 0])))
        fields.append(Field(f"rank_{title}_high", whole(side[places, 1])))
    fields += [
        Field("score_before", reals(found.scores[places, 0])),
        Field("score_after", reals(found.scores[places, 1])),
        Field("factor", reals(found.factor[places])),
    ]
    return Sheet(name, fields, read=False)


def _edges(found: Drift) -> Sheet:
    rows = [(cause, edge) for cause in found.causes for edge in cause.edges]
    labels = found.ids.labels
    shares = [edge.change / cause.rise if cause.rise else 0.0 for cause, edge in rows]
    fields = [
        nodes_field(labels, [cause.node for cause, _ in rows], "node", "node"),
        nodes_field(labels, [edge.feeder for _, edge in rows], "feeder", "fed by"),
        Field("edge", texts([edge.edge for _, edge in rows]), "edge"),
        Field("before", reals([edge.before for _, edge in rows])),
        Field("after", reals([edge.after for _, edge in rows])),
        Field("change", reals([edge.change for _, edge in rows])),
        Field("of_rise", reals(shares), "of the rise", [percent(part) for part in shares]),
        _part("by_edge", "by the edge", [(e.by_edge, c.rise) for c, e in rows]),
        _part("by_feeder", "by its score", [(e.by_feeder, c.rise) for c, e in rows]),
    ]
    heading = "what the biggest rises come from: the edge passes on more, or the feeder has more"
    return Sheet("edges", fields, heading, read=bool(rows))


def _part(name: str, title: str, values: list[tuple[float, float]]) -> Field:
    shown = [percent(part / whole_) if whole_ else "-" for part, whole_ in values]
    return Field(name, reals([part for part, _ in values]), title, shown)


def cause_sentence(found: Drift, cause: Cause) -> str:
    """Why one node rose, in one sentence."""
    name = _name(found, cause.node)
    after = rank_text(*found.after[cause.node].tolist())
    if found.before[cause.node, 0] < 0:
        start = f"{name} is new, at rank {after}"
    else:
        start = f"{name} rose from rank {rank_text(*found.before[cause.node].tolist())} to {after}"
    gains = [edge for edge in cause.edges if edge.change * cause.rise > 0]
    gains = [edge for edge in gains if abs(edge.change) >= 0.05 * abs(cause.rise)][:3]
    if not cause.rise > 0 or not gains:
        return f"{start}; no single feeder accounts for it"
    words = [
        f"{percent(edge.change / cause.rise)} from {_name(found, edge.feeder)}, {_how(edge)}"
        for edge in gains
    ]
    if cause.new_edges > 1 and cause.by_new > 0:
        many = f"{percent(cause.by_new / cause.rise)} over {cause.new_edges:,} new edges"
        words.insert(0, many)
    return f"{start}; of what it gained, {'; '.join(words)}"


def _how(edge: EdgeChange) -> str:
    told = {"new": "whose edge is new", "gone": "whose edge is gone"}.get(edge.edge)
    if told is not None:
        return told
    return "whose edge carries more" if edge.by_edge >= edge.by_feeder else "whose own score rose"


def _name(found: Drift, place: int) -> str:
    return visible(name_text(found.ids.labels[place].as_py()), 60)
