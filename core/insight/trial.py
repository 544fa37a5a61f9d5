"""What if: scores and standings after nodes or edges are taken out, or edges reweighted.

The scores after the change are exact to the bound they state, by residual updates where these
apply and pay (:mod:`kingpost.core.insight.update`), else by a solve of the changed graph from the
old scores.  A node has risen where the ranks it may truly have now all lie above those it may
have had *among the nodes that stay*: a gap that closes is no rise, nor is a change within
error bounds.

What is held: Katz keeps the alpha that was found for the whole graph; vectors (teleport, beta)
keep their values on the nodes that stay.
"""

from __future__ import annotations

import dataclasses
import time
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.drift import FALLEN, RISEN, SAME
from kingpost.core.insight.edit import Edit, Ints, edited
from kingpost.core.insight.near import solve_near
from kingpost.core.insight.spans import intervals, spans
from kingpost.core.insight.terms import fact
from kingpost.core.insight.update import PUSHED, Updates
from kingpost.core.measures.base import Settings
from kingpost.core.measures.common import reason
from kingpost.core.measures.vectors import distribution, node_vector
from kingpost.core.result import Result, Seconds, Stop
from kingpost.core.watch import Watch

LOOSER = 16  # how much more error is allowed after a change than before


@dataclass(frozen=True)
class Trial:
    """What :func:`trial` found; arrays have one entry for every node that stays.

    Attributes:
        edit: what was changed.
        nodes: numbers of these nodes in the graph before, shape (k,).
        kind: ``SAME``, ``RISEN`` or ``FALLEN`` of :mod:`kingpost.core.insight.drift`, uint8.
        before, after: first and last rank among the nodes that stay, shape (k, 2).
        scores: score before and after, shape (k, 2).
        factor: for the risen and fallen how many times the rank changed at least, else 1.
        share: share of the sum of all scores that the nodes taken out had.
        moved: half the sum of the changes of all shares, among the nodes that stay: the part of
            the rank mass that comes to lie elsewhere; ``moved_error`` is how far that may be off.
        result: the scores after the change, with their bound; its settings hold vectors as arrays.
        method: how they were found; ``edge_visits`` and ``result.seconds`` what that took.
    """

    edit: Edit
    nodes: Ints
    kind: NDArray[np.uint8]
    before: Ints
    after: Ints
    scores: Floats
    factor: Floats
    share: float
    moved: float
    moved_error: float
    result: Result
    method: str
    edge_visits: int

    def ordered(self, kind: int, limit: int | None = None) -> Ints:
        """Positions of one kind, the biggest change first."""
        places = np.flatnonzero(self.kind == kind)
        best = np.minimum(self.before[places, 0], self.after[places, 0])
        order = np.lexsort((places, best, -self.factor[places]))
        return places[order][:limit]

    def first(self, limit: int | None = None) -> Ints:
        """Positions of the first nodes after the change, by score."""
        k = len(self.nodes) if limit is None else min(limit, len(self.nodes))
        scores = self.scores[:, 1]
        some = np.argpartition(-scores, k - 1)[:k] if 0 < k < len(scores) else np.arange(k)
        return some[np.lexsort((some, -scores[some]))]


def trial(
    graph: Graph,
    result: Result,
    edit: Edit,
    watch: Watch | None = None,
    updates: Updates | None = None,
    *,
    tol: float | None = None,
) -> Trial:
    """The standings after ``edit``, against those of ``result``.

    Args:
        result: scores of any measure on ``graph``.
        updates: those of ``result``, where many trials share them.
        tol: proven error asked for after the change, as a share of the sum of the scores; sixteen
            times what was asked for before where None, for an update adds to the error before.
            Where it proves less, the changed graph is solved.

    A measure that has no answer on the changed graph gives a Trial whose ``result`` is refused
    and whose ranks after are -1.

    Raises:
        SettingsError: if ``result`` is refused, or a setting names only nodes that are taken out.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    if result.refusal is not None:
        raise SettingsError(f"{result.measure} has no answer here: {result.refusal.sentence}")
    nodes = edit.stay(graph.n)
    after, method, visits = resolve(graph, result, edit, nodes, watch, updates, tol)
    watch.check()
    old = result.scores[nodes]
    scores = np.column_stack((old, after.scores))
    kind = np.full(len(nodes), SAME, dtype=np.uint8)
    factor = np.ones(len(nodes))
    low, high = intervals(result)
    was = spans(low[nodes], high[nodes], watch)
    share = _share(result.scores, edit)
    if after.refusal is not None:
        now = np.full_like(was, -1)
        nan = float("nan")
        return Trial(edit, nodes, kind, was, now, scores, factor, share, nan, nan, after, method,
                     visits)  # fmt: skip
    now = spans(*intervals(after), watch)
    risen, fallen = now[:, 1] < was[:, 0], now[:, 0] > was[:, 1]
    kind[risen], kind[fallen] = RISEN, FALLEN
    factor[risen] = was[risen, 0] / now[risen, 1]
    factor[fallen] = now[fallen, 0] / was[fallen, 1]
    moved, error = _moved(result, after, nodes)
    return Trial(edit, nodes, kind, was, now, scores, factor, share, moved, error, after, method,
                 visits)  # fmt: skip


def resolve(
    graph: Graph,
    result: Result,
    edit: Edit,
    nodes: Ints,
    watch: Watch,
    updates: Updates | None = None,
    tol: float | None = None,
) -> tuple[Result, str, int]:
    """The result on the changed graph, in the order of ``nodes``; the method; the edge visits.

    Arguments as for :func:`trial`.
    """
    settings = _settings(graph, result, edit, nodes)
    tol = min(LOOSER * settings.tol, 0.5) if tol is None else tol
    settings = dataclasses.replace(settings, tol=tol)
    began = time.perf_counter()
    updates = updates or Updates(graph, result)
    found = updates.after(edit, watch, tol=tol / 2)
    if found is None or found.bound.value > tol:
        visits = updates.spent
        start = (result.scores if found is None else found.scores)[nodes]
        watch.report("changing the graph")
        changed, _ = edited(graph, edit, watch)
        after, method = solve_near(result.measure, changed, settings, start, watch)
        watch.check()
        return after, method, visits + after.edge_visits
    absolute = found.bound.absolute
    bound = dataclasses.replace(
        found.bound, absolute=absolute[nodes] if isinstance(absolute, np.ndarray) else absolute
    )
    stop = Stop.CONVERGED
    zero = None if result.exact_zero is None else result.exact_zero[nodes]
    after = Result(
        measure=result.measure,
        settings=settings,
        scores=found.scores[nodes],
        stop=stop,
        reason=reason(stop, bound.value, settings),
        bound=bound,
        conventions=result.conventions,
        seconds=Seconds(solve=time.perf_counter() - began),
        facts={name: value for name, value in result.facts.items() if name in ("alpha", "damping")},
        exact_zero=zero,
    )
    return after, PUSHED, found.edge_visits


def _settings(graph: Graph, result: Result, edit: Edit, nodes: Ints) -> Any:
    """The same question about the nodes that stay."""
    settings: Settings = result.settings
    changes: dict[str, Any] = {}
    if result.measure == "katz":
        changes = {"alpha": fact(result, "alpha", 0.0), "alpha_fraction": None}
        beta = getattr(settings, "beta", 1.0)
        if not isinstance(beta, int | float):
            changes["beta"] = node_vector(graph, beta, "--beta")[nodes]
    for name in ("teleport", "dangling"):
        value = getattr(settings, name, None)
        if value is None or isinstance(value, str):
            continue
        left = distribution(graph, value, f"--{name}")[nodes]
        if not left.any():
            raise SettingsError(
                f"the trial takes out every node that --{name} names; leave at least one of them"
            )
        changes[name] = left
    component = getattr(settings, "component", None)
    if component is not None and graph.find(component) in edit.nodes:
        raise SettingsError("the trial takes out the node that --component names; name another")
    return dataclasses.replace(settings, **changes) if changes else settings


def _share(scores: Floats, edit: Edit) -> float:
    total = float(np.abs(scores).sum())
    return float(np.abs(scores[list(edit.nodes)]).sum()) / total if total > 0 else 0.0


def _moved(before: Result, after: Result, nodes: Ints) -> tuple[float, float]:
    """Half the L1 distance of the shares of the nodes that stay, and a bound of its error.

    Shares of scores that are off by e of their sum are off by at most 2 e, summed.
    """
    old = np.abs(before.scores[nodes])
    new = np.abs(after.scores)
    was, now = float(old.sum()), float(new.sum())
    if not (was > 0 and now > 0):
        return 0.0, 0.0
    moved = 0.5 * float(np.abs(old / was - new / now).sum())
    off = float(before.bound.value) * float(np.abs(before.scores).sum()) / was
    return moved, off + float(after.bound.value)
