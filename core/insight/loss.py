"""What the loss of each of the top nodes would do: who loses a way, how much rank moves, who rises.

One trial a node (:mod:`kingpost.core.insight.trial`), and four searches for who can still reach
whom.  With U the nodes that reach v and D those v reaches, the loss of v cuts off

* from above those of U that no longer reach any node of D,
* from below those of D that no node of U reaches any more.

All of U lose v itself besides.  This is what the edges of the table say, nothing of capacity,
time-outs or fallbacks.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.insight.drift import FALLEN, RISEN
from kingpost.core.insight.edit import edit_of
from kingpost.core.insight.trial import Trial, trial
from kingpost.core.insight.update import Updates
from kingpost.core.result import Result
from kingpost.core.watch import Watch

RISERS = 3
_PIECE = 1_000_000  # edges searched between two looks at the watch


@dataclass(frozen=True, slots=True)
class Ways:
    """Who reaches a node and whom it reaches (itself apart), and who of them is cut off without
    it: from every node it reached, or by every node that reached it."""

    upstream: int
    downstream: int
    cut_upstream: int
    cut_downstream: int


@dataclass(frozen=True, slots=True)
class Riser:
    """A node that rises: its rank ranges among the nodes that stay, before and after."""

    node: int
    before: tuple[int, int]
    after: tuple[int, int]


@dataclass(frozen=True)
class Loss:
    """What the loss of one node would do.

    Attributes:
        node: which; ``rank`` the range it holds; ``share`` its share of the sum of all scores.
        ways: what becomes unreachable.
        moved, moved_error: part of the rank mass of the others that comes to lie elsewhere, and
            how far that may be off; NaN where the measure has no answer without the node.
        risen, fallen: how many others rise or fall beyond the uncertainty.
        risers: the biggest rises.
        error: proven error of the scores after the loss, as a share of their sum.
        refusal: why the measure has no answer without the node, or None.
    """

    node: int
    rank: tuple[int, int]
    share: float
    ways: Ways
    moved: float
    moved_error: float
    risen: int
    fallen: int
    risers: tuple[Riser, ...]
    error: float
    method: str
    refusal: str | None = None


def losses(
    graph: Graph,
    result: Result,
    k: int,
    *,
    risers: int = RISERS,
    watch: Watch | None = None,
    tol: float | None = None,
) -> tuple[Loss, ...]:
    """What the loss of each of the first ``k`` nodes of ``result`` would do, the first first.

    ``tol`` as for :func:`kingpost.core.insight.trial.trial`.

    Raises:
        SettingsError: if ``result`` is refused.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    updates = Updates(graph, result)
    rows = []
    if graph.n < 2:
        return ()
    for done, node in enumerate(result.standing.order[:k].tolist()):
        watch.check()
        watch.report("trying losses", done, min(k, graph.n), "nodes")
        found = trial(graph, result, edit_of(graph, [node]), watch, updates, tol=tol)
        rows.append(_loss(graph, result, node, found, risers, watch))
    return tuple(rows)


def _loss(graph: Graph, result: Result, node: int, found: Trial, risers: int, watch: Watch) -> Loss:
    after = found.result
    places = found.ordered(RISEN, risers).tolist()
    top = tuple(
        Riser(int(found.nodes[at]), _pair(found.before[at]), _pair(found.after[at]))
        for at in places
    )
    return Loss(
        node,
        result.standing.range_of(node),
        found.share,
        ways(graph, node, watch),
        found.moved,
        found.moved_error,
        int((found.kind == RISEN).sum()),
        int((found.kind == FALLEN).sum()),
        top,
        float(after.bound.value),
        found.method,
        None if after.refusal is None else after.refusal.sentence,
    )


def _pair(span: NDArray[np.int64]) -> tuple[int, int]:
    return int(span[0]), int(span[1])


def ways(graph: Graph, node: int, watch: Watch | None = None) -> Ways:
    """Who reaches ``node``, whom it reaches, and who of them is cut off without it; exact."""
    watch = watch or Watch()
    out, into = graph.outward, graph.inward
    above = _searched(into, into.row(node)[0], node, watch)
    below = _searched(out, out.row(node)[0], node, watch)
    up, down = int(above.sum()), int(below.sum())
    if up == 0 or down == 0:
        return Ways(up, down, 0, 0)
    fed = _searched(out, np.flatnonzero(above).astype(np.uint32), node, watch)
    leading = _searched(into, np.flatnonzero(below).astype(np.uint32), node, watch)
    return Ways(up, down, int((above & ~leading).sum()), int((below & ~fed).sum()))


def _searched(
    rows: Adjacency, start: NDArray[np.uint32], without: int, watch: Watch
) -> NDArray[np.bool_]:
    """Nodes of ``start`` and those reached from them, never through or at ``without``."""
    from kingpost.core.kernels.rows import spread

    n = len(rows.offsets) - 1
    seen = np.zeros(n, dtype=bool)
    start = start[start != without]
    seen[start] = True
    seen[without] = True  # whoever was seen is not visited again
    queue = np.empty(n, dtype=np.uint32)
    queue[: len(start)] = start
    head, tail = 0, len(start)
    while head < tail:
        watch.check()
        head, tail = spread(rows.offsets, rows.neighbours, queue, head, tail, seen, _PIECE)
    seen[without] = False
    return seen
