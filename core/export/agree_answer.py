"""How far measures agree, for every format."""

from __future__ import annotations

import math

from kingpost.core.export.answer import (
    Answer,
    Field,
    Sheet,
    graph_facts,
    nodes_field,
    reals,
    solve_facts,
    spans,
    texts,
)
from kingpost.core.export.heading import graph_line
from kingpost.core.export.table import rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.agree import Agreement, Apart
from kingpost.core.insight.terms import flow_of
from kingpost.core.result import Result


def agree_answer(graph: Graph, results: dict[str, Result], found: Agreement) -> Answer:
    """Sheets: ``pairs`` of measures, ``nodes`` they place furthest apart."""
    flow = flow_of(next(iter(results.values())))
    head = [
        graph_line(graph, flow),
        f"agreement of {', '.join(found.names)}; proven ties are ties",
        f"rbo: rank-biased overlap with p = {found.p:g} (the first {found.top:,} ranks have "
        f"{found.head_weight:.0%} of its weight); top: shared part of the first {found.top:,}",
    ]
    for name, why in found.refused.items():
        head.append(f"{name} has no answer here and is left out: {why}")
    tail = [_sentence(graph, row) for row in found.apart]
    facts = {
        **graph_facts(graph),
        "measures": {name: solve_facts(results[name]) for name in found.names},
        "refused": dict(found.refused),
        "p": found.p,
        "head_weight": found.head_weight,
        "top": found.top,
    }
    return Answer(head, [_pairs(found), _nodes(graph, found)], facts, tail)


def _pairs(found: Agreement) -> Sheet:
    pairs = found.pairs
    fields = [
        Field("a", texts([pair.a for pair in pairs]), "measure"),
        Field("b", texts([pair.b for pair in pairs]), "and"),
    ]
    for name, title in [("tau_b", "tau-b"), ("spearman",) * 2, ("rbo",) * 2, ("top",) * 2]:
        values = [float(getattr(pair, name)) for pair in pairs]
        shown = ["-" if math.isnan(value) else f"{value:.4f}" for value in values]
        fields.append(Field(name, reals(values), title, shown))
    return Sheet("pairs", fields)


def _nodes(graph: Graph, found: Agreement) -> Sheet:
    rows = found.apart
    fields = [nodes_field(graph.labels, [row.node for row in rows])]
    for name in found.names:
        fields += spans(f"{name}_rank", name, [row.ranks[name] for row in rows])
    fields += [
        Field("high", texts([row.high for row in rows])),
        Field("low", texts([row.low for row in rows])),
        Field("factor", reals([row.factor for row in rows]), "apart", [_times(r) for r in rows]),
        Field("reasons", texts([_words(row) for row in rows])),
    ]
    return Sheet("nodes", fields, "placed furthest apart, by rank (apart: worst over best)")


def _times(row: Apart) -> str:
    return f"{row.factor:,.0f}x" if row.factor >= 10 else f"{row.factor:.1f}x"


def _words(row: Apart) -> str:
    return "; ".join(reason.words for reason in row.reasons)


def _sentence(graph: Graph, row: Apart) -> str:
    name = graph.name(row.node, 60)
    high, low = (rank_text(*row.ranks[name]) for name in (row.high, row.low))
    return f"{name}: {row.high} {high}, {row.low} {low}. {_words(row)}"
