"""Why a node scores what it scores, for every format."""

from __future__ import annotations

import numpy as np

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
from kingpost.core.export.digits import score_texts, small
from kingpost.core.export.heading import graph_line, settings_words
from kingpost.core.export.table import rank_text
from kingpost.core.graph import Graph
from kingpost.core.insight.terms import flow_of, interval_reach
from kingpost.core.insight.why import Difference, Term, Why
from kingpost.core.result import Result
from kingpost.core.text import count, visible

PARTS = {
    "teleport": "jumps that land here",
    "dangling": "walkers from nodes without out-edges",
    "beta": "what the node has of itself",
    "residual": "what the solve left, within its bound",
}


def why_answer(graph: Graph, result: Result, found: Why, top: int | None) -> Answer:
    """Sheets: ``terms`` (feeders and parts), supply ``paths``."""
    shown = len(found.neighbours) if top is None else min(top, len(found.neighbours))
    sheets = [_terms(graph, result, found, shown)]
    if found.paths:
        sheets.append(_paths(graph, found))
    tail = [_sum_sentence(found)]
    if shown < len(found.neighbours):
        rest = float(found.share[shown:].sum())
        more = count(len(found.neighbours) - shown, "more feeder")
        tail.insert(0, f"{more} give {rest:.1%} together (--top N, --top all)")
    if found.paths is None:
        tail.append("negative terms leave shares of a path without meaning: no paths are given")
    facts = {
        **graph_facts(graph),
        **solve_facts(result),
        "node": graph.label(found.node),
        "rank": list(result.standing.range_of(found.node)),
        "score": found.score,
        "parts": dict(found.parts),
        "gap": found.gap,
        "gap_allowed": found.allowed,
    }
    head = [*_head(graph, result), _place(graph, result, found)]
    return Answer(head, sheets, facts, tail)


def _head(graph: Graph, result: Result) -> list[str]:
    return [
        graph_line(graph, flow_of(result)),
        f"{result.measure}  {settings_words(result.settings)}  "
        f"weight: {visible(graph.origin.weight_words, 60)}",
    ]


def _place(graph: Graph, result: Result, found: Why) -> str:
    rank = rank_text(*result.standing.range_of(found.node))
    score = _score(result, found.node)
    fed = float(found.amount.sum()) / found.score if found.score > 0 else 0.0
    words = f"{graph.name(found.node, 60)}  rank {rank} of {graph.n:,}  {result.measure} {score}"
    if found.score > 0:
        own = [f"{name} {part / found.score:.1%}" for name, part in found.parts.items() if part]
        words += f"  feeders {fed:.1%}" + "".join(f"  {word}" for word in own)
    return words


def _score(result: Result, node: int) -> str:
    score, reach = result.scores[node], interval_reach(result)[node]
    value = np.array([score])
    return score_texts(value, value - reach, value + reach)[0]


def _terms(graph: Graph, result: Result, found: Why, shown: int) -> Sheet:
    near = found.neighbours[:shown].astype(np.int64).tolist()
    own = [(name, part) for name, part in found.parts.items() if part]
    amount = [*found.amount[:shown].tolist(), *(part for _, part in own)]
    share = [value / found.score if found.score > 0 else 0.0 for value in amount]
    rows = [*near, *([-1] * len(own))]
    names = [graph.name(node, 200) or '""' for node in near]
    names += [f"({PARTS[name]})" for name, _ in own]
    node = nodes_field(graph.labels, rows)
    ranks = [result.standing.range_of(node) for node in near] + [(-1, -1)] * len(own)
    weights = [*found.weights[:shown].tolist(), *([None] * len(own))]
    kinds = ["feeder"] * len(near) + [name for name, _ in own]
    fields = [
        Field("term", texts(kinds)),
        Field(node.name, node.values, "what gives", names, align="<", least=12),
        Field("share", reals(share), "share", [f"{part:.1%}" for part in share]),
        Field("amount", reals(amount), "amount", [f"{part:.4g}" for part in amount]),
        Field("weight", reals(weights), "weight"),
        *spans("rank", "rank", ranks),
    ]
    return Sheet("terms", fields)


def _paths(graph: Graph, found: Why) -> Sheet:
    rows = found.paths or ()
    ways = [" > ".join(graph.name(node, 60) for node in path.nodes) for path in rows]
    fields = [
        Field("share", reals([p.share for p in rows]), "share", [f"{p.share:.1%}" for p in rows]),
        Field("path", texts(ways), "supply path", least=20),
    ]
    return Sheet("paths", fields, "strongest supply paths, from the far end")


def _sum_sentence(found: Why) -> str:
    if not np.isfinite(found.allowed):
        return f"the terms sum to the score but for {found.gap:.1e}; the scores have no bound"
    return (
        f"the terms sum to the score but for {found.gap:.1e}, of at most {small(found.allowed)} "
        "that the error bound allows"
    )


def than_answer(graph: Graph, result: Result, found: Difference, top: int | None) -> Answer:
    """One sheet, ``terms``: what each term gives to the two nodes, and the difference."""
    terms = found.terms if top is None else found.terms[:top]
    first, second = (graph.name(one.node, 60) for one in (found.first, found.second))
    names = [_term_name(graph, term) for term in terms]
    node = nodes_field(graph.labels, [term.node for term in terms])
    part = [abs(term.difference / found.lead) if found.lead else 0.0 for term in terms]
    fields = [
        Field("term", texts([term.name or "feeder" for term in terms])),
        Field(node.name, node.values, "what gives", names, align="<", least=12),
        _amount("first", f"to {first}", [term.first for term in terms]),
        _amount("second", f"to {second}", [term.second for term in terms]),
        _amount("difference", "difference", [term.difference for term in terms]),
        Field("of_lead", reals(part), "of the lead", [f"{value:.0%}" for value in part]),
    ]
    facts = {
        **graph_facts(graph),
        **solve_facts(result),
        "node": graph.label(found.first.node),
        "than": graph.label(found.second.node),
        "ranks": [list(result.standing.range_of(n.node)) for n in (found.first, found.second)],
        "scores": [found.first.score, found.second.score],
        "lead": found.lead,
        "proven": found.proven,
        "sentence": than_sentence(graph, result, found),
    }
    tail = []
    if len(terms) < len(found.terms):
        rest = sum(term.difference for term in found.terms[len(terms) :])
        tail.append(f"{len(found.terms) - len(terms):,} more terms make up {rest:.4g}")
    head = [*_head(graph, result), than_sentence(graph, result, found)]
    return Answer(head, [Sheet("terms", fields)], facts, tail)


def _amount(name: str, title: str, values: list[float]) -> Field:
    return Field(name, reals(values), title, [f"{value:.4g}" for value in values], least=10)


def _term_name(graph: Graph, term: Term) -> str:
    return graph.name(term.node, 200) or '""' if term.node >= 0 else f"({PARTS[term.name]})"


def than_sentence(graph: Graph, result: Result, found: Difference) -> str:
    """Why the first node stands where it does against the second, in one sentence."""
    first, second = (graph.name(one.node, 60) for one in (found.first, found.second))
    ranks = [rank_text(*result.standing.range_of(n.node)) for n in (found.first, found.second)]
    place = f"{first} (rank {ranks[0]}) and {second} (rank {ranks[1]})"
    if found.first.node == found.second.node or not found.lead:
        return f"{place} have the same score"
    if not found.proven:
        return f"{place} are not proven apart: the error bound is larger than their difference"
    ahead, behind = (first, second) if found.lead > 0 else (second, first)
    lead = abs(found.lead)
    sign = 1.0 if found.lead > 0 else -1.0
    telling = [term for term in found.terms if abs(term.difference) >= 0.01 * lead]
    helps = [term for term in telling if term.difference * sign > 0][:3]
    hurts = [term for term in telling if term.difference * sign < 0][:2]
    from_whom = _listed(graph, helps, lead) if helps else "many, each little"
    words = f"{place}: {ahead} leads by {lead:.4g}. It gets more from {from_whom}"
    if hurts:
        words += f"; {behind} gets more from {_listed(graph, hurts, lead)}"
    return words


def _listed(graph: Graph, terms: list[Term], lead: float) -> str:
    return ", ".join(
        f"{_term_name(graph, term)} ({abs(term.difference) / lead:.0%} of the lead)"
        for term in terms
    )
