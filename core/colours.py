"""Which nodes must have exactly equal scores, because their equations are the same.

The coarsest partition in which two nodes of a class have the same right-hand side and as many
givers of every class with every scale and weight.  The exact solution of
``x = b + B x``, and the Perron vector of an irreducible B, are constant on its classes: this is
what tells a true tie from two scores that the error bound cannot separate.

Colours are 64-bit hashes, so two different classes are taken for one with a probability of
about n^2 / 2^65: 2e-7 for 2.7 million nodes.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Floats, Flow
from kingpost.core.operators import Order, Pull
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage, plan, swept_stage
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

Hashes = NDArray[np.uint64]

_ROUNDS = 200
_VISITS = 400_000_000  # edges read before the search for ties is given up on a large graph


def colours(
    matrix: Pull,
    b: Floats,
    watch: Watch,
    structure: Structure | None = None,
    flow: Flow = "along",
    pools: NDArray[np.uint32] | None = None,
) -> NDArray[np.int64] | None:
    """Classes of nodes with the same equations, shape (n,), numbered by their first members.

    Given the ``structure`` of the graph (and the ``flow`` of the score), rows on no cycle are
    coloured in one visit; cyclic stages, or everything, in rounds until no class splits.

    ``pools`` (shape (n,), numbered from 0) says what is known already: nodes of different pools
    have different exact scores, hence different equations.  The coarsest partition is finer than
    the pools, so that refining these ends at the same classes, after few rounds and over the
    rows of pools with several members alone.

    None where that takes more than 200 rounds or 400 million edge visits, or ``watch`` was
    cancelled: an unstable partition proves nothing.
    """
    from kingpost.core.kernels.colour import gifts, refine_once, scatter

    rows, n = matrix.rows, matrix.n
    bits = None if rows.weights is None else rows.weights.view(np.uint64)
    scale_bits = (matrix.scale + 0.0).view(np.uint64)  # + 0.0: -0 is 0
    start = np.unique(np.broadcast_to(b, n) + 0.0, return_inverse=True)[1] if len(b) > 1 else 0
    colour = np.zeros(n, dtype=np.uint64)
    colour += np.asarray(start, dtype=np.uint64).ravel()
    gift = np.empty_like(colour)
    if structure is None:
        order = np.arange(n, dtype=np.uint32)
        stages = [swept_stage(rows, order, 0, n)] if n else []
    else:
        made = plan(structure, rows, flow)
        order, stages = made.order, made.stages
    if pools is not None:
        scatter(order, 0, n, pools, 0, colour)
    gifts(order, 0, n, colour, scale_bits, gift)
    if pools is not None:
        # Whoever has a pool alone is a class alone, whatever the others turn out to be.
        order, stages = _thinned(order, stages, np.bincount(pools)[pools] > 1, rows)
    visits = 0
    for number, stage in enumerate(stages):
        if stage.swept:
            # Refined to different depths, colours of different stages mean different things:
            # they must never be equal.
            if pools is None:
                colour[order[stage.low : stage.high]] += np.uint64((number + 1) << 32)
            else:
                scatter(order, stage.low, stage.high, pools, number + 1, colour)
            gifts(order, stage.low, stage.high, colour, scale_bits, gift)
            visits = _settle(matrix, bits, scale_bits, order, stage, colour, gift, visits, watch)
            if visits < 0:
                return None
            continue
        for ((low, high),) in stage.steps:
            if watch.cancelled:
                return None
            refine_once(
                rows.offsets, rows.neighbours, bits, order, low, high, scale_bits, colour, gift
            )
    return _classes(colour, order)


def _thinned(
    order: Order, stages: list[Stage], keep: NDArray[np.bool_], rows: Adjacency
) -> tuple[Order, list[Stage]]:
    """The same stages over those nodes only that are to be kept."""
    kept = keep[order]
    place = np.zeros(len(order) + 1, dtype=np.int64)
    np.cumsum(kept, out=place[1:])
    thin = order[kept]
    sizes = np.zeros(len(thin) + 1, dtype=np.int64)
    np.cumsum(rows.degrees[thin], out=sizes[1:])

    def moved(stage: Stage) -> Stage:
        low, high = int(place[stage.low]), int(place[stage.high])
        steps = [[(int(place[a]), int(place[b])) for a, b in step] for step in stage.steps]
        return Stage(low, high, stage.swept, int(sizes[high] - sizes[low]), steps)

    return thin, [moved(stage) for stage in stages if place[stage.low] < place[stage.high]]


def _classes(colour: Hashes, order: Order) -> NDArray[np.int64]:
    """For every node the least one of its colour; nodes not in ``order`` are classes alone."""
    classes = np.arange(len(colour))
    nodes = order.astype(np.int64)
    nodes = nodes[np.argsort(colour[nodes])]
    if len(nodes):
        ordered = colour[nodes]
        heads = np.flatnonzero(np.concatenate(([True], ordered[1:] != ordered[:-1])))
        least = np.minimum.reduceat(nodes, heads)
        classes[nodes] = np.repeat(least, np.diff(heads, append=len(nodes)))
    return classes


def _settle(
    matrix: Pull,
    bits: Hashes | None,
    scale_bits: Hashes,
    order: Order,
    stage: Stage,
    colour: Hashes,
    gift: Hashes,
    visits: int,
    watch: Watch,
) -> int:
    """Refine one stage until no class splits; returns the edge visits so far, or -1."""
    from kingpost.core.kernels.colour import gifts, refine

    rows, nodes = matrix.rows, order[stage.low : stage.high]
    blocks = [block for step in stage.steps for block in step]
    found = _distinct(colour[nodes])
    fresh = np.empty_like(colour)
    for number in range(_ROUNDS):
        if watch.cancelled or (number > 3 and visits > _VISITS):
            return -1
        visits += stage.edges
        each(
            lambda block: refine(
                rows.offsets, rows.neighbours, bits, order, *block, colour, gift, fresh
            ),
            blocks,
            watch.threads,
        )
        mine = fresh[nodes]
        seen = _distinct(mine)
        stable = seen == found
        found = seen
        colour[nodes] = mine
        gifts(order, stage.low, stage.high, colour, scale_bits, gift)
        if stable or seen == len(nodes):
            return visits
    return -1


def _distinct(values: Hashes) -> int:
    ordered = np.sort(values)
    return int(np.count_nonzero(ordered[1:] != ordered[:-1])) + 1
