"""Why a node scores what it scores: every term of its equation, and the paths supply comes by.

The terms are those of :mod:`kingpost.core.insight.terms`.  At the exact scores they sum to the
score exactly; at computed ones to within ``allowed``, which follows from the bound of the scores.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph, Neighbours
from kingpost.core.insight.terms import (
    KNOWN,
    amounts,
    edge_weights,
    factors,
    flow_of,
    has_terms,
    interval_reach,
    own_parts,
)
from kingpost.core.result import Result
from kingpost.core.watch import Watch

LEAST = 0.02  # share of the score that a supply path must carry
DEPTH = 6


@dataclass(frozen=True, slots=True)
class Path:
    """A way that score comes by: ``nodes`` from the far end to the node asked about, and the
    share of that node's score that flows along all of it."""

    nodes: tuple[int, ...]
    share: float


@dataclass(frozen=True)
class Why:
    """The terms of one node's score.

    Attributes:
        node, score: which node, and its score.
        neighbours, weights, amount, share: feeders by falling amount, shape (k,) each; amount
            in units of the score, share of the score (zeros where the score is zero).
        parts: what no neighbour gives, by name (``teleport``, ``dangling``, ``beta``).
        gap: score less the sum of all terms: what the solve left.
        allowed: the most ``|gap|`` can be by the bound of the scores; infinite without one.
        paths: the strongest supply paths of two edges or more, strongest first; None where
            negative terms leave shares without meaning.
    """

    node: int
    score: float
    neighbours: Neighbours
    weights: Floats
    amount: Floats
    share: Floats
    parts: Mapping[str, float]
    gap: float
    allowed: float
    paths: tuple[Path, ...] | None


@dataclass(frozen=True, slots=True)
class Term:
    """One line of a difference: a feeder (``node``) or a part by ``name`` (then node is -1).

    ``first`` and ``second`` are what it gives to the two nodes.
    """

    node: int
    name: str
    first: float
    second: float

    @property
    def difference(self) -> float:
        """What it adds to the first node's lead."""
        return self.first - self.second


@dataclass(frozen=True)
class Difference:
    """Why one node scores more than another, term by term, the weightiest term first.

    ``lead`` is the first score less the second; the differences of all terms add up to it,
    with the two gaps as a term of their own.  ``proven`` says whether the bound proves which of
    the two is higher.
    """

    first: Why
    second: Why
    lead: float
    terms: tuple[Term, ...]
    proven: bool


def require_terms(result: Result) -> None:
    """Refuse a result whose score is no sum of terms known here.

    Raises:
        SettingsError: naming the measures that have terms.
    """
    if result.refusal is not None:
        raise SettingsError(f"{result.measure} has no answer here: {result.refusal.sentence}")
    if not has_terms(result):
        raise SettingsError(
            f"the terms of {result.measure} are not known; ask about {', '.join(KNOWN)}"
        )


def why(
    graph: Graph,
    result: Result,
    node: int,
    *,
    least: float = LEAST,
    depth: int = DEPTH,
    watch: Watch | None = None,
) -> Why:
    """Take the score of ``node`` apart.

    Args:
        least: share of the score a supply path must carry, in (0, 1].
        depth: most edges of a supply path.

    Raises:
        SettingsError: for a result without known terms, or a ``least`` out of range.
    """
    require_terms(result)
    if not 0 < least <= 1:
        raise SettingsError(
            f"the least share of a path is {least:g}; it takes more than 0, up to 1"
        )
    near, weights = graph.pull(flow_of(result)).row(node)
    amount = _amounts(graph, result, node, near, weights)
    score = float(result.scores[node])
    parts = {} if _excluded(result, node) else own_parts(graph, result, node)
    gap = score - float(amount.sum()) - sum(parts.values())
    order = np.argsort(-amount, kind="stable")
    share = amount / score if score > 0 else np.zeros(len(amount))
    return Why(
        node,
        score,
        near[order],
        weights[order],
        amount[order],
        share[order],
        parts,
        gap,
        _allowed(graph, result, node, near, weights, amount, parts),
        _paths(graph, result, node, least, depth, watch or Watch()),
    )


def _excluded(result: Result, node: int) -> bool:
    """Whether the node's score is zero because the question leaves it out."""
    return result.exact_zero is not None and bool(result.exact_zero[node])


def _amounts(graph: Graph, result: Result, node: int, near: Neighbours, weights: Floats) -> Floats:
    if _excluded(result, node):
        return np.zeros(len(near))
    return amounts(graph, result, near, weights)


def _allowed(
    graph: Graph,
    result: Result,
    node: int,
    near: Neighbours,
    weights: Floats,
    amount: Floats,
    parts: Mapping[str, float],
) -> float:
    """Bound of the gap: the errors of the score and of what it is made from, and rounding."""
    size = abs(float(result.scores[node])) + float(np.abs(amount).sum())
    size += sum(map(abs, parts.values()))
    rounding = 4 * (len(near) + 16) * UNIT * size
    if result.measure == "degree":
        return rounding + float(interval_reach(result)[node])
    reach = interval_reach(result)
    flow = edge_weights(result, weights) * factors(graph, result, near)
    allowed = rounding + float(reach[node]) + float(np.abs(flow) @ reach[near])
    rho = result.facts.get("rho")
    if result.measure == "eigenvector" and isinstance(rho, tuple):
        allowed += (rho[1] - rho[0]) / rho[0] * float(np.abs(amount).sum())
    hanging = parts.get("dangling", 0.0)
    if hanging:
        push = graph.push(flow_of(result))
        dangling = push.offsets[1:] == push.offsets[:-1]
        mass = float(result.scores[dangling].sum())
        off = min(float(reach[dangling].sum()), _total_reach(result))
        allowed += hanging * (off / mass + graph.n * UNIT) if mass > 0 else 0.0
    return allowed


def _total_reach(result: Result) -> float:
    return float(result.bound.value) * float(np.abs(result.scores).sum())


def _paths(
    graph: Graph, result: Result, node: int, least: float, depth: int, watch: Watch
) -> tuple[Path, ...] | None:
    """Simple paths that carry at least ``least`` and that no longer one extends.

    At each length the shares of all paths add up to at most 1, so there are at most
    ``1 / least`` of each.
    """
    rows = graph.pull(flow_of(result))
    known: dict[int, tuple[NDArray[np.uint32], Floats] | None] = {}

    def feeders(head: int) -> tuple[NDArray[np.uint32], Floats] | None:
        if head not in known:
            near, weights = rows.row(head)
            score = float(result.scores[head])
            amount = _amounts(graph, result, head, near, weights)
            if (amount < 0).any() or (len(near) and score < 0):
                known[head] = None
            else:
                order = np.argsort(-amount, kind="stable")
                share = amount[order] / score if score > 0 else np.zeros(len(near))
                known[head] = near[order], share
        return known[head]

    ended: list[Path] = []
    open_: list[Path] = [Path((node,), 1.0)]
    while open_:
        watch.check()
        path = open_.pop()
        given = feeders(path.nodes[0])
        if given is None:
            return None
        near, share = given
        count = int(np.searchsorted(-share, -least / path.share * (1 - 1e-12), side="right"))
        longer = [
            Path((int(feeder), *path.nodes), path.share * float(part))
            for feeder, part in zip(near[:count], share[:count], strict=True)
            if int(feeder) not in path.nodes
        ]
        if longer and len(path.nodes) <= depth:
            open_ += longer
        elif len(path.nodes) > 2:
            ended.append(path)
    return tuple(sorted(ended, key=lambda path: (-path.share, path.nodes)))


def than(
    graph: Graph, result: Result, first: int, second: int, watch: Watch | None = None
) -> Difference:
    """Why ``first`` scores more (or less) than ``second``, term by term.

    Raises:
        SettingsError: for a result without known terms.
    """
    a, b = (why(graph, result, node, watch=watch) for node in (first, second))
    given: dict[int, list[float]] = {}
    for side, one in enumerate((a, b)):
        for feeder, amount in zip(one.neighbours.tolist(), one.amount.tolist(), strict=True):
            given.setdefault(feeder, [0.0, 0.0])[side] = amount
    terms = [Term(feeder, "", *pair) for feeder, pair in given.items()]
    names = dict.fromkeys((*a.parts, *b.parts))
    terms += [Term(-1, name, a.parts.get(name, 0.0), b.parts.get(name, 0.0)) for name in names]
    if a.gap or b.gap:
        terms.append(Term(-1, "residual", a.gap, b.gap))
    terms.sort(key=lambda term: (-abs(term.difference), term.node, term.name))
    low, high = result.bound.interval(result.scores)
    apart = low[first] > high[second] or low[second] > high[first]
    return Difference(a, b, a.score - b.score, tuple(terms), bool(apart))
