"""What each neighbour gives to a node's score: the terms of the equation the scores solve.

With pull row i (whom the score comes from), weight w_ji and score x_j of neighbour j:

* degree      x_i = sum_j w_ji
* surfer      x_i = d sum_j w_ji x_j / out_j + teleport and dangling parts
* katz        x_i = alpha sum_j w_ji x_j + beta_i
* eigenvector x_i = (1 / rho) sum_j w_ji x_j

where out_j is the strength of j on the side its score leaves by.
"""

from __future__ import annotations

import weakref
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Floats, Flow, Graph, Neighbours
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
    """

    neighbours: Neighbours
    weights: Floats
    amount: Floats
    share: Floats
    parts: Mapping[str, float]


def contributions(graph: Graph, result: Result, node: int) -> Contributions:
    """Split the score of ``node`` into what its neighbours give; O(k log k) in its k feeders.

    The first call on a weighted graph adds up all strengths, O(m), and keeps them.
    A refused result yields zeros.
    """
    flow: Flow = getattr(result.settings, "flow", "along")
    near, weights = graph.pull(flow).row(node)
    amount = _amounts(graph, result, flow, near, weights)
    order = np.argsort(-amount, kind="stable")
    amount = amount[order]
    score = float(result.scores[node])
    share = amount / score if score > 0.0 and np.isfinite(score) else np.zeros(len(amount))
    return Contributions(near[order], weights[order], amount, share, _parts(result, share, score))


def shares_given(graph: Graph, result: Result, node: int) -> tuple[Neighbours, Floats, Floats]:
    """Whom ``node`` gives score to: neighbours, weights, and the share of its weight each gets.

    All of shape (k,), by falling share, equal shares by node number.
    """
    flow: Flow = getattr(result.settings, "flow", "along")
    near, weights = graph.push(flow).row(node)
    order = np.argsort(-weights, kind="stable")
    total = float(weights.sum())
    share = weights / total if total > 0.0 else np.zeros(len(weights))
    return near[order], weights[order], share[order]


def _amounts(graph: Graph, result: Result, flow: Flow, near: Neighbours, weights: Floats) -> Floats:
    scores = result.scores[near]
    if not np.isfinite(scores).all():
        return np.zeros(len(near))
    if result.measure == "surfer":
        damping = float(_fact(result, "damping", 0.85))
        out = _strengths(graph.push(flow), near)
        return damping * weights * scores / np.where(out > 0.0, out, 1.0)
    if result.measure == "katz":
        return float(_fact(result, "alpha", 0.0)) * weights * scores
    if result.measure == "eigenvector":
        rho = float(_fact(result, "rho", 0.0))
        return weights * scores / rho if rho > 0.0 else np.zeros(len(near))
    return weights.astype(np.float64)


def _fact(result: Result, name: str, otherwise: float) -> float:
    value = result.facts.get(name)
    if value is None:
        value = getattr(result.settings, name, None)
    if isinstance(value, tuple):  # a bracket: its middle
        value = sum(value) / len(value)
    return otherwise if value is None else float(value)


def _parts(result: Result, share: Floats, score: float) -> dict[str, float]:
    if not score > 0.0:
        return {}
    fed = float(share.sum())
    rest = _REST.get(result.measure)
    return {"feeders": fed} if rest is None else {"feeders": fed, rest: max(0.0, 1.0 - fed)}


_KEPT: dict[int, tuple[weakref.ref[NDArray[np.int64]], Floats]] = {}


def _strengths(adjacency: Adjacency, rows: Neighbours) -> Floats:
    """Strength of some rows.  All strengths of a weighted graph are added once and kept for as
    long as its offsets live."""
    if adjacency.weights is None:
        ends = adjacency.offsets[rows.astype(np.int64) + 1]
        return (ends - adjacency.offsets[rows]).astype(np.float64)
    key = id(adjacency.offsets)
    kept = _KEPT.get(key)
    if kept is None or kept[0]() is not adjacency.offsets:
        reference = weakref.ref(adjacency.offsets, lambda _: _KEPT.pop(key, None))
        kept = (reference, adjacency.strengths())
        _KEPT[key] = kept
    return kept[1][rows]
