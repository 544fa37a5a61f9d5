"""What a trial found, and what the loss of each top node would do, for every format."""

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
from kingpost.core.export.table import rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.drift import FALLEN, KINDS, RISEN
from kingpost.core.insight.edit import Edit, Ints
from kingpost.core.insight.loss import Loss
from kingpost.core.insight.terms import flow_of
from kingpost.core.insight.trial import Trial
from kingpost.core.result import Result
from kingpost.core.text import count, listed, visible

STRUCTURE = (
    "this is structure, not traffic engineering: the table knows nothing of capacity, retries, "
    "fallbacks or time-outs, and rank is not load"
)
_HEADINGS = {
    RISEN: "risen (times: the rank changed at least so much)",
    FALLEN: "fallen",
}
_NAMED = 5


def trial_answer(graph: Graph, result: Result, found: Trial, top: int | None) -> Answer:
    """Sheets: ``standings`` after the change, ``moves`` (all that rose or fell)."""
    everything = found.first(top)
    moved = np.concatenate([found.ordered(kind, top) for kind in (RISEN, FALLEN)])
    sheets = [
        _standings(graph, found, everything),
        _moves("moves", graph, found, moved, data=True),
    ]
    for kind in (RISEN, FALLEN):
        places = found.ordered(kind, top)
        if len(places):
            sheets.append(_moves(KINDS[kind], graph, found, places, data=False, heading=kind))
    after = found.result
    counts = {KINDS[kind]: int((found.kind == kind).sum()) for kind in (RISEN, FALLEN)}
    same = len(found.nodes) - sum(counts.values())
    head = [
        *_head(graph, result),
        f"trial: {edit_words(graph, found.edit)}",
        f"{found.method}, {found.edge_visits:,} edge visits "
        f"({found.edge_visits / max(graph.stored, 1):.2g} passes over the edges); "
        f"{after.bound.kind.value} error of at most {after.bound.value:.1e} of the scores",
        f"{counts['risen']:,} risen, {counts['fallen']:,} fallen; {same:,} where the ranks "
        "possible before and after overlap: no change",
        f"ranks count the {count(len(found.nodes), 'node')} that stay: a gap that closes is no "
        "rise",
    ]
    tail = [moved_words(found)]
    for kind in (RISEN, FALLEN):
        left = counts[KINDS[kind]] - len(found.ordered(kind, top))
        if left:
            tail.append(f"{left:,} more {KINDS[kind]} (--top N, --top all)")
    tail += _held(result)
    facts = {
        **graph_facts(graph),
        "before": solve_facts(result),
        "after": {
            "stop": after.stop.value,
            "error_bound": float(after.bound.value),
            "bound_kind": after.bound.kind.value,
            "method": found.method,
            "edge_visits": found.edge_visits,
            "seconds": after.seconds.solve,
        },
        "trial": edit_facts(graph, found.edit),
        "counts": {**counts, "same": same},
        "share_taken_out": found.share,
        "mass_moved": found.moved,
        "mass_moved_error": found.moved_error,
    }
    return Answer(head, sheets, facts, [*tail, STRUCTURE, CAUTION])


def _head(graph: Graph, result: Result) -> list[str]:
    return [
        graph_line(graph, flow_of(result)),
        f"{result.measure}  {settings_words(result.settings)}  "
        f"weight: {visible(graph.origin.weight_words, 60)}",
    ]


def _held(result: Result) -> list[str]:
    if result.measure != "katz":
        return []
    return ["alpha is held at what it is on the whole graph, so that scores can be compared"]


def edit_words(graph: Graph, edit: Edit) -> str:
    """What was changed, in words."""
    parts = []
    if edit.nodes:
        names = [graph.name(node, 60) for node in edit.nodes]
        parts.append(f"without {listed(names, _NAMED)}")
    gone, scaled = [], []
    for source, target, factor in zip(edit.sources, edit.targets, edit.factors, strict=True):
        if not graph.directed and source > target:
            continue
        words = f"{graph.name(source, 60)} -> {graph.name(target, 60)}"
        if factor == 0:
            gone.append(words)
        else:
            scaled.append(f"{words} times {factor:g}")
    if gone:
        parts.append(f"without the edges {listed(gone, _NAMED)}")
    if scaled:
        parts.append(f"with {listed(scaled, _NAMED)}")
    return "; ".join(parts) or "nothing changed"


def edit_facts(graph: Graph, edit: Edit) -> dict[str, object]:
    """What was changed, for json."""
    ends = zip(edit.sources, edit.targets, edit.factors, strict=True)
    return {
        "without": [graph.label(node) for node in edit.nodes],
        "edges": [
            {"source": graph.label(u), "target": graph.label(v), "factor": factor}
            for u, v, factor in ends
        ],
    }


def moved_words(found: Trial) -> str:
    """How much of the rank mass moves, in one sentence."""
    words = ""
    if found.edit.nodes:
        words = f"what is taken out held {percent(found.share, 2)} of all score; "
    return (
        f"{words}{percent(found.moved, 2)} of the rank mass of the others comes to lie elsewhere "
        f"(to within {found.moved_error:.1e})"
    )


def _columns(graph: Graph, found: Trial, places: Ints) -> list[Field]:
    before, after = (
        list(map(tuple, side[places].tolist())) for side in (found.before, found.after)
    )
    return [
        nodes_field(graph.labels, found.nodes[places]),
        *spans("rank_before", "before", before),
        *spans("rank_after", "after", after),
    ]


def _standings(graph: Graph, found: Trial, places: Ints) -> Sheet:
    node, *ranks = _columns(graph, found, places)
    kinds = [KINDS[kind] for kind in found.kind[places].tolist()]
    scores = found.scores[places]
    fields = [
        node,
        *ranks,
        Field("change", texts(kinds), "change", ["" if kind == "same" else kind for kind in kinds]),
        Field("score_before", reals(scores[:, 0]), "score before"),
        Field("score_after", reals(scores[:, 1]), "score after"),
    ]
    return Sheet("standings", fields, "first after the change")


def _moves(
    name: str, graph: Graph, found: Trial, places: Ints, *, data: bool, heading: int = RISEN
) -> Sheet:
    factors = found.factor[places]
    times = [f"{value:,.0f}x" if value >= 10 else f"{value:.2f}x" for value in factors.tolist()]
    node, *ranks = _columns(graph, found, places)
    kinds = texts([KINDS[kind] for kind in found.kind[places].tolist()])
    fields = [node, Field("change", kinds), *ranks, Field("factor", reals(factors), "times", times)]
    return Sheet(name, fields, _HEADINGS[heading], read=not data, data=data)


def losses_answer(
    graph: Graph, result: Result, rows: tuple[Loss, ...], tol: float | None = None
) -> Answer:
    """Sheets: ``losses`` (one row a node), ``risers`` (who rises without it)."""
    head = [
        *_head(graph, result),
        f"what the loss of each of the first {len(rows):,} would do, one at a time",
        "reach it: nodes from which edges lead to it; cut off: those that lose every way to what "
        "it leads to. leads to: nodes it leads to; cut off: those that lose every way from those "
        "that reached it",
    ]
    facts = {
        **graph_facts(graph),
        "before": solve_facts(result),
        "tol_after": tol,
        "sentences": [loss_words(graph, row) for row in rows],
    }
    tail = [*(loss_words(graph, row) for row in rows), *_held(result)]
    sheets = [_losses(graph, rows), _risers(graph, rows)]
    return Answer(head, sheets, facts, [*tail, STRUCTURE, CAUTION])


def _losses(graph: Graph, rows: tuple[Loss, ...]) -> Sheet:
    ways = [row.ways for row in rows]
    moved = ["-" if row.refusal else percent(row.moved, 2) for row in rows]
    fields = [
        nodes_field(graph.labels, [row.node for row in rows]),
        *spans("rank", "rank", [row.rank for row in rows]),
        Field("share", reals([r.share for r in rows]), "held", [percent(r.share, 1) for r in rows]),
        Field("upstream", whole([way.upstream for way in ways]), "reach it"),
        Field("cut_upstream", whole([way.cut_upstream for way in ways]), "cut off"),
        Field("downstream", whole([way.downstream for way in ways]), "leads to"),
        Field("cut_downstream", whole([way.cut_downstream for way in ways]), "cut off"),
        Field("moved", reals([row.moved for row in rows]), "moved", moved),
        Field("moved_error", reals([row.moved_error for row in rows])),
        Field("risen", whole([row.risen for row in rows]), "risen"),
        Field("fallen", whole([row.fallen for row in rows]), "fallen"),
        Field("error_bound", reals([row.error for row in rows])),
        Field("method", texts([row.method for row in rows])),
        Field("refused", texts([row.refusal for row in rows])),
    ]
    return Sheet("losses", fields)


def _risers(graph: Graph, rows: tuple[Loss, ...]) -> Sheet:
    pairs = [(row, riser) for row in rows for riser in row.risers]
    fields = [
        nodes_field(graph.labels, [row.node for row, _ in pairs], "lost", "without"),
        nodes_field(graph.labels, [riser.node for _, riser in pairs], "node", "rises"),
        *spans("rank_before", "before", [riser.before for _, riser in pairs]),
        *spans("rank_after", "after", [riser.after for _, riser in pairs]),
    ]
    heading = "biggest rises; ranks count the nodes that stay: a gap that closes is no rise"
    return Sheet("risers", fields, heading, read=bool(pairs))


def loss_words(graph: Graph, row: Loss) -> str:
    """What the loss of one node would do, in one sentence."""
    name = graph.name(row.node, 60)
    ways = row.ways
    words = f"without {name} (rank {rank_text(*row.rank)}), {count(ways.upstream, 'node')} lose it"
    if ways.cut_upstream:
        words += f", {ways.cut_upstream:,} of them every way to what it leads to"
    if row.refusal is not None:
        return f"{words}; the measure has no answer then: {row.refusal}"
    words += f"; {percent(row.moved, 2)} of the rank mass of the others moves"
    if not row.risers:
        return f"{words}, no node rises beyond the uncertainty"
    first = row.risers[0]
    return (
        f"{words}, and {graph.name(first.node, 60)} rises from rank {rank_text(*first.before)} to "
        f"{rank_text(*first.after)}"
    )
