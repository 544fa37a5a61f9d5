"""``x = e^B u`` for a nonnegative matrix B and u >= 0 by the sum ``B^k u / k!``, with a proof.

All terms are nonnegative: nothing cancels, the partial sums grow towards x, and each is wrong by
a few roundings only.  Where the sum may end is read off the terms.  With ``v_k = B^k u / k!`` and q
the largest ratio ``(B v_k)_i / v_k,i``, ``B^j v_k <= q^j v_k`` in every component, so that what is
left out after ``v_k`` is at most ``v_k r / (1 - r)``, ``r = q / (k + 1)``, component by component.
For u > 0 the supports of the terms only shrink (a walk of k + 1 steps to a node holds one of k
steps), so q is finite; and it never grows.  On an acyclic graph the terms end by themselves.

Rounding: a computed term is off by at most ``k ROW_UNITS u`` of itself (see
:mod:`kingpost.core.kernels.series`), the sum by that of the last term and one unit for each
addition.  Values lost to underflow are below 1e-280 of the scores: whatever a lost walk could
still become, its later part alone is a walk that was counted in full.

Reference for the comparison with Krylov methods, which do not keep signs: Al-Mohy and Higham,
"Computing the action of the matrix exponential", SIAM J. Sci. Comput. 33, 2011.
"""

from __future__ import annotations

from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Floats
from kingpost.core.operators import Pull
from kingpost.core.parallel import each
from kingpost.core.result import Iteration, Stop
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.watch import Watch

_FLOOR = 1e-280


@dataclass
class Exponential:
    """``e^B u``: partial sum x, bound of what each entry lacks or rounds off, number of terms.

    ``overflow`` tells that the numbers left the range of double precision; then x is no answer.
    ``ended`` tells that the series ended by itself.
    """

    x: Floats
    error: Floats
    terms: int
    stop: Stop
    overflow: bool = False
    ended: bool = False

    @property
    def bound(self) -> float:
        """``sum error / sum x``."""
        return float(self.error.sum()) / float(self.x.sum())


def exponential(
    matrix: Pull,
    u: Floats,
    *,
    tol: float,
    max_terms: int,
    watch: Watch,
    ledger: Ledger,
    enough: Callable[[Floats, Floats], bool] | None = None,
) -> Generator[Iteration, None, Exponential]:
    """Sum the series for u > 0 until ``sum error <= tol sum x``; one Iteration a term.

    ``enough(x, error)`` may be content earlier; it is asked while the bound is falling.
    """
    work = _Sum(matrix, u, watch)
    stop = Stop.LIMIT
    before = float("inf")
    while work.terms < max_terms:
        try:
            work.step()
        except Interrupted:
            stop = Stop.CANCELLED
            break
        if not np.isfinite(work.mass):
            return Exponential(work.x, work.x, work.terms, Stop.STALLED, overflow=True)
        ledger.sweeps, ledger.visits = ledger.sweeps + 1, ledger.visits + matrix.stored
        bound = work.bound
        yield ledger.line(work.made / work.mass, bound, "series")
        if work.made == 0.0:
            stop = Stop.CONVERGED if bound <= tol else Stop.STALLED
            break
        if bound <= tol:
            stop = Stop.CONVERGED
            break
        if work.share * 4 < work.rounding:
            stop = Stop.STALLED  # what is left out is less than what is rounded
            break
        if enough is not None and bound < 1e-2 and bound < 0.2 * before:
            before = bound
            if enough(work.x, work.error()):
                stop = Stop.ORDER_PROVEN
                break
    return Exponential(work.x, work.error(), work.terms, stop, ended=work.made == 0.0)


class _Sum:
    def __init__(self, matrix: Pull, u: Floats, watch: Watch) -> None:
        self.matrix, self.watch = matrix, watch
        self.v, self.x = u.copy(), u.copy()
        self._fresh: Floats = np.empty(matrix.n)
        self.terms = 0
        self.made = self.mass = float(u.sum())
        self.left = float("inf")  # the tail is at most this multiple of v
        self._ratio = float("inf")

    def step(self) -> None:
        """Add the next term."""
        from kingpost.core.kernels.series import next_term

        rows, z, floor = self.matrix.rows, self.matrix.scale * self.v, _FLOOR
        v, fresh, x = self.v, self._fresh, self.x
        self.watch.check()
        done = each(
            lambda part: next_term(
                rows.offsets, rows.neighbours, rows.weights, *part, self.terms + 1.0, floor,
                z, v, fresh, x,
            ),
            self.matrix.pieces,
            self.watch.threads,
        )  # fmt: skip
        # The ratio of the last term bounds that of this one too.
        self._ratio = min(self._ratio, max((part[0] for part in done), default=0.0))
        self.made = float(sum(part[1] for part in done))
        self.mass = float(sum(part[2] for part in done))
        self.v, self._fresh = fresh, v
        self.terms += 1
        r = self._ratio * (1 + 1e-9) / (self.terms + 1)
        self.left = r / (1 - r) if r < 1 else float("inf")

    @property
    def rounding(self) -> float:
        """Bound of the rounding error, relative to every entry."""
        from kingpost.core.kernels.series import ROW_UNITS

        units = UNIT * ((self.terms + 1) * (ROW_UNITS + 1) + 4)
        return units / (1 - units)

    @property
    def share(self) -> float:
        """What is left out, relative to the sum of all entries."""
        return self.left * self.made / self.mass if self.made > 0 else 0.0

    @property
    def bound(self) -> float:
        """Left out and rounded off, relative to the sum of all entries."""
        return self.share * (1 + 1e-9) + self.rounding

    def error(self) -> Floats:
        """The same for every entry, shape (n,)."""
        if self.made == 0.0:
            return self.x * self.rounding
        if not np.isfinite(self.left):
            return np.full(self.matrix.n, np.inf)
        found: Floats = self.v * (self.left * (1 + 1e-9)) + self.x * self.rounding
        return found
