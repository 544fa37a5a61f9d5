"""The random surfer at damping 1: the stationary distribution of the walk itself.

It is unique exactly where the walk has one closed class.  A class is closed when no edge, and no
jump from a dangling node, leads out of it.  On the closed class the distribution solves a linear
system with an M-matrix:

* with dangling nodes inside, per unit of mass that jumps, ``y = P^T y + w``;
* without, holding one node p at 1, ``y = P_p^T y + P[p, :]`` (the Perron root, 1, is known).

Either way ``x = y / sum(y)``, and a guard vector bounds every error.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT, Residual
from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.measures.base import Solve
from kingpost.core.measures.common import Clock, conventions, reason, refused
from kingpost.core.measures.vectors import distribution
from kingpost.core.operators import Pull, told_apart, walk
from kingpost.core.result import Bound, BoundKind, Iteration, Result
from kingpost.core.solvers.guard import find_guard
from kingpost.core.solvers.linear import System
from kingpost.core.solvers.linear import solve as solve_linear
from kingpost.core.solvers.pinned import normalised_reach
from kingpost.core.structure import reachable
from kingpost.core.text import count
from kingpost.core.watch import Watch

if TYPE_CHECKING:
    from kingpost.core.measures.surfer import SurferSettings

_INSTEAD = "use a damping below 1"


def solve_stationary(graph: Graph, settings: SurferSettings, watch: Watch) -> Solve:
    """Scores at damping 1, or a refusal that says why there are none."""
    clock, log = Clock(), list[Iteration]()
    matrix, strength = walk(graph, settings.flow)
    dangling = strength == 0
    landing = _landing(graph, settings)
    if settings.dangling == "leak" and dangling.any():
        return refused(
            "surfer", graph, settings,
            "at damping 1 all mass leaks away through "
            + count(int(dangling.sum()), "dangling node"),
            f"{_INSTEAD}, or --dangling teleport", log,
        )  # fmt: skip
    found = closed_class(graph, settings.flow, dangling, landing, watch)
    if not isinstance(found, np.ndarray):
        return refused("surfer", graph, settings, found, _INSTEAD, log)
    inside = found
    clock.ready()
    scale = np.where(inside, matrix.scale, 0.0)
    pin: int | None = None
    if (dangling & inside).any():
        b = np.where(inside, landing, 0.0)
    else:
        pin = int(np.argmax(np.where(inside, graph.pull(settings.flow).degrees, -1)))
        near, weights = graph.push(settings.flow).row(pin)
        b = np.zeros(graph.n)
        b[near] = weights * scale[pin]
        scale[pin] = 0.0
    system = System(Pull(matrix.rows, scale), b, graph.structure, settings.flow)
    guard = yield from find_guard(
        system.matrix, graph.structure, settings.flow, inside.astype(np.float64),
        max_sweeps=settings.max_sweeps, watch=watch, ignore=pin,
    )  # fmt: skip

    def bounds(y: Floats, r: Residual) -> Bound:
        y = _held(y, inside, pin)
        total = float(y.sum())
        if guard is None or not total > 0:
            return Bound(BoundKind.NONE, float("inf"))
        errors = np.where(guard.live, guard.factor(r.reach + 4 * UNIT * y) * guard.w, 0.0)
        errors = normalised_reach(y, errors, 1)
        return Bound(BoundKind.COMPONENTWISE, float(errors.sum()), absolute=errors)

    done = yield from solve_linear(
        system, lambda y, r: (bounds(y, r).value, False),
        tol=settings.tol, max_sweeps=settings.max_sweeps, watch=watch,
    )  # fmt: skip
    bound = bounds(done.x, done.residual)
    y = _held(done.x, inside, pin)
    total = float(y.sum())
    stop = done.stop
    return Result(
        measure="surfer",
        settings=settings,
        scores=y / total if total > 0 else y,
        stop=stop,
        reason=reason(stop, bound.value, settings),
        bound=bound,
        log=tuple(done.log),
        conventions=conventions(
            graph,
            settings,
            **{
                "dangling nodes": f"{int(dangling.sum()):,} nodes without out-edges jump "
                + ("by the teleport vector" if settings.dangling == "teleport" else "elsewhere"),
                "damping 1": "the stationary distribution of the walk, no teleport; its one closed "
                f"class holds {count(int(inside.sum()), 'node')}, all others are exactly 0",
                "scores": "probabilities, sum 1",
            },
        ),
        seconds=clock.seconds(),
        facts={"damping": 1.0, "dangling nodes": int(dangling.sum()), "rate": done.rate},
        exact_zero=~inside,
        symmetry=lambda pools: _colours(graph, settings, inside, landing, watch, pools),
    )


def _held(y: Floats, inside: NDArray[np.bool_], pin: int | None) -> Floats:
    held = np.where(inside, y, 0.0)
    if pin is not None:
        held[pin] = 1.0
    return held


def _landing(graph: Graph, settings: SurferSettings) -> Floats:
    """Where dangling nodes jump, shape (n,), sum 1."""
    if not isinstance(settings.dangling, str):
        return distribution(graph, settings.dangling, "the dangling distribution")
    if settings.dangling == "teleport" and settings.teleport is not None:
        return distribution(graph, settings.teleport, "--teleport")
    return np.full(graph.n, 1.0 / graph.n)


def _colours(
    graph: Graph,
    settings: SurferSettings,
    inside: NDArray[np.bool_],
    landing: Floats,
    watch: Watch,
    pools: NDArray[np.uint32] | None,
) -> NDArray[np.int64] | None:
    from kingpost.core.colours import colours

    matrix, _ = walk(graph, settings.flow)
    apart = told_apart(matrix, graph.push(settings.flow))
    kept = Pull(matrix.rows, np.where(inside, apart.scale, 0.0))
    start = np.where(inside, landing, -1.0)
    return colours(kept, start, watch, graph.structure, settings.flow, pools)


def closed_class(
    graph: Graph,
    flow: Flow,
    dangling: NDArray[np.bool_],
    landing: Floats,
    watch: Watch,
) -> NDArray[np.bool_] | str:
    """Members of the one closed class of the walk as a mask (n,), or why there is not just one."""
    structure = graph.structure
    push = graph.push(flow)
    # A strong component is final when none of its edges leads elsewhere.
    leaves = np.zeros(structure.count, dtype=bool)
    rows = np.repeat(structure.component, push.degrees)
    away = structure.component[push.neighbours] != rows
    leaves[rows[away]] = True
    hanging = np.zeros(structure.count, dtype=bool)
    hanging[structure.component[dangling]] = True
    final = np.flatnonzero(~leaves & ~hanging)
    start = np.flatnonzero(landing > 0).astype(np.uint32)
    if dangling.any():
        caught = reachable(push, start, watch)
        if len(final) == 0 or not caught[structure.order[structure.starts[final]]].any():
            # Dangling nodes jump back to where their walks start: one class around the jump,
            # as long as a dangling node can be reached from there.
            if len(final) == 0:
                return caught
            return f"the walk has {len(final) + 1:,} closed classes, so it has no one distribution"
    if len(final) == 1:
        inside = np.zeros(graph.n, dtype=bool)
        inside[structure.members(int(final[0]))] = True
        return inside
    return f"the walk has {len(final):,} closed classes, so it has no one distribution"
