"""What each neighbour gives to a node's score: the terms of the equation the scores solve.

The equations stand in :mod:`kingpost.core.insight.terms`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from kingpost.core.graph import Floats, Graph, Neighbours
from kingpost.core.insight.terms import amounts, flow_of, has_terms
from kingpost.core.result import Result

_REST = {"surfer": "teleport", "katz": "beta"}


@dataclass(frozen=True)
class Contributions:
    """The feeders of one node, by falling contribution.

    Attributes:
        neighbours: node numbers, shape (k,); equal contributions by node number.
        weights: weight of each edge, shape (k,).
        amount: what each gives, in units of the score, shape (k,).
        share: ``amount`` over the node's score, shape (k,); zeros where the score is zero.
        parts: share of the score by origin; ``feeders`` is the sum of ``share``, the rest
            (``teleport`` of a surfer with what dangling nodes give, ``beta`` of Katz, else
            ``rest``) is the difference to 1 and absent where the measure has none.
        of_score: False for measures whose scores are no sum over neighbours: ``amount`` is then
            the weight, ``share`` its part of the weights of all feeders, ``parts`` empty.
    """

    neighbours: Neighbours
    weights: Floats
    amount: Floats
    share: Floats
    parts: Mapping[str, float]
    of_score: bool = True


def contributions(graph: Graph, result: Result, node: int) -> Contributions:
    """Split the score of ``node`` into what its neighbours give; O(k log k) in its k feeders.

    The first call on a weighted graph adds up all strengths, O(m), and keeps them.
    A refused result yields zeros.
    """
    near, weights = graph.pull(flow_of(result)).row(node)
    amount = amounts(graph, result, near, weights)
    order = np.argsort(-amount, kind="stable")
    amount = amount[order]
    near, weights = near[order], weights[order]
    if result.refusal is None and not has_terms(result):
        total = float(amount.sum())
        share = amount / total if total > 0.0 else np.zeros(len(amount))
        return Contributions(near, weights, amount, share, {}, of_score=False)
    score = float(result.scores[node])
    share = amount / score if score > 0.0 and np.isfinite(score) else np.zeros(len(amount))
    return Contributions(near, weights, amount, share, _parts(result, share, score))


def shares_given(graph: Graph, result: Result, node: int) -> tuple[Neighbours, Floats, Floats]:
    """Whom ``node`` gives score to: neighbours, weights, and the share of its weight each gets.

    All of shape (k,), by falling share, equal shares by node number.
    """
    near, weights = graph.push(flow_of(result)).row(node)
    order = np.argsort(-weights, kind="stable")
    total = float(weights.sum())
    share = weights / total if total > 0.0 else np.zeros(len(weights))
    return near[order], weights[order], share[order]


def _parts(result: Result, share: Floats, score: float) -> dict[str, float]:
    if not score > 0.0:
        return {}
    fed = float(share.sum())
    rest = _REST.get(result.measure)
    return {"feeders": fed} if rest is None else {"feeders": fed, rest: max(0.0, 1.0 - fed)}
