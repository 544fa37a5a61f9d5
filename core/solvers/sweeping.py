"""One Gauss-Seidel sweep over a stage, its blocks side by side in fixed lanes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple, TypeVar

import numpy as np

from kingpost.core.graph import Floats
from kingpost.core.operators import Order, Pull
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage
from kingpost.core.watch import Watch

Block = tuple[int, int]
R = TypeVar("R")


def in_lanes(
    stage: Stage, order: Order, z: Floats, visit: Callable[[int, int, Floats], R], watch: Watch
) -> list[R]:
    """``visit(low, high, z of its lane)`` for every block of ``stage``, in fixed order.

    ``z`` holds the values that rows are made of once for every lane, shape (lanes, n), and
    ``visit`` renews them for its rows: a lane sees its own new values and the others' of the step
    before, so what comes out does not depend on how many threads run.  All lanes agree again at
    the end.  Raises Interrupted between steps, with part of the rows renewed.
    """
    from kingpost.core.kernels.rows import copy_rows

    found: list[R] = []
    last: list[Block] = []

    def lane(part: tuple[int, Block, list[Block]]) -> R:
        number, block, others = part
        for other, rows in enumerate(others):
            if other != number:
                copy_rows(order, *rows, z[other], z[number])
        return visit(*block, z[number])

    for step in stage.steps:
        watch.check()
        blocks = [(k, block, last) for k, block in enumerate(step)]
        found += each(lane, blocks, watch.threads)
        last = step
    for other, rows in enumerate(last):
        for number in range(len(z)):
            if other != number:
                copy_rows(order, *rows, z[other], z[number])
    return found


class Swept(NamedTuple):
    """What a sweep tells: see :func:`kingpost.core.kernels.sweep.gauss_seidel`."""

    moved: float
    mass: float
    farthest: float
    weight: float
    image: float


@dataclass(frozen=True)
class Weighing:
    """What is summed up on the way: ``left`` (n,) or (1,) and ``given`` (n,) times x."""

    left: Floats
    given: Floats


UNWEIGHED = Weighing(np.ones(1), np.empty(0))


def sweep(
    matrix: Pull,
    b: Floats,
    order: Order,
    stage: Stage,
    z: Floats,
    x: Floats,
    watch: Watch,
    *,
    root: float = 1.0,
    loops: Floats | None = None,
    weighing: Weighing = UNWEIGHED,
) -> Swept:
    """Update ``x`` in the rows of ``stage`` by ``root x = b + B x``.

    ``z`` is ``scale * x`` for every lane, see :func:`in_lanes`.  ``loops`` are the self-loops to
    solve for, by default all.
    """
    from kingpost.core.kernels.sweep import gauss_seidel

    rows = matrix.rows
    loops = matrix.loops if loops is None else loops

    def block(low: int, high: int, mine: Floats) -> tuple[float, ...]:
        sums: tuple[float, ...] = gauss_seidel(
            rows.offsets, rows.neighbours, rows.weights, order, low, high, b, root,
            matrix.scale, loops, weighing.left, weighing.given, mine, x,
        )  # fmt: skip
        return sums

    moved, mass, farthest, weight, image = zip(
        *in_lanes(stage, order, z, block, watch), strict=True
    )
    return Swept(sum(moved), sum(mass), float(np.max(farthest)), sum(weight), sum(image))
