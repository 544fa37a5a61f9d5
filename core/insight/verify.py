"""Which equation scores from elsewhere solve: measure, conventions, parameter, and how closely.

Every equation of :mod:`kingpost.core.insight.equations` is fitted on every graph that other
software may have made of the table (:mod:`kingpost.core.insight.variants`), along the edges and
against them.  The best is then solved here at the parameter found, and the scores are compared
with that solution, whose own error is proven: so the distance is a bound and no estimate.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from kingpost.core.errors import InputError
from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.ingest.scores import Foreign, of_values
from kingpost.core.insight.equations import (
    FAR,
    SIMPLEST,
    SOME,
    Fit,
    Frame,
    combined,
    fits,
    least_squares,
)
from kingpost.core.insight.libraries import recognised
from kingpost.core.insight.parameters import Parameter, parameters
from kingpost.core.insight.solved import solved_columns
from kingpost.core.insight.variants import Choice, Reload, Variants, choices
from kingpost.core.watch import Watch

EXACT, CLOSE, NONE = "exact", "close", "none"
_SAME = 3.0  # fits whose residuals differ by no more are told apart by simplicity alone
_APART = 5.0  # a loose solution is named only if every other equation misses by so much more
_SURE = 1e-4  # share left unexplained below which sums cut off are not looked for
_HOPE = 0.3  # above which they are not worth looking for
_LOOSE = 100.0  # by how much a form may seem worse than one that it is a special case of
_FLOOR = 1e-11  # share left unexplained that is rounding of the fit itself


@dataclass(frozen=True)
class Match:
    """One equation on one graph.

    Attributes:
        fit: the equation fitted.
        choice, flow: which graph, which way.
        parameters: damping, alpha, rho by name.
        error: bound of ``sum |x - c y| / sum |x|`` over the nodes with a score, y the exact
            solution and c the best scale (for the surfer the one of equal sums); None where
            none is known, and ``no_error`` says why.
        worst: the node at which the scores are furthest from the solution (by absolute
            difference), with its score and the solution's; None where there was none to compare.
        graph: the variant itself.
    """

    fit: Fit
    choice: Choice
    flow: Flow
    parameters: dict[str, Parameter] = field(default_factory=dict)
    error: float | None = None
    no_error: str = ""
    worst: tuple[int, float, float] | None = None

    @property
    def kind(self) -> tuple[str, str, Choice]:
        """What makes it another equation than another match."""
        return self.fit.form, self.flow, self.choice


@dataclass(frozen=True)
class Verdict:
    """What :func:`verify` found.

    Attributes:
        verdict: ``exact`` (to within rounding), ``close`` (solved loosely: every other equation
            misses by five times as much or more), ``none``.
        best: the equation solved, or the nearest.
        alike: other equations that fit as well and cannot be told from ``best`` on this graph.
        runners_up: the next best that differ, for comparison.
        foreign: the scores; turned to positive where ``negated``.
        scale: how they are normalised, in words.
        libraries: functions of other libraries whose defaults are just these.
        tried: number of equations fitted, each on each graph.
    """

    verdict: str
    best: Match
    alike: tuple[Match, ...]
    runners_up: tuple[Match, ...]
    foreign: Foreign
    negated: bool
    scale: str
    libraries: tuple[str, ...]
    tried: int


def verify(
    graph: Graph,
    scores: Foreign | Floats,
    *,
    reload: Reload | None = None,
    watch: Watch | None = None,
) -> Verdict:
    """Find the equation that ``scores`` solve on ``graph``.

    Args:
        scores: as :func:`kingpost.core.ingest.scores.read_scores` gives them, or an array of
            shape (n,) in the graph's numbering, NaN for a node without a score.
        reload: makes the graph again with other ways of reading parallel rows, by name.

    Raises:
        InputError: for ranks, scores that are all equal, or too few to judge by.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    foreign = scores if isinstance(scores, Foreign) else of_values(graph, scores)
    foreign, negated = _positive(foreign)
    _refuse(foreign)
    reach = foreign.rounding.reach(np.nan_to_num(foreign.scores))
    variety = Variants(graph, reload or {}, watch)
    found = _search(choices(graph, reload or {}), variety, foreign, reach, watch)
    if not found:
        raise InputError(
            f"{foreign.name} scores too few nodes whose feeders are scored too: no equation can "
            "be checked; export the scores of all nodes"
        )
    match, alike, others = _chosen(found)
    variant = variety.make(match.choice)
    match = _judged(match, variant, foreign, reach, watch)
    rest = [other for other in others if other.kind != match.kind]
    verdict = _verdict(match, rest)
    scale = scale_words(match, foreign, variant)
    return Verdict(
        verdict,
        match,
        alike,
        _first_of_each(rest)[:3],
        foreign,
        negated,
        scale,
        recognised(match.fit.form, match.choice, match.flow, match.parameters, scale)
        if verdict != NONE
        else (),
        len(found),
    )


def _settled(fit: Fit) -> bool:
    return fit.within_rounding or fit.unexplained <= _FLOOR


def _positive(foreign: Foreign) -> tuple[Foreign, bool]:
    """Eigenvector solvers may return the negative of the vector."""
    if (foreign.whole <= 0).all() and (foreign.whole < 0).any():
        return replace(foreign, scores=-foreign.scores, whole=-foreign.whole), True
    return foreign, False


def _refuse(foreign: Foreign) -> None:
    known = foreign.scores[foreign.known]
    if (known == known[0]).all():
        raise InputError(
            f"all {len(known):,} scores of {foreign.name} equal {known[0]:g}; equal scores fit "
            "many equations and tell nothing"
        )


def _search(
    open_: list[Choice], variety: Variants, foreign: Foreign, reach: Floats, watch: Watch
) -> list[Match]:
    """Fits on the table as read, then on what is one choice away from the best so far.

    Where that ends without an equation that fits, all that is left is tried, and last of all
    the sums of finitely many steps.
    """
    found: list[Match] = []
    tried: list[Choice] = []
    left = list(open_)

    def take(choice: Choice, steps: bool = False) -> None:
        variant = variety.make(choice)
        flows: tuple[Flow, ...] = ("along", "against") if variant.directed else ("along",)
        for flow in flows:
            watch.check()
            watch.report("fitting equations", len(found), unit="fits")
            frame = Frame(variant, flow, foreign.scores, reach, watch, SOME)
            found.extend(Match(fit, choice, flow) for fit in fits(frame, steps))

    while left:
        best = min(found, key=lambda match: match.fit.unexplained, default=None)
        where = best.choice if best is not None else Choice()
        near = [choice for choice in left if choice.apart(where) <= 1]
        fits_some = best is not None and (best.fit.unexplained <= FAR or best.fit.within_rounding)
        if fits_some and not near:
            break
        choice = (near or left)[0]
        left.remove(choice)
        tried.append(choice)
        take(choice)
        if any(_settled(match.fit) for match in found):
            break
    if not any(match.fit.unexplained <= _SURE or match.fit.within_rounding for match in found):
        # A sum cut off is near the whole one, or near the eigenvector.
        walks = ("eigenvector", "katz")
        hopeful = {
            match.choice
            for match in found
            if match.fit.form.startswith(walks) and match.fit.unexplained <= _HOPE
        }
        for choice in [choice for choice in tried if choice in hopeful]:
            take(choice, steps=True)
            if any(_settled(match.fit) for match in found):
                break
    return found


def _chosen(found: list[Match]) -> tuple[Match, tuple[Match, ...], list[Match]]:
    """The simplest of those that fit best, those that fit as well, and all others by fit."""
    found = sorted(found, key=lambda match: match.fit.unexplained)
    least = found[0].fit.unexplained
    if least > FAR and not found[0].fit.within_rounding:
        return found[0], (), found[1:]
    limit = max(_SAME * least, _FLOOR)

    def fits_as_well(match: Match) -> bool:
        return match.fit.unexplained <= limit or match.fit.within_rounding

    best = min(filter(fits_as_well, found), key=_simplicity)
    # One more coefficient follows the noise of a loose solution: that does not make it one.
    loose = min(1e-3, max(_LOOSE * best.fit.unexplained, limit))
    for other in sorted(found, key=_simplicity):
        if _special(other, best) and other.fit.unexplained <= loose:
            best = other
            break
    rest = [match for match in found if match is not best and not _special(best, match)]
    alike = tuple(filter(fits_as_well, rest))
    return best, alike, [match for match in rest if match not in alike]


# A form holds a simpler one as a special case: that it fits as well is no news.
_NESTED = {
    "degree": ("katz without beta", "katz shifted", "katz without beta in steps"),
    "eigenvector": ("katz", "katz without beta", "katz shifted"),
    "katz": ("katz shifted", "katz in steps"),
    "katz without beta": ("katz shifted", "katz without beta in steps"),
    "surfer": ("surfer, landing on dangling",),
}


def _special(one: Match, other: Match) -> bool:
    """Whether ``one`` is a special case of ``other``, on the same graph."""
    same = one.choice == other.choice and one.flow == other.flow
    return same and other.fit.form in _NESTED.get(one.fit.form, ())


def _simplicity(match: Match) -> tuple[int, int, int, bool, int]:
    return (
        SIMPLEST.index(match.fit.form),
        match.choice.changes,
        ("asis", "none", "inverse", "count", "first", "last").index(match.choice.weights),
        match.flow != "along",
        match.fit.steps,
    )


def _first_of_each(matches: list[Match]) -> tuple[Match, ...]:
    seen: dict[tuple[str, str, Choice], Match] = {}
    for match in matches:
        seen.setdefault(match.kind, match)
    return tuple(seen.values())


def _verdict(match: Match, others: list[Match]) -> str:
    if _settled(match.fit):
        return EXACT
    second = others[0].fit.unexplained if others else float("inf")
    if match.fit.unexplained <= FAR and second >= _APART * match.fit.unexplained:
        return CLOSE
    return NONE


def _judged(match: Match, graph: Graph, foreign: Foreign, reach: Floats, watch: Watch) -> Match:
    """The match with its parameters, and its distance to the solution of ours."""
    frame = Frame(graph, match.flow, foreign.scores, reach, watch)
    fit = frame.fit(match.fit.form, match.fit.steps) or match.fit  # by all rows now
    match = replace(match, fit=fit)
    found = parameters(frame, fit)
    if match.fit.unexplained > FAR and not match.fit.within_rounding:  # nothing to round to
        found = {name: Parameter(one.fitted, one.fitted) for name, one in found.items()}
    match = replace(match, parameters=found)
    watch.report("solving what was found")
    columns, bound, why = solved_columns(graph, match.flow, match.fit, match.parameters, watch)
    if columns is None:
        return replace(match, no_error=why)
    known = foreign.known
    target = foreign.scores[known]
    kept = [column[known] for column in columns]
    theta = least_squares(kept, target)
    if theta is None:
        return replace(match, no_error="the solution cannot be brought to the scale of the scores")
    nearest = combined(theta, kept)
    if len(kept) == 1:  # of two scales the one that comes nearer
        balanced = kept[0] * (float(target.sum()) / float(kept[0].sum()))
        closer = np.abs(target - balanced).sum() < np.abs(target - nearest).sum()
        if closer or match.fit.form == "surfer":  # whose scale is its sum
            nearest = balanced
    gaps = np.abs(target - nearest)
    size = float(np.abs(target).sum())
    scaled = float(np.abs(columns[0]).sum()) * abs(theta[0]) / size
    worst = int(np.argmax(gaps))
    node = int(np.flatnonzero(known)[worst])
    error = float(gaps.sum()) / size + bound * scaled
    return replace(match, error=error, worst=(node, float(target[worst]), float(nearest[worst])))


def scale_words(match: Match, foreign: Foreign, graph: Graph) -> str:
    """How scores are normalised, as far as their sums tell."""
    whole = foreign.whole
    n = len(whole)
    slack = 1e-6 + float(foreign.rounding.reach(whole).sum()) / max(float(whole.sum()), 1e-300)
    if foreign.missing == 0 or match.fit.form in ("degree", "katz"):
        own = {"degree": 1.0, "total degree": 1.0, "katz": 1.0}.get(match.fit.form)
        if own is not None and abs(match.fit.theta[-1] - own) <= slack:
            return "beta 1, not normalised" if match.fit.form == "katz" else "not normalised"
    if match.fit.form.endswith("degree") and n > 1:
        theta = match.fit.theta[0]
        for words, value in (("n - 1", 1 / (n - 1)), ("2 (n - 1)", 0.5 / (n - 1))):
            if abs(theta / value - 1) <= slack:
                return f"divided by {words}"
    for words, value in (
        ("sum 1", float(whole.sum())),
        ("Euclidean length 1", float(np.sqrt(whole @ whole))),
        ("largest 1", float(whole.max())),
        ("mean 1", float(whole.mean())),
        ("sum 100", float(whole.sum()) / 100),
    ):
        if abs(value - 1) <= slack:
            return words
    if match.fit.form.startswith("surfer") and foreign.missing == 0:
        d = match.parameters["damping"].value if "damping" in match.parameters else 0.0
        if abs(match.fit.theta[1] * n / (1 - d) - 1) <= 1e-3:
            return "sum below 1: what leaves dangling nodes is lost and not scaled back"
    power = {"katz without beta": 1, "katz without beta in steps": 1, "katz in steps": 0}
    if match.fit.form in power:
        alpha = match.fit.theta[0] ** power[match.fit.form]
        if abs(match.fit.theta[1] / alpha - 1) <= max(slack, 1e-4):
            return "beta 1, not normalised"
    return f"sum {float(whole.sum()):.6g}, of no usual normalisation"
