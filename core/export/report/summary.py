"""A report's answer in words."""

from __future__ import annotations

import math

from kingpost.core.export.digits import small
from kingpost.core.export.report.material import Material
from kingpost.core.export.table import name_text, rank_text
from kingpost.core.result import BoundKind, Result
from kingpost.core.standing import TIED
from kingpost.core.text import listed

TITLES = {
    "surfer": "random surfer",
    "katz": "Katz",
    "eigenvector": "eigenvector centrality",
    "degree": "strength (weighted degree)",
    "hits": "hubs and authorities",
    "votes": "votes",
}


def summary(material: Material) -> list[str]:
    """Who stands first, how sure that is, and whether the measures agree."""
    lines = [_first(material), _sure(material)]
    if material.within is not None:
        lines.append(f"Among peers: {material.within.words}.")
    lines += _others(material)
    if material.agreement is not None:
        lines += _agreement(material)
    return lines


def title_of(result: Result) -> str:
    """A measure as it is called in a sentence."""
    return TITLES.get(result.measure, result.measure)


def _first(material: Material) -> str:
    result, graph = material.leading, material.graph
    standing = result.standing if material.within is None else material.within.standing
    order = standing.order
    names = [name_text(graph.label(int(node))) for node in order[:5]]
    by = "peers, by " if material.within is not None else ""
    tied = 1
    while tied < len(order) and standing.rail[tied - 1] == TIED:
        tied += 1
    if tied > 1:
        who = listed([name_text(graph.label(int(node))) for node in order[:tied]], 4)
        return f"By {by}{title_of(result)}, {who} share the first {tied:,} of {graph.n:,} ranks."
    text = f"By {by}{title_of(result)}, {names[0]} stands first of {graph.n:,}"
    if standing.proven >= 1:
        text += ", which is proven"
    else:
        text += ", which is not proven: another may truly be first"
    return f"{text}; {listed(names[1:], 4)} follow." if names[1:] else f"{text}."


def _sure(material: Material) -> str:
    result, n = material.leading, material.graph.n
    standing = result.standing if material.within is None else material.within.standing
    proven = standing.proven
    if result.bound.kind is BoundKind.NONE or not math.isfinite(result.bound.value):
        return "No error bound is known, so nothing of the order is proven."
    if result.bound.kind is BoundKind.STATISTICAL:
        return "The scores are estimates with a standard error; no order is proven."
    how = (
        "The whole order is proven, ties included"
        if proven == n
        else f"The order of the first {proven:,} of {n:,} is proven, ties included"
        if proven
        else "Nothing of the order is proven"
    )
    error = small(result.bound.value)
    return f"{how}: the scores are within {error} of the exact ones, as a share of their sum."


def _others(material: Material) -> list[str]:
    graph = material.graph
    first: dict[str, list[str]] = {}
    for result in list(material.results.values())[1:]:
        if result.refusal is not None:
            continue
        node = int(result.standing.order[0])
        first.setdefault(name_text(graph.label(node)), []).append(title_of(result))
    lines = [f"First by {listed(by, 4)}: {name}." for name, by in first.items()]
    for result in material.results.values():
        if result.refusal is not None:
            lines.append(f"{title_of(result)} has no answer here: {result.refusal.sentence}.")
    return lines


def _agreement(material: Material) -> list[str]:
    found = material.agreement
    assert found is not None
    pairs = [pair for pair in found.pairs if not math.isnan(pair.tau_b)]
    if not pairs:
        return []
    best = max(pairs, key=lambda pair: pair.tau_b)
    worst = min(pairs, key=lambda pair: pair.tau_b)
    lines = []
    if best is worst:
        lines.append(
            f"{best.a} and {best.b} agree to a tau-b of {best.tau_b:.2f} (1 is the same order, 0 "
            f"none) and share {best.top:.0%} of their first {found.top:,}."
        )
    else:
        lines.append(
            f"The measures agree most between {best.a} and {best.b} (tau-b {best.tau_b:.2f}) and "
            f"least between {worst.a} and {worst.b} (tau-b {worst.tau_b:.2f}; 1 is the same order, "
            "0 none)."
        )
    if found.apart:
        row = found.apart[0]
        ranks = {name: rank_text(*row.ranks[name]) for name in (row.high, row.low)}
        name = material.graph.name(row.node, 60)
        lines.append(
            f"They differ most about {name}: {row.high} {ranks[row.high]}, {row.low} "
            f"{ranks[row.low]}."
        )
    return lines
