"""Cutting a linear system along the strong components of its graph.

Rows outside cycles are solved once, in condensation order; only the rows of cyclic components
are swept.  Large components are stages of their own, small ones between them share one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Flow
from kingpost.core.operators import ROW, Order, cut, entries_of
from kingpost.core.structure import Structure

_LARGE = 0.02  # share of all cyclic edges above which a component is a stage of its own
_LANES = 2  # blocks swept side by side; fixed, so that bits do not depend on the threads
_SPLIT = 6_000_000  # edges above which a stage is worth splitting, see swept_stage
_PIECE = 1_000_000  # edges of rows solved once between two looks at whether to stop
_BLOCK = 500_000  # edges in a block of a stage that is split


@dataclass(frozen=True)
class Stage:
    """Rows ``order[low:high]``: swept until settled, or solved once.

    ``steps`` are done one after the other, the blocks of one step side by side."""

    low: int
    high: int
    swept: bool
    edges: int
    steps: list[list[tuple[int, int]]]

    @property
    def lanes(self) -> int:
        """The most blocks that are worked on side by side."""
        return max(len(step) for step in self.steps)


@dataclass(frozen=True)
class Plan:
    """The order to visit the rows in, and its stages, upstream first."""

    order: Order
    stages: list[Stage]

    @property
    def lanes(self) -> int:
        """The most blocks that are worked on side by side."""
        return max((stage.lanes for stage in self.stages), default=1)

    @property
    def swept(self) -> list[tuple[int, int]]:
        """Ranges of ``order`` that need sweeps."""
        return [(stage.low, stage.high) for stage in self.stages if stage.swept]


def plan(structure: Structure, rows: Adjacency, flow: Flow) -> Plan:
    """Stages of a system whose scores flow ``flow`` through the graph of ``structure``."""
    n, count = len(structure.order), structure.count
    along = flow == "along"
    order = structure.order if along else np.ascontiguousarray(structure.order[::-1])
    starts = structure.starts if along else n - structure.starts[::-1]
    cyclic, inner = structure.cyclic, structure.inner
    if not along:
        cyclic, inner = (count - 1 - cyclic)[::-1], inner[::-1]
    single = starts[cyclic + 1] - starts[cyclic] == 1  # a self-loop alone is solved for exactly
    cyclic, inner = cyclic[~single], inner[~single]
    large = set(cyclic[inner >= _LARGE * max(int(inner.sum()), 1)].tolist())

    stages: list[Stage] = []
    at = 0
    run: list[int] = []
    for number in [*_marked(cyclic, large), count]:
        if number in large or number == count:
            if run:
                first, last = int(starts[run[0]]), int(starts[run[-1] + 1])
                _once(stages, rows, order, at, first)
                stages.append(swept_stage(rows, order, first, last))
                at, run = last, []
            if number < count:
                first, last = int(starts[number]), int(starts[number + 1])
                _once(stages, rows, order, at, first)
                stages.append(swept_stage(rows, order, first, last))
                at = last
        else:
            run.append(number)
    _once(stages, rows, order, at, n)
    return Plan(order, stages)


def _marked(cyclic: NDArray[np.int64], large: set[int]) -> list[int]:
    """Large components, and of the small ones between them the first and the last."""
    keep: list[int] = []
    numbers = cyclic.tolist()
    for position, number in enumerate(numbers):
        before = numbers[position - 1] if position else None
        after = numbers[position + 1] if position + 1 < len(numbers) else None
        edge = before is None or after is None or before in large or after in large
        if number in large or edge:
            keep.append(number)
    return keep


def _once(stages: list[Stage], rows: Adjacency, order: Order, low: int, high: int) -> None:
    if low < high:
        edges = entries_of(rows, order, low, high)
        pieces = cut(rows, order, low, high, _PIECE)
        stages.append(Stage(low, high, False, edges, [[piece] for piece in pieces]))


def swept_stage(rows: Adjacency, order: Order, low: int, high: int) -> Stage:
    """Rows ``order[low:high]`` to be swept, cut into the blocks of fixed lanes if they are many.

    Blocks that are swept side by side do not see each other's new values.  Where most edges lead
    one way that costs sweeps, on the layered bench graph of 3.4 million edges twice as many in
    eight blocks, so small stages are left whole and large ones cut fine.
    """
    edges = entries_of(rows, order, low, high)
    if edges < _SPLIT:
        return Stage(low, high, True, edges, [[(low, high)]])
    blocks = _LANES * round(edges / (_LANES * _BLOCK))
    pieces = cut(rows, order, low, high, -(-(edges + ROW * (high - low)) // blocks))
    pieces += [(high, high)] * (-len(pieces) % _LANES)  # every lane takes part in every step
    steps = [pieces[at : at + _LANES] for at in range(0, len(pieces), _LANES)]
    return Stage(low, high, True, edges, steps)
