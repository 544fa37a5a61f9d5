"""A bracket of the spectral radius of a graph's adjacency, kept with the graph."""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass

from kingpost.core.graph import Graph
from kingpost.core.operators import adjacency
from kingpost.core.result import Iteration
from kingpost.core.solvers.perron import bracket
from kingpost.core.watch import Watch


@dataclass(frozen=True)
class Radius:
    """``low <= rho <= high``, as a theorem (Collatz-Wielandt), rounding included."""

    low: float
    high: float


def spectral_radius(
    graph: Graph, width: float, watch: Watch, max_steps: int = 5_000
) -> Generator[Iteration, None, Radius | None]:
    """Bracket rho(A) to the relative ``width`` if rounding and ``max_steps`` allow.

    A and its transpose have the same rho, so the flow does not matter.  An acyclic graph has
    rho = 0.  None if cancelled.
    """
    structure = graph.structure
    if structure.acyclic:
        return Radius(0.0, 0.0)
    # Only the answer to the very same question: a narrower bracket that happens to be known would
    # make alpha, and with it the scores, depend on what was asked before.
    question = "radius", width, max_steps
    known: Radius | None = structure.cache.get(question)
    if known is not None:
        return known
    work = bracket(
        adjacency(graph, "along"), structure,
        width=width, max_steps=max_steps, watch=watch, separate=False,
    )  # fmt: skip
    found = yield from work
    if found.cancelled:
        return None
    radius = Radius(*found.rho)
    structure.cache[question] = radius
    return radius
