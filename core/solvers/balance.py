"""Mass balance of one stage of ``x = b + B x``: what comes in must be what goes out.

Adding up the rows S of a stage, ``sum_S x - sum_S c x = sum_S b + sum_S (B x outside)`` with
c[j] the sum of column j over S.  An iterate is scaled to obey it after each sweep, which takes
out at once the slowest direction a surfer's sweeps have: the growth of the whole (Del Corso,
Gulli, Romani, Internet Math. 2, 2005, sweep the same system without it).  The exact solution
obeys it, so it stays where it is.  Worth its vector pass on large stages only.
"""

from __future__ import annotations

from typing import cast

import numpy as np

from kingpost.core.certify import UNIT
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.operators import Order, Pull, given_back
from kingpost.core.parallel import each
from kingpost.core.solvers.stages import Stage
from kingpost.core.solvers.sweeping import Swept, Weighing
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

LEAST = 1_000_000  # edges of a stage


class Balance:
    """The balance of one stage, for the values that enter it now."""

    def __init__(
        self, matrix: Pull, b: Floats, order: Order, stage: Stage, structure: Structure,
        z: Floats, watch: Watch,
    ) -> None:  # fmt: skip
        self._order, self._threads = order, watch.threads
        self._pieces = [block for step in stage.steps for block in step if block[0] < block[1]]
        given = _given(matrix, order, stage, structure, watch)
        inside = order[stage.low : stage.high]
        own = float(b[0]) * len(inside) if len(b) == 1 else float(b[inside].sum())
        enters = z * given
        enters[inside] = 0.0
        self._income = own + float(enters.sum())
        # What the sweeps' sums of x, by 256 and of these, and those of long rows may be off by.
        longest = int(matrix.rows.degrees[inside].max())
        self._slack = UNIT * (256 + len(inside) / 256 + longest / 4)
        self.weighing = Weighing(np.ones(1), given * matrix.scale)

    def factor(self, swept: Swept) -> float:
        """By what to multiply x in the stage after a sweep with ``weighing``; 1 if it is wild."""
        kept = swept.weight - swept.image
        found = self._income / kept if kept > 0 else 1.0
        # Near the end the rounding of these sums would be all that a factor brings in.
        fine = self._slack * (abs(swept.weight) + abs(swept.image))
        return found if 0.2 < found < 5.0 and abs(found - 1.0) * kept > fine else 1.0

    def scale(self, factor: float, x: Floats, z: Floats) -> None:
        """Multiply ``x`` (n,) and all lanes of ``z`` by ``factor`` in the stage."""
        from kingpost.core.kernels.mixing import multiply

        each(
            lambda block: multiply(self._order, *block, factor, x, z, len(z)),
            self._pieces,
            self._threads,
        )


def _given(matrix: Pull, order: Order, stage: Stage, structure: Structure, watch: Watch) -> Floats:
    """Sum of the weights from every node to the rows of a stage, shape (n,); kept."""

    rows, key = matrix.rows, f"given {stage.low} {stage.high} {int(order[0])}"
    kept = cast("tuple[Adjacency, Floats] | None", structure.cache.get(key))
    if kept is not None and kept[0] is rows:
        return kept[1]

    total = given_back(rows, order, stage.low, stage.high, np.ones(1), watch)
    structure.cache[key] = rows, total
    return total
