"""Scores after a small change of the graph, from those before it, by residual updates.

Surfer (as the pseudo-rank) and Katz solve ``x = b + B x``.  With B' for the changed graph and the
exact solutions ``x*`` and ``x'*``, ``(I - B') (x'* - x*) = (B' - B) x*``.  From the computed x the
update solves ``(I - B') change = (B' - B) x`` by pushing residuals, which touches only what the
change reaches, and stops with a residual ``rho``.  So, for ``y = x + change``,

    ``|x'* - y| <= |x* - x| + (I - B')^-1 g,   g = |B' - B| |x* - x| + |rho| + rounding``.

With d the damping, ``||(I - B')^-1||_1 <= 1 / (1 - d)``.  And where b > 0,
``(I - B') y >= (I - B) x - |rho| - rounding`` is checked to be positive: then I - B' is an
M-matrix and ``(I - B')^-1 g <= y max_i g_i / ((I - B') y)_i``.  ``(I - B) x`` is bounded from
below by the certificate of x (see :func:`_kept`), so no pass over all edges is needed: the
certificate costs what the change touched, and vectors.

References: residual pushes as in Berkhin, "Bookmark-coloring algorithm for personalized PageRank
computing", Internet Math. 3, 2006; the M-matrix bound as in :mod:`kingpost.core.certify`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from kingpost.core.certify import UNIT
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.edit import Edit, Ints
from kingpost.core.insight.terms import fact, flow_of, interval_reach, strengths
from kingpost.core.measures.vectors import distribution, node_vector
from kingpost.core.parallel import each
from kingpost.core.result import Bound, BoundKind, Result
from kingpost.core.watch import Watch

PUSHED = "residual updates"
_SLICE = 500_000  # edges pushed between two looks at the watch
_PASSES = 3  # edge visits, in passes over all edges, after which updates do not pay
_LEAST = 3_000_000  # edges a push may always read, however small the graph
_ROWS = 500_000
_RATE = 6  # passes over which the rate of residuals is looked at
_SUMS = 1 + 2.0**-20  # room for the rounding of sums of bounds


@dataclass(frozen=True)
class Updated:
    """Scores after the change, in the old numbering, shape (n,), zero for nodes that are gone.

    ``edge_visits`` counts edges read for the update and its certificate together.
    """

    scores: Floats
    bound: Bound
    edge_visits: int


@dataclass(frozen=True)
class _System:
    """``x = b + B x`` before the change: column scales, b (n,) or (1,) from below, and the
    damping, None for Katz.  ``total`` bounds ``sum |x* - x|``."""

    scale: Floats
    b: Floats
    damping: float | None
    total: float


class Updates:
    """Updates of one result, as many as are wanted: what they share is prepared once."""

    def __init__(self, graph: Graph, result: Result) -> None:
        self.graph, self.result = graph, result
        self.spent = 0  # edges read by the latest update, given up or not
        self._system = _system(graph, result)
        if self._system is None:
            return
        flow = flow_of(result)
        order = graph.structure.order
        self._order = order if flow == "along" else np.ascontiguousarray(order[::-1])
        self._push, self._pull = graph.push(flow), graph.pull(flow)
        self._reach = interval_reach(result)
        self._kept = _kept(graph, result, self._system)
        n = graph.n
        # Residuals with bounds of their rounding, and of bounds without; what they change.
        self._r, self._g = np.zeros((n, 2)), np.zeros((n, 2))
        self._change, self._spread = np.zeros(n), np.zeros(n)
        self._loops = graph.loop_count > 0
        self._scale = self._system.scale.copy()
        self._sources = np.empty(0, np.int64)  # whose scales differ
        self._unsure = 0.0, 0.0  # bounds of |(B' - B) (x* - x)|, summed: by node, by the sum
        self._stale = False  # whether an update that was given up left something in them
        self._blocked, self._touched = np.zeros(n, dtype=bool), np.zeros(n, dtype=bool)

    @property
    def possible(self) -> bool:
        """Whether updates apply: to the surfer below damping 1 whose dangling nodes jump as all
        do, and to Katz with positive alpha and beta, from scores with a bound."""
        return self._system is not None

    def after(self, edit: Edit, watch: Watch, *, tol: float | None = None) -> Updated | None:
        """Scores after ``edit``, the residuals within ``tol`` (that of the settings); None where
        updates do not apply, do not pay, or prove nothing.  Katz keeps its alpha.

        Raises:
            Interrupted: if ``watch`` was cancelled.
        """
        self.spent = 0
        if self._system is None:
            return None
        tol = self.result.settings.tol if tol is None else tol
        self._blocked.fill(False)
        self._touched.fill(False)
        if self._stale:
            self._r.fill(0.0)
            self._g.fill(0.0)
            self._change.fill(0.0)
            self._spread.fill(0.0)
        self._stale = True
        scale, marks = self._marked(edit)
        visits = self._seed(scale, marks)
        floor = self._floor(tol)
        drained = self._drain(self._r, self._change, scale, marks, floor, visits, watch)
        if drained is None:
            return None
        # What is not known of the residual goes where it goes, as far as that matters.
        self._r[self._blocked] = 0.0
        self._g[:, 0] = self._r[:, 1]
        drained = self._drain(self._g, self._spread, scale, marks, floor, drained, watch)
        return None if drained is None else self._finish(drained, watch)

    def _marked(self, edit: Edit) -> tuple[Floats, tuple[Any, ...]]:
        """Column scales to change, and what the kernels ask to know B' by."""
        assert self._system is not None
        keys, factors = edit.keys(), np.array(edit.factors, dtype=np.float64)
        if flow_of(self.result) == "against":
            keys = ((keys & 0xFFFFFFFF) << 32) | (keys >> 32)
            order = np.argsort(keys)
            keys, factors = keys[order], factors[order]
        self._blocked[list(edit.nodes)] = True
        self._touched[keys >> 32] = True
        self._scale[self._sources] = self._system.scale[self._sources]
        self._sources = self._changed(edit, keys)
        return self._scale, (self._blocked, self._touched, keys, factors)

    def _changed(self, edit: Edit, keys: Ints) -> Ints:
        """Nodes that give otherwise than before."""
        assert self._system is not None
        changed = [np.array(edit.nodes, dtype=np.int64), keys >> 32]
        if self._system.damping is not None:
            # Whoever fed a node that is gone feeds the others more.
            changed += [self._pull.row(node)[0].astype(np.int64) for node in edit.nodes]
        return np.unique(np.concatenate(changed))

    def _seed(self, scale: Floats, marks: tuple[Any, ...]) -> int:
        """The residual that the change leaves in the old scores; returns the edges read."""
        from kingpost.core.kernels.push import seed, strengths_of

        system, rows = self._system, self._push
        assert system is not None
        sources = self._sources
        self._unsure = 0.0, 0.0
        if len(sources) == 0:
            return 0
        edges = rows.offsets, rows.neighbours, rows.weights
        visits = 0
        if system.damping is not None:
            strength = np.zeros(self.graph.n)
            strengths_of(*edges, sources, *marks, strength)
            left = strength[sources]
            scale[sources] = 0.0
            scale[sources[left > 0]] = system.damping / left[left > 0]
            visits = int((rows.offsets[sources + 1] - rows.offsets[sources]).sum())
        read, unsure, largest = seed(
            *edges, sources, *marks, system.scale, scale, self.result.scores, self._reach, self._r
        )
        self._unsure = unsure, largest * system.total
        return visits + int(read)

    def _drain(
        self,
        r: Floats,
        change: Floats,
        scale: Floats,
        marks: tuple[Any, ...],
        floor: Floats,
        visits: int,
        watch: Watch,
    ) -> int | None:
        """Push until no residual is above the floor; returns the edges read so far, None where
        that takes too many.

        Passes go in the order of the flow, so that one is enough on an acyclic graph.
        """
        from kingpost.core.kernels.push import drain

        n, rows = self.graph.n, self._push
        limit = visits + max(_PASSES * self.graph.stored, _LEAST)
        sums: list[float] = []
        while True:
            at, before = 0, visits
            while at < n:
                watch.check()
                watch.report("updating", visits, None, "edges")
                at, read = drain(
                    rows.offsets, rows.neighbours, rows.weights, *marks, scale, self._order, at,
                    floor, r, change, self._loops, _SLICE,
                )  # fmt: skip
                visits += read
                self.spent = visits
            if visits == before or self.graph.structure.acyclic:
                return visits
            if visits > limit:
                return None
            r[self._blocked] = 0.0
            size = np.abs(r[:, 0])
            sums.append(float(size.sum()))
            if len(sums) < _RATE:  # the first passes tell little of how fast residuals fall
                continue
            rate = (sums[-1] / sums[-_RATE]) ** (1 / (_RATE - 1))
            above = float((size / floor).max())
            rate = min(max(rate, 1e-9), 0.9999)
            more = np.log(max(above, 1.0)) / -np.log(rate) * (visits - before)
            if not visits + more <= limit:
                return None

    def _floor(self, tol: float) -> Floats:
        """Residuals up to this are left: one number, or one a node."""
        system = self._system
        assert system is not None
        if (system.b > 0).all():
            return 0.5 * tol * system.b
        assert system.damping is not None
        # Teleport to some nodes only: residuals count by their sum.
        left = 0.2 * tol * (1.0 - system.damping) / max(int(np.count_nonzero(self._r[:, 0])), 1)
        return np.array([left / 256])

    def _finish(self, visits: int, watch: Watch) -> Updated | None:
        """Scores and their bound: ``|x'* - y| <= reach + spread + kappa y``."""
        from kingpost.core.kernels.push import rescale, settle

        system, n = self._system, self.graph.n
        assert system is not None
        y, own = np.empty(n), np.empty(n)
        kept = np.empty(0) if self._kept is None else self._kept
        pieces = [(low, min(low + _ROWS, n)) for low in range(0, n, _ROWS)]
        parts = each(
            lambda piece: settle(
                *piece, self.result.scores, self._reach, kept, self._blocked, self._r, self._g,
                self._change, self._spread, y, own,
            ),
            pieces,
            watch.threads,
        )  # fmt: skip
        self._stale = False
        kappa = max(part[2] for part in parts) * _SUMS
        mass = float(y.sum())
        if not mass > 0 or (system.damping is None and not np.isfinite(kappa)):
            return None
        if system.damping is None:
            own += kappa * y
            own *= _SUMS
            value = float(own.sum()) / mass * _SUMS
            return Updated(y, Bound(BoundKind.COMPONENTWISE, value, absolute=own), visits)
        # The error before, as the change hands it on: node by node, or by its sum and the largest
        # change of a column.
        by_node, by_sum = self._unsure
        left = sum(part[0] for part in parts) * _SUMS
        left += min(0.0, by_sum - by_node / _SUMS)
        off = system.total + 4 * UNIT * mass + left / (1.0 - system.damping)
        if np.isfinite(kappa):
            off = min(off, sum(part[1] for part in parts) + kappa * mass)
        off *= _SUMS
        if not off < 0.5 * mass:
            return None
        whole = 2 * off / mass + 64 * UNIT
        if not np.isfinite(kappa):
            y /= mass
            return Updated(y, Bound(BoundKind.L1, whole, absolute=whole), visits)
        own *= _SUMS
        sums = each(
            lambda piece: rescale(*piece, y, own, kappa, mass, off, whole), pieces, watch.threads
        )
        value = min(whole, sum(sums) * _SUMS)
        return Updated(y, Bound(BoundKind.COMPONENTWISE, value, absolute=own), visits)


def _system(graph: Graph, result: Result) -> _System | None:
    """The linear system that ``result`` solves; None where it is not one that can be updated."""
    if result.refusal is not None or not np.isfinite(result.bound.value):
        return None
    total = float(result.bound.value) * float(np.abs(result.scores).sum()) * _SUMS
    settings: Any = result.settings
    if result.measure == "katz":
        alpha = fact(result, "alpha", 0.0)
        beta = settings.beta
        b = (
            np.array([float(beta)])
            if isinstance(beta, int | float)
            else node_vector(graph, beta, "--beta")
        )
        if alpha <= 0 or (b <= 0).any() or result.bound.relative is None:
            return None
        return _System(np.full(graph.n, alpha), b, None, total)
    if result.measure != "surfer" or settings.damping >= 1.0:
        return None
    mode, teleport = settings.dangling, settings.teleport
    if not isinstance(mode, str) or (mode == "uniform" and teleport is not None):
        return None
    d = float(settings.damping)
    strength = strengths(graph.push(flow_of(result)), np.arange(graph.n, dtype=np.uint32))
    scale = np.zeros(graph.n)
    np.divide(d, strength, out=scale, where=strength > 0)
    # Scores of sum 1 take (1 - d) v, and what dangling nodes send: from below.
    hanging = float(result.scores[strength == 0].sum())
    inflow = max(1.0 - d, (1.0 - d + d * (hanging - total)) * (1 - 2.0**-20))
    v = (
        np.array([1.0 / graph.n])
        if teleport is None
        else distribution(graph, teleport, "--teleport")
    )
    return _System(scale, inflow * v, d, total)


def _kept(graph: Graph, result: Result, system: _System) -> Floats | None:
    """A positive lower bound of ``(I - B) x`` in every row, shape (n,); None where there is none.

    The certificate ``|b - (I - B) x| <= c (I - B) x`` gives ``b / (1 + c)``.  Any other proof of
    ``|x* - x| <= c x`` gives ``b - 2 c / (1 - c) x``: as ``B x* = x* - b``,
    ``|(I - B) (x - x*)| <= c x + c B x`` and ``B x <= ((1 + c) x - b) / (1 - c)``.  On an acyclic
    graph Katz's c may be such another proof.
    """
    c = result.bound.relative
    if c is None or not c < 0.5 or not (system.b > 0).all():
        return None
    if system.damping is None and graph.structure.acyclic:
        kept: Floats = system.b - (2 * c / (1 - c) * (1 + 16 * UNIT)) * result.scores
    else:
        kept = np.broadcast_to(system.b / (1 + c), graph.n)
    kept = kept * (1 - 16 * UNIT)
    return np.ascontiguousarray(kept) if bool((kept > 0).all()) else None
