"""What changed between two tables of the same system: who is new, gone, risen, fallen, and by what.

A node has risen where the ranks it may truly have now all lie above those it may have had: a
change within error bounds or ties is none.  The rise of a score is the sum of the changes of
its terms, and each change of a feeder's term splits exactly into the part of the edge (what it
passes on of the feeder's score) and the part of the feeder's score::

    c' x' - c x = (c' - c) (x + x') / 2 + (x' - x) (c + c') / 2
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.align import Alignment, Ints, align
from kingpost.core.insight.terms import (
    carried,
    edge_weights,
    factors,
    flow_of,
    has_terms,
    own_parts,
)
from kingpost.core.result import Result
from kingpost.core.watch import Watch

SAME, RISEN, FALLEN, NEW, GONE = range(5)
KINDS = ("same", "risen", "fallen", "new", "gone")
CAUSES = 3
EDGES = 5


@dataclass(frozen=True, slots=True)
class EdgeChange:
    """What changed in what one feeder gives to a node.

    ``feeder`` is a place in the alignment; ``edge`` says whether the edge is new, gone or kept;
    ``change = by_edge + by_feeder``, in units of the score.
    """

    feeder: int
    edge: str
    before: float
    after: float
    by_edge: float
    by_feeder: float

    @property
    def change(self) -> float:
        """What the feeder gives now, less what it gave."""
        return self.after - self.before


@dataclass(frozen=True, slots=True)
class Cause:
    """Why one node rose: the changes of its feeders, the largest first, and of its own parts.

    ``rise`` is the change of its score; ``edges`` is cut to the largest, ``rest`` adds up the
    others; ``own`` is the change of teleport, dangling and beta parts.  ``new_edges`` counts all
    edges that are new, ``by_new`` is what their feeders give now.
    """

    node: int
    rise: float
    edges: tuple[EdgeChange, ...]
    rest: float
    own: float
    new_edges: int
    by_new: float


@dataclass(frozen=True)
class Drift:
    """What :func:`drift` found; arrays have one entry for every id of either table.

    Attributes:
        ids: the common numbering.
        kind: one of :data:`KINDS` by number, shape (n,), uint8.
        before, after: first and last rank, shape (n, 2), -1 for a table without the node.
        scores: score before and after, shape (n, 2), NaN for none.
        factor: for the risen and fallen how many times the rank changed at least, else 1.
        causes: of the biggest rises (new nodes included); empty where the measure has no terms.
    """

    ids: Alignment
    kind: NDArray[np.uint8]
    before: Ints
    after: Ints
    scores: Floats
    factor: Floats
    causes: tuple[Cause, ...]

    def counts(self) -> Mapping[str, int]:
        """Number of nodes of each kind."""
        found = np.bincount(self.kind, minlength=len(KINDS)).tolist()
        return dict(zip(KINDS, found, strict=True))

    def ordered(self, kind: int, limit: int | None = None) -> Ints:
        """Places of one kind: the biggest change first, the new and gone by their rank."""
        places = np.flatnonzero(self.kind == kind)
        if kind in (NEW, GONE):
            side = self.after if kind == NEW else self.before
            order = np.lexsort((places, side[places, 0]))
        else:
            best = np.minimum(self.before[places, 0], self.after[places, 0])
            order = np.lexsort((places, best, -self.factor[places]))
        return places[order][:limit]


def drift(
    before: Graph,
    after: Graph,
    first: Result,
    second: Result,
    *,
    causes: int = CAUSES,
    edges: int = EDGES,
    watch: Watch | None = None,
) -> Drift:
    """Compare the results of one measure on two graphs.

    Args:
        first, second: result on ``before`` and on ``after``, of the same measure and flow.
        causes: how many of the biggest rises to explain.
        edges: how many changed feeders each explanation names.

    Raises:
        SettingsError: if the results are of different measures or flows, or were refused.
        InputError: if the ids of the two graphs cannot be compared.
    """
    watch = watch or Watch()
    for result in (first, second):
        if result.refusal is not None:
            raise SettingsError(f"{result.measure} has no answer here: {result.refusal.sentence}")
    if first.measure != second.measure or flow_of(first) != flow_of(second):
        raise SettingsError("drift compares one measure and one flow on two tables")
    watch.report("comparing", 0, after.n, "nodes")
    ids = align(before, after)
    watch.check()
    old, new = _ranks(first, ids.before), _ranks(second, ids.after)
    watch.check()
    kind = np.full(len(ids.labels), SAME, dtype=np.uint8)
    kind[new[:, 1] < old[:, 0]] = RISEN
    kind[new[:, 0] > old[:, 1]] = FALLEN
    kind[ids.before < 0] = NEW
    kind[ids.after < 0] = GONE
    factor = np.ones(len(kind))
    risen, fallen = kind == RISEN, kind == FALLEN
    factor[risen] = old[risen, 0] / new[risen, 1]
    factor[fallen] = new[fallen, 0] / old[fallen, 1]
    scores = np.column_stack((_scores(first, ids.before), _scores(second, ids.after)))
    found = Drift(ids, kind, old, new, scores, factor, ())
    if not (has_terms(first) and has_terms(second)):
        return found
    told = tuple(
        _cause(before, after, first, second, found, int(place), edges)
        for place in _biggest(found, causes)
    )
    return Drift(ids, kind, old, new, scores, factor, told)


def _ranks(result: Result, nodes: Ints) -> Ints:
    spans = np.column_stack((result.standing.first, result.standing.last))
    held = np.full((len(nodes), 2), -1, np.int64)
    there = nodes >= 0
    held[there] = spans[result.standing.position[nodes[there]]]
    return held


def _scores(result: Result, nodes: Ints) -> Floats:
    held = np.full(len(nodes), np.nan)
    there = nodes >= 0
    held[there] = result.scores[nodes[there]]
    return held


def _biggest(found: Drift, limit: int) -> list[int]:
    """The biggest rises by quotient of ranks; a new node counts as risen from beyond the last."""
    risen, new = found.ordered(RISEN, limit), found.ordered(NEW, limit)
    places = np.concatenate((risen, new))
    last = float(found.before.max()) + 1
    size = np.concatenate((found.factor[risen], last / found.after[new, 1]))
    return [int(place) for place in places[np.argsort(-size, kind="stable")][:limit]]


def _cause(
    before: Graph,
    after: Graph,
    first: Result,
    second: Result,
    found: Drift,
    place: int,
    limit: int,
) -> Cause:
    ids = found.ids
    old = _terms(before, first, int(ids.before[place]), ids.at_before)
    new = _terms(after, second, int(ids.after[place]), ids.at_after)
    changes = []
    for feeder in dict.fromkeys((*old, *new)):
        edge = "kept" if feeder in old and feeder in new else "new" if feeder in new else "gone"
        c, x = old.get(feeder, (0.0, _score_of(first, int(ids.before[feeder]))))
        c_new, x_new = new.get(feeder, (0.0, _score_of(second, int(ids.after[feeder]))))
        by_edge = (c_new - c) * (x + x_new) / 2
        by_feeder = (x_new - x) * (c + c_new) / 2
        changes.append(EdgeChange(feeder, edge, c * x, c_new * x_new, by_edge, by_feeder))
    changes.sort(key=lambda item: (-abs(item.change), item.feeder))
    own = _own(after, second, int(ids.after[place])) - _own(before, first, int(ids.before[place]))
    rise = float(np.nan_to_num(found.scores[place, 1]) - np.nan_to_num(found.scores[place, 0]))
    rest = sum(item.change for item in changes[limit:])
    fresh = [item.change for item in changes if item.edge == "new"]
    return Cause(place, rise, tuple(changes[:limit]), rest, own, len(fresh), sum(fresh))


def _terms(graph: Graph, result: Result, node: int, at: Ints) -> dict[int, tuple[float, float]]:
    """By place of the feeder: what of its score the edge passes on, and that score."""
    if node < 0:
        return {}
    near, weights = graph.pull(flow_of(result)).row(node)
    passed = edge_weights(result, weights) * factors(graph, result, near)
    scores = carried(result, near)
    places = at[near].tolist()
    return dict(zip(places, zip(passed.tolist(), scores.tolist(), strict=True), strict=True))


def _score_of(result: Result, node: int) -> float:
    return float(carried(result, np.array([node], np.uint32))[0]) if node >= 0 else 0.0


def _own(graph: Graph, result: Result, node: int) -> float:
    return sum(own_parts(graph, result, node).values()) if node >= 0 else 0.0
