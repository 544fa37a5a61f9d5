"""Solutions of ours of the equation that foreign scores were found to solve."""

from __future__ import annotations

from typing import Any

import numpy as np

from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.insight.equations import Fit
from kingpost.core.insight.parameters import Parameter
from kingpost.core.measures import measure
from kingpost.core.operators import adjacency
from kingpost.core.watch import Watch

Columns = tuple[list[Floats] | None, float, str]


def solved_columns(
    graph: Graph, flow: Flow, fit: Fit, found: dict[str, Parameter], watch: Watch
) -> Columns:
    """Vectors of which the scores should be a combination, and the relative error of the first.

    None and a reason where there is no solution of ours to compare with.
    """
    form = fit.form
    if form in ("degree", "total degree"):
        strength = graph.pull(flow).strengths()
        if form == "total degree":
            strength = strength + graph.push(flow).strengths()
        return [strength], 0.0, ""
    if form.endswith("in steps"):
        return [_steps(graph, flow, fit, found["alpha"].value, watch)], 0.0, ""
    settings: dict[str, Any] = {"flow": flow}
    name = {"eigenvector": "eigenvector", "authorities": "hits", "surfer": "surfer"}.get(form)
    if form.startswith("katz"):
        name, settings["alpha"] = "katz", found["alpha"].value
    if name is None:
        return None, 0.0, "no solution of this variant is implemented here to compare with"
    if form == "surfer":
        settings["damping"] = found["damping"].value
    chosen = measure(name)
    result = chosen.rank(graph, chosen.settings(**settings), watch)
    watch.check()
    if result.refusal is not None:
        return None, 0.0, f"{result.refusal.reason}: many vectors solve the equation, or none"
    bound = float(result.bound.value)
    if not np.isfinite(bound):
        return None, 0.0, "no bound of the solution is known"
    scores = result.scores
    if form == "katz without beta":
        return [scores - 1.0], bound * float(scores.sum()) / float((scores - 1.0).sum()), ""
    if form == "katz shifted":
        return [scores, np.ones(graph.n)], bound, ""
    return [scores], bound, ""


def _steps(graph: Graph, flow: Flow, fit: Fit, alpha: float, watch: Watch) -> Floats:
    """The Katz sum cut off after ``fit.steps`` steps, with or without its first term."""
    pull = adjacency(graph, flow, alpha)
    term = np.ones(graph.n)
    total = np.zeros(graph.n) if "without" in fit.form else term.copy()
    for _ in range(fit.steps):
        term = pull.apply(term, watch)
        total += term
    return total
