"""The equation that the scores of a result solve, as terms: what each edge gives, and the rest.

With pull row i (whom the score comes from), weight w_ji and score x_j of neighbour j:

* degree        x_i = sum_j w_ji (or the number of j)
* surfer        x_i = d sum_j w_ji x_j / out_j + (1 - d) v_i + d (sum of dangling x) u_i
* katz          x_i = alpha sum_j w_ji x_j + beta_i
* eigenvector   x_i = (1 / rho) sum_j w_ji x_j

where out_j is the strength of j on the side its score leaves by, v the teleport vector and u
where walkers from dangling nodes go.
"""

from __future__ import annotations

import weakref
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Floats, Flow, Graph, Neighbours
from kingpost.core.result import Result

KNOWN = ("surfer", "katz", "eigenvector", "degree")


def flow_of(result: Result) -> Flow:
    """The way score flows in a result."""
    flow: Flow = getattr(result.settings, "flow", "along")
    return flow


def has_terms(result: Result) -> bool:
    """Whether the scores solve an equation whose terms are known here."""
    return result.refusal is None and result.measure in KNOWN


def edge_weights(result: Result, weights: Floats) -> Floats:
    """The weights as the measure takes them: 1 each where degree counts edges."""
    if result.measure == "degree" and getattr(result.settings, "counting", "") == "edges":
        return np.ones(len(weights))
    return weights


def factors(graph: Graph, result: Result, nodes: Neighbours) -> Floats:
    """What a unit of score at each of ``nodes`` gives along an edge of weight 1, shape (k,).

    For degree, and any measure not known here, 1 whatever the score.
    """
    if result.measure == "surfer":
        damping = fact(result, "damping", 0.85)
        out = strengths(graph.push(flow_of(result)), nodes)
        return damping / np.where(out > 0.0, out, 1.0)
    if result.measure == "katz":
        return np.full(len(nodes), fact(result, "alpha", 0.0))
    if result.measure == "eigenvector":
        rho = fact(result, "rho", 0.0)
        return np.full(len(nodes), 1.0 / rho if rho > 0.0 else 0.0)
    return np.ones(len(nodes))


def carried(result: Result, nodes: Neighbours) -> Floats:
    """The score that flows out of ``nodes``: 1 each for degree and measures not known here."""
    if result.measure in ("surfer", "katz", "eigenvector"):
        scores: Floats = result.scores[nodes]
        return scores
    return np.ones(len(nodes))


def amounts(graph: Graph, result: Result, near: Neighbours, weights: Floats) -> Floats:
    """What each of ``near`` gives over an edge of each of ``weights``, shape (k,)."""
    given = carried(result, near)
    if not np.isfinite(given).all():
        return np.zeros(len(near))
    return edge_weights(result, weights) * factors(graph, result, near) * given


def own_parts(graph: Graph, result: Result, node: int) -> dict[str, float]:
    """The terms of a node's score that no neighbour gives, by name, in units of the score."""
    if result.measure == "katz":
        return {"beta": float(_entry(graph, getattr(result.settings, "beta", 1.0), node, False))}
    if result.measure != "surfer":
        return {}
    settings = result.settings
    damping = fact(result, "damping", 0.85)
    teleport = _entry(graph, getattr(settings, "teleport", None), node, True)
    target = getattr(settings, "dangling", "teleport")
    if isinstance(target, str):
        landing = 1.0 / graph.n if target == "uniform" else teleport
    else:
        landing = _entry(graph, target, node, True)
    hanging = _dangling_mass(graph, result)
    return {"teleport": (1.0 - damping) * teleport, "dangling": damping * hanging * landing}


def _entry(graph: Graph, value: Any, node: int, share: bool) -> float:
    """One entry of a vector that a setting names."""
    from kingpost.core.measures.vectors import distribution, node_vector

    if value is None:
        return 1.0 / graph.n
    if isinstance(value, int | float):
        return float(value)
    read = distribution if share else node_vector
    return float(read(graph, value, "the vector")[node])


def _dangling_mass(graph: Graph, result: Result) -> float:
    push = graph.push(flow_of(result))
    return float(result.scores[push.offsets[1:] == push.offsets[:-1]].sum())


def fact(result: Result, name: str, otherwise: float) -> float:
    """A number the solve found out, else the setting of that name; the middle of a bracket."""
    value = result.facts.get(name)
    if value is None:
        value = getattr(result.settings, name, None)
    if isinstance(value, tuple):
        value = sum(value) / len(value)
    return otherwise if value is None else float(value)


def interval_reach(result: Result) -> Floats:
    """How far each score may be from the exact one, shape (n,); infinity where nothing is known."""
    low, high = result.bound.interval(result.scores)
    reach: Floats = np.maximum(high - result.scores, result.scores - low)
    if result.exact_zero is not None:
        reach[result.exact_zero] = 0.0
    return reach


_KEPT: dict[int, tuple[weakref.ref[NDArray[np.int64]], Floats]] = {}


def strengths(adjacency: Adjacency, rows: Neighbours) -> Floats:
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
