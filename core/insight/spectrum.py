"""Leading eigenvalues of what a measure iterates, the gap, and the rate that follows from it.

Power iteration gains on its error by the factor ``|lambda_2| / |lambda_1|`` a step: that is the
predicted rate.  What a solve really did is read off the log of its Result.  For the surfer every
eigenvalue but the first is at most d in modulus, and is d itself where the walk has two closed
classes (Haveliwala and Kamvar, "The second eigenvalue of the Google matrix", 2003).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.graph import Graph
from kingpost.core.insight.matrices import Doubled, Inside, Jumping
from kingpost.core.insight.rates import Rate, observed_rate, predicted_rate
from kingpost.core.measures.base import Settings, finish
from kingpost.core.measures.radius import spectral_radius
from kingpost.core.operators import adjacency, walk
from kingpost.core.result import Result
from kingpost.core.solvers.eigenvalues import Matrix, Pairs, leading_pairs
from kingpost.core.watch import Watch

COUNT = 6
_HELPED, _SMALL = ("eigenvector", "hits", "votes"), 300  # see solvers.perron
_WIDTH = 1e-9  # relative, of the bracket of rho
MEASURES = ("surfer", "eigenvector", "katz", "hits", "communicability", "votes")


@dataclass(frozen=True, slots=True)
class Eigenvalue:
    """One eigenvalue of the matrix, or one singular value.

    Attributes:
        real, imaginary: its parts; conjugates stand next to each other.
        modulus: its distance from 0.
        residual: ``|B v - value v| / |v|`` at the most, for the vector found with it.
        low, high: ends between which it lies for certain; None where only the residual is known.
    """

    real: float
    imaginary: float
    modulus: float
    residual: float
    low: float | None
    high: float | None


@dataclass(frozen=True)
class Spectrum:
    """What :func:`spectrum` found; plain numbers and words.

    Attributes:
        measure: whose matrix; ``matrix`` says which, ``about`` what its values are called.
        size: rows of the whole matrix; ``zeros`` of its eigenvalues are 0 by structure alone.
        values: in falling order of modulus, as many as asked for and one more where that
            completes a conjugate pair.
        complete: whether the whole spectrum was worked out, so that none can be missing.
        radius: ends of the largest modulus, for certain.
        gap: 1 less the quotient of the second modulus and the first (0: they tie); None where
            there is no second or no first.
        second: what is certain of the second modulus, as a share of the first: (low, high).
        predicted: rate of power iteration, None where it would not converge or is not meant.
        observed: rate in the log of the result, None without a log to read it from.
        products: products with the matrix that it took.
        notes: what else has to be said, in words, safe to show.
    """

    measure: str
    matrix: str
    about: str
    size: int
    zeros: int
    values: tuple[Eigenvalue, ...]
    complete: bool
    radius: tuple[float, float]
    gap: float | None
    second: tuple[float, float]
    predicted: Rate | None
    observed: Rate | None
    products: int
    notes: tuple[str, ...]


@dataclass
class _Asked:
    """A matrix and how its eigenvalues are to be read."""

    matrix: Matrix
    words: str
    size: int
    factor: float = 1.0  # what the eigenvalues are multiplied by before they are shown
    singular: bool = False  # keep the positive half only
    power: int = 1  # the rate is the quotient of moduli to this power
    radius: tuple[float, float] | None = None
    most_second: float = 1.0  # share of the first modulus that the second cannot exceed
    least_second: float = 0.0
    notes: tuple[str, ...] = ()


def spectrum(
    graph: Graph,
    measure: str = "surfer",
    settings: Settings | None = None,
    *,
    result: Result | None = None,
    count: int = COUNT,
    watch: Watch | None = None,
) -> Spectrum:
    """The ``count`` leading eigenvalues of the matrix behind a measure.

    ``result`` is a solve of that measure, for the observed rate; its settings are taken where
    ``settings`` is None.

    Raises:
        SettingsError: for a measure that iterates no matrix, or a ``count`` below 1.
        Interrupted: if ``watch`` was cancelled.
    """
    from kingpost.core.measures import measure as find

    watch = watch or Watch()
    check_measure(measure)
    chosen: Any = settings or (result.settings if result is not None else find(measure).settings())
    if count < 1:
        raise SettingsError(f"the number of eigenvalues is {count}; it takes a number from 1")
    if graph.n == 0:
        return Spectrum(
            measure, "a matrix without rows", "eigenvalue", 0, 0, (), True, (0.0, 0.0), None,
            (0.0, 0.0), None, None, 0, ("the graph has no nodes; load a table that holds edges",),
        )  # fmt: skip
    asked = _ask(graph, measure, chosen, watch, result)
    found = leading_pairs(
        asked.matrix,
        count,
        watch,
        lambda made: watch.report("looking for eigenvalues", made, unit="products"),
        largest=asked.singular,
    )
    return _told(measure, asked, found, count, result)


def check_measure(measure: str) -> None:
    """Refuse a measure without a matrix.

    Raises:
        SettingsError: naming those that have one.
    """
    if measure not in MEASURES:
        raise SettingsError(
            f"{measure} iterates no matrix, so it has no spectrum; there is one for "
            f"{', '.join(MEASURES)}"
        )


def _ask(graph: Graph, measure: str, settings: Any, watch: Watch, result: Result | None) -> _Asked:
    if measure == "surfer":
        return _surfer(graph, settings, watch)
    if measure == "hits":
        return _hits(graph, result)
    if measure == "votes":
        return _votes(graph, settings, watch, result)
    radius = finish(
        spectral_radius(graph, _WIDTH, watch),
        lambda line: watch.report("bracketing the spectral radius", line.index, unit="steps"),
    )
    if radius is None:
        raise Interrupted("cancelled before there was an answer to keep")
    ends = radius.low, radius.high
    unit = _unit(graph)
    matrix = Inside(adjacency(graph, settings.flow, 1 / unit), graph.structure, not graph.directed)
    name = "A" if not graph.directed or settings.flow == "against" else "A^T"
    notes: list[str] = []
    if graph.structure.acyclic:
        notes.append("the graph has no cycle: every eigenvalue is exactly 0")
    else:
        _periods(graph, notes)
    if measure == "katz" and result is not None and "alpha" in result.facts:
        alpha = abs(float(result.facts["alpha"]))
        words = f"alpha {name}, alpha = {result.facts['alpha']:.6g}"
        return _Asked(
            matrix, words, graph.n, alpha * unit, radius=(alpha * ends[0], alpha * ends[1]),
            notes=tuple(notes),
        )  # fmt: skip
    words = f"the adjacency {name}"
    return _Asked(matrix, words, graph.n, unit, radius=ends, notes=tuple(notes))


def _unit(graph: Graph) -> float:
    """A power of two near the greatest weight: squares of what is divided by it are numbers."""
    weights = graph.outward.weights
    if weights is None or len(weights) == 0:
        return 1.0
    return float(2.0 ** int(np.clip(np.log2(weights.max()), -1000, 1000)))


def _periods(graph: Graph, notes: list[str]) -> None:
    structure = graph.structure
    main = int(structure.cyclic[np.argmax(structure.inner)])
    period = structure.period(main)
    if period > 1:
        notes.append(
            f"the largest strong component has period {period}: {period} of its eigenvalues have "
            "the same modulus, spread evenly over a circle, and plain power iteration would "
            "swing for ever; the solver shifts"
        )
    if len(structure.cyclic) > 1:
        notes.append(
            f"{len(structure.cyclic):,} strong components hold cycles; the spectrum is that of all "
            "of them together"
        )


def _surfer(graph: Graph, settings: Any, watch: Watch) -> _Asked:
    from kingpost.core.measures.surfer import Jump

    d = settings.damping
    matrix, strength = walk(graph, settings.flow, d)
    dangling = strength == 0
    jump = Jump(graph, settings, dangling)
    n = graph.n
    teleport = np.full(n, 1.0 / n) if jump.uniform and n else jump.teleport
    # Leaking and scaling gives the scores of jumping by the teleport vector: the same matrix.
    landing = teleport if jump.apart is None else jump.apart
    notes, least = [], 0.0
    classes = _closed(graph, settings, dangling, landing, watch)
    if classes > 1:
        least = d
        notes.append(
            f"the walk has {classes:,} closed classes, so {d:g} itself is an eigenvalue "
            f"({classes - 1:,} times at least): the slowest mixing that damping {d:g} allows"
        )
    return _Asked(
        Jumping(matrix, d, dangling.astype(np.float64), landing, teleport),
        f"the surfer's matrix: damping {d:g}, jumps included",
        n,
        radius=(1.0, 1.0),
        most_second=d,
        least_second=least,
        notes=tuple(notes),
    )


def _closed(graph: Graph, settings: Any, dangling: Any, landing: Any, watch: Watch) -> int:
    """Number of closed classes of the walk without teleport, or 1 where that is not certain.

    A strong component no edge leaves is closed if no dangling node is in it.  Jumps from dangling
    nodes can only join others.
    """
    structure, push = graph.structure, graph.push(settings.flow)
    leaves = np.zeros(structure.count, dtype=bool)
    rows = np.repeat(structure.component, push.degrees)
    watch.check()
    leaves[rows[structure.component[push.neighbours] != rows]] = True
    leaves[structure.component[dangling]] = True
    return max(1, int(np.count_nonzero(~leaves)))


def _hits(graph: Graph, result: Result | None) -> _Asked:
    unit = _unit(graph)
    into = adjacency(graph, "along", 1 / unit)
    out = adjacency(graph, "against", 1 / unit)
    notes = () if graph.stored else ("the graph has no edges: every singular value is exactly 0",)
    return _Asked(
        Doubled(out, into), "A, hubs by authorities; the values are its singular values", graph.n,
        unit, singular=True, power=2, notes=notes,
        radius=None if result is None else result.facts.get("sigma"),
    )  # fmt: skip


def _votes(graph: Graph, settings: Any, watch: Watch, result: Result | None) -> _Asked:
    from kingpost.core.measures.votes import ballot

    made = ballot(graph, settings, watch)
    groups = int(np.count_nonzero(made.structure.sizes > 1))
    notes = ["entries are rounded: their own errors, of some 1e-14 each, are not in the residuals"]
    if groups > 1:
        notes.append(f"{groups:,} groups of nodes never met: each has a vector of its own")
    radius = None if result is None else result.facts.get("rho")
    if settings.division == "vote" and groups:
        radius = 1.0, 1.0
    return _Asked(
        Inside(made.matrix, made.structure, False),
        f"votes among those who met: link {settings.link}, division {settings.division}",
        graph.n,
        radius=radius,
        notes=tuple(notes),
    )


def _told(measure: str, asked: _Asked, found: Pairs, count: int, result: Result | None) -> Spectrum:
    factor = asked.factor
    values, residuals = found.values * factor, found.residuals * factor
    if asked.singular:
        # The n largest of the 2n; a zero comes twice, and once with a sign lost in rounding.
        values, residuals = np.abs(values[: asked.size]), residuals[: asked.size]
    within = None if found.within is None else found.within * factor
    shown = []
    if len(values) > count and values[count - 1].imag > 0:
        count += 1
    for k, (value, residual) in enumerate(zip(values[:count], residuals[:count], strict=True)):
        low = high = None
        if within is not None:
            low, high = float(value.real) - within, float(value.real) + within
            if asked.singular:
                low = max(low, 0.0)
        elif k == 0 and asked.radius is not None and abs(value.imag) <= residual:
            low, high = asked.radius
        shown.append(
            Eigenvalue(
                float(value.real), float(value.imag), float(abs(value)), float(residual), low, high
            )
        )
    notes = list(asked.notes)
    moduli = np.abs(values)
    radius = asked.radius
    if radius is None:
        ends = (shown[0].low, shown[0].high) if shown else (0.0, 0.0)
        radius = (ends[0] or 0.0, math.inf if ends[1] is None else ends[1])
        if not found.complete and shown:
            notes.append("the upper end holds if the search missed no larger value")
    _check_first(shown, radius, found, notes)
    if len(found.values) < found.wanted and not found.complete:
        notes.append(
            f"only {len(found.values):,} of {found.wanted:,} eigenvalues settled; the others lie "
            "too close together"
        )
    first = float(moduli[0]) if len(moduli) else 0.0
    gap, ratio = None, None
    if len(moduli) > 1 and first > 0:
        ratio = float(moduli[1]) / first
        gap = max(0.0, 1.0 - ratio)
    if gap is not None and gap < 1e-9 and not any("period" in note for note in notes):
        notes.append(
            "the first two moduli cannot be told apart: two parts of the graph tie, or the part "
            "that dominates is periodic; plain power iteration would depend on its start or swing"
        )
    second = asked.least_second, asked.most_second
    if within is not None and len(moduli) > 1 and first > 0:
        low = max(float(moduli[1]) - within, 0.0) / (first + within)
        high = (float(moduli[1]) + within) / max(first - within, 1e-300)
        second = max(second[0], low), min(second[1], high) if found.complete else second[1]
    predicted = None
    if measure == "katz":
        if result is not None and result.refusal is None:
            predicted = predicted_rate(radius[1], "of the plain sum over walks: alpha rho")
    elif measure == "communicability":
        notes.append(
            "the exponential series converges faster than any fixed rate, whatever the spectrum"
        )
    elif ratio is not None:
        quotient = max(ratio, second[0])
        names = "(sigma_2 / sigma_1)^2" if asked.power == 2 else "|lambda_2| / |lambda_1|"
        predicted = predicted_rate(quotient**asked.power, f"of power iteration: {names}")
    about = "singular value" if asked.singular else "eigenvalue"
    observed = None if result is None else observed_rate(result.log)
    if observed is not None and asked.size <= _SMALL and measure in _HELPED:
        notes.append(
            "on a graph this small the solver may take its vector from a dense decomposition after "
            "a few sweeps; the observed rate counts that as well"
        )
    return Spectrum(
        measure=measure,
        matrix=asked.words,
        about=about,
        size=asked.size,
        zeros=0 if asked.singular else asked.size - asked.matrix.size,
        values=tuple(shown),
        complete=found.complete,
        radius=radius,
        gap=gap,
        second=second,
        predicted=predicted,
        observed=observed,
        products=found.products,
        notes=tuple(notes),
    )


def _check_first(
    shown: list[Eigenvalue], radius: tuple[float, float], found: Pairs, notes: list[str]
) -> None:
    """Hold the first value found against the bracket, which owes nothing to the search."""
    if not shown or found.complete:
        return
    top = shown[0].modulus
    if top + 1e-6 * radius[1] + shown[0].residual < radius[0]:
        notes.append(
            f"the search missed the largest modulus, which is at least {radius[0]:.10g}; take "
            "the values for some of the spectrum, not for its head"
        )
