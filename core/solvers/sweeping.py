"""One Gauss-Seidel sweep over a stage, its blocks side by side in fixed lanes."""

from __future__ import annotations

from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage
from kingpost.core.watch import Watch

Block = tuple[int, int]


def sweep(
    matrix: Pull, b: Floats, order: Order, stage: Stage, z: Floats, x: Floats, watch: Watch
) -> tuple[float, float]:
    """Update ``x`` in the rows of ``stage`` by ``x = b + B x``; returns ``sum |change|, sum |x|``.

    ``z`` holds ``scale * x`` once for every lane, shape (lanes, n): a lane sees its own new
    values and the others' of the step before, so what comes out does not depend on how many
    threads run.  All lanes agree again at the end.  Raises Interrupted between steps, with x
    updated in part.
    """
    from kingpost.core.kernels.rows import copy_rows
    from kingpost.core.kernels.sweep import gauss_seidel

    rows, loops = matrix.rows, matrix.loops
    moved = mass = 0.0
    last: list[Block] = []

    def lane(part: tuple[int, Block, list[Block]]) -> tuple[float, float]:
        number, (low, high), others = part
        for other, block in enumerate(others):
            if other != number:
                copy_rows(order, *block, z[other], z[number])
        sums: tuple[float, float] = gauss_seidel(
            rows.offsets, rows.neighbours, rows.weights, order, low, high,
            b, matrix.scale, loops, z[number], x,
        )  # fmt: skip
        return sums

    for step in stage.steps:
        watch.check()
        blocks = [(k, block, last) for k, block in enumerate(step)]
        for block_moved, block_mass in each(lane, blocks, watch.threads):
            moved += block_moved
            mass += block_mass
        last = step
    for other, block in enumerate(last):
        for number in range(len(z)):
            if other != number:
                copy_rows(order, *block, z[other], z[number])
    return moved, mass
