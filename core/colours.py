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

from kingpost.core.graph import Floats, Flow
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
) -> NDArray[np.int64] | None:
    """Classes of nodes with the same equations, shape (n,), numbered from 0.

    Given the ``structure`` of the graph (and the ``flow`` of the score), rows on no cycle are
    coloured in one visit; cyclic stages, or everything, in rounds until no class splits.

    None where that takes more than 200 rounds or 400 million edge visits, or ``watch`` was
    cancelled: an unstable partition proves nothing.
    """
    from kingpost.core.kernels.colour import gifts, refine_once

    rows, n = matrix.rows, matrix.n
    bits = None if rows.weights is None else rows.weights.view(np.uint64)
    scale_bits = (matrix.scale + 0.0).view(np.uint64)  # + 0.0: -0 is 0
    start = np.unique(np.broadcast_to(b, n) + 0.0, return_inverse=True)[1]
    colour = start.ravel().astype(np.uint64)
    gift = np.empty_like(colour)
    if structure is None:
        order = np.arange(n, dtype=np.uint32)
        stages = [swept_stage(rows, order, 0, n)] if n else []
    else:
        made = plan(structure, rows, flow)
        order, stages = made.order, made.stages
    gifts(order, 0, n, colour, scale_bits, gift)
    visits = 0
    for number, stage in enumerate(stages):
        if stage.swept:
            # Refined to different depths, colours of different stages mean different things:
            # they must never be equal.
            colour[order[stage.low : stage.high]] += np.uint64((number + 1) << 32)
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
    classes = np.unique(colour, return_inverse=True)[1]
    return classes.astype(np.int64).ravel()


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
