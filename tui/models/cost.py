"""What a solve is likely to cost, in words: edges that need iterating times sweeps to be expected.

Plain sweeps shrink the error by the damping (Haveliwala and Kamvar 2003, second eigenvalue of
the surfer's matrix) or by alpha times the spectral radius (Katz) each, so that
``log(tol) / log(factor)`` of them suffice; the solvers need fewer.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import TYPE_CHECKING

from kingpost.tui.models.numbers import compact, middle

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.measures.base import Settings
    from kingpost.core.result import Result

_DIRECT = {"degree": "one pass over the edges"}


def cost_words(
    graph: Graph,
    measure: str,
    settings: Settings,
    before: Result | None = None,
    rho: float | None = None,
) -> str:
    """One sentence; ``before`` is the latest answer of the measure on this graph, ``rho`` the
    spectral radius, where they are known.

    Never computes the structure of the graph: where it is not known yet, the sentence says so.
    """
    if measure in _DIRECT:
        return f"cost: {_DIRECT[measure]} ({graph.stored:,})"
    structure = graph.__dict__.get("structure")
    if structure is None:
        return f"cost: not known before the strong components of {graph.stored:,} edges are found"
    factor, source = factor_of(measure, settings, rho)
    past = _past(before)
    if math.isnan(factor):
        known = past or "no prediction for this measure before its first solve"
        return f"cost: {known}"
    if structure.acyclic:
        return f"cost: no edge lies on a cycle; one pass over {graph.stored:,} edges is exact"
    inner = int(structure.inner.sum())
    head = f"cost: {inner:,} of {graph.stored:,} edges lie on cycles and need iterating"
    sweeps = plain_sweeps(settings.tol, factor)
    if sweeps is None:
        return f"{head}; at {source} {factor:.6g} no number of plain sweeps is promised"
    visits = compact(float(inner) * sweeps)
    words = f"{head}; at most {sweeps:,} plain sweeps ({source} {factor:.4g}), {visits} edge visits"
    pace = _pace(before)
    if pace:
        words += f", up to {seconds_words(inner * sweeps / pace)} at the pace of the last solve"
    return f"{words}; {past}" if past else words


def factor_of(measure: str, settings: Settings, rho: float | None = None) -> tuple[float, str]:
    """The factor a plain sweep shrinks the error by, and its name; NaN where none is promised."""
    if measure == "surfer":
        return float(getattr(settings, "damping", math.nan)), "damping"
    if measure != "katz":
        return math.nan, ""
    alpha, fraction = (
        getattr(settings, "alpha", None),
        getattr(settings, "alpha_fraction", None),
    )
    if alpha is not None:
        return (math.nan, "") if not rho else (abs(alpha) * rho, "alpha rho")
    if fraction is None:
        from kingpost.core.measures.katz import DEFAULT_FRACTION

        fraction = DEFAULT_FRACTION
    return abs(float(fraction)), "alpha rho"


def known_radius(results: Iterable[Result]) -> float | None:
    """The spectral radius of the graph, where one of these answers came upon it."""
    for result in results:
        # Within one component the radius may be another.
        if result.facts.get("rho") and getattr(result.settings, "component", None) is None:
            return middle(result.facts["rho"])
    return None


def plain_sweeps(tol: float, factor: float) -> int | None:
    """Sweeps after which ``factor ** sweeps <= tol``; None where the factor promises nothing."""
    if factor >= 1.0:
        return None
    if factor <= 0.0:
        return 1
    return max(1, math.ceil(math.log(tol) / math.log(factor) - 1e-9))


def seconds_words(seconds: float) -> str:
    """``0.3 s``, ``4 min``, ``2 h``."""
    if seconds < 0.1:
        return "0.1 s"
    if seconds < 120.0:
        return f"{seconds:.1f} s" if seconds < 10.0 else f"{seconds:.0f} s"
    return f"{seconds / 60:.0f} min" if seconds < 7_200.0 else f"{seconds / 3_600:.0f} h"


def _pace(before: Result | None) -> float:
    if before is None or before.seconds.solve <= 0.0:
        return 0.0
    return before.edge_visits / before.seconds.solve


def _past(before: Result | None) -> str:
    if before is None or before.refusal is not None or not before.log:
        return ""
    took = seconds_words(before.seconds.solve + before.seconds.prepare)
    return f"the last solve took {before.sweeps:,} sweeps, {took}"
