"""``(e^B)_ii`` of a symmetric nonnegative B between two ends, by Gauss and Gauss-Radau rules.

k Lanczos steps from ``e_i`` give a tridiagonal T.  As all derivatives of the exponential are
positive, ``(e^T)_11`` (Gauss) is a lower end of ``(e^B)_ii``; with one more row that gives T the
eigenvalue b, no less than any of B, ``(e^R)_11`` (Gauss-Radau) is an upper end (Golub and Meurant,
"Matrices, Moments and Quadrature with Applications", 2010, ch. 6 and 7).

Rounding, as a theorem.  Let V hold the computed vectors, F the residual
``B V - V T - beta v_(k+1) e_k^T`` and g the norm of ``V^T V - I``, both bounded afterwards.  The
orthonormal Q nearest to V is within 1.3 g of it, so the residual F' of Q has norm at most
``|F| + 5 g (|B| + |T|)``, and ``B' = B - F' Q^T - Q F'^T + Q Q^T F' Q^T`` is a symmetric matrix
of which Q and T are exactly what Lanczos makes of ``q_1``; it is no further from B than
``d = 3 |F'|``.  Both rules hold for B'; and ``|e^B - e^B'| <= d e^(|B| + d)``, while q_1 for e_i
costs no more than ``3 g e^|B|``.  The numbers ``(e^T)_11`` are summed from positive terms alone,
T shifted to be nonnegative; R is made by a recurrence whose rounding counts as some more distance
of T.  The ends are moved apart by all of that.
"""

from __future__ import annotations

import math
import time
from collections.abc import Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.parallel import each
from kingpost.core.result import Iteration
from kingpost.core.solvers.closed import LANES, Closed
from kingpost.core.watch import Watch

_STEPS = 60
_LOT = 16  # nodes between two lines of the log


@dataclass(frozen=True)
class Ends:
    """``low <= (e^B)_ii <= high``, as a theorem, and the Lanczos steps it took."""

    low: float
    high: float
    steps: int


class Quadrature:
    """Lanczos from one node after the other; ``factor rows`` is symmetric, of 2-norm at most
    ``norm``, and may have up to a few million entries."""

    def __init__(self, rows: Adjacency, factor: float, norm: float, watch: Watch) -> None:
        from kingpost.core.kernels.series import ROW_UNITS

        self.rows, self.factor, self.norm, self.watch = rows, factor, norm, watch
        n = len(rows.offsets) - 1
        self.most = min(_STEPS, n)
        self.basis = np.zeros((self.most + 1, n))
        self.image = np.empty(n)
        self.units = min(ROW_UNITS, float(rows.degrees.max(initial=0)) + 13)
        self.dots = min(ROW_UNITS, float(n) + 13)
        self.visits = self.steps = 0

    def ends(self, node: int, tol: float) -> Ends:
        """Ends of the entry at ``node``, no further apart than ``tol`` of it if that can be had.

        Raises:
            Interrupted: if the watch was cancelled.
        """
        from kingpost.core.kernels.lanczos import begin, step

        rows = self.rows
        alpha, beta, faults = (np.zeros(self.most) for _ in range(3))
        begin(node, self.basis)
        floor = 1e-13 * self.norm
        ends = Ends(1.0, math.exp(min(self.norm, 709.0)) * (1 + 1e-12), 0)
        before = math.inf
        for k in range(1, self.most + 1):
            self.watch.check()
            going = step(
                rows.offsets, rows.neighbours, rows.weights, self.factor, k - 1, floor,
                self.basis, self.image, alpha, beta, faults,
            )  # fmt: skip
            self.visits += len(rows.neighbours)
            if going and k < 3 and k < self.most:
                continue
            ends = self._ends(alpha[:k], beta[:k], faults[:k], going)
            width = (ends.high - ends.low) / ends.low if ends.low > 0 else math.inf
            # Behind the rounding there is nothing to be gained.
            if not going or width <= tol or (k > 8 and not width < 0.9 * before):
                break
            before = width
        return ends

    def _ends(self, alpha: Floats, beta: Floats, faults: Floats, going: bool) -> Ends:
        from kingpost.core.kernels.lanczos import defect

        k, norm = len(alpha), self.norm
        size = norm + float(np.abs(alpha).max() + 2 * beta.max(initial=0.0))
        fault = float(np.linalg.norm(faults)) * (1 + 1e-9)
        # Products (entries of |B||v| in norm at most |B|) and the subtractions behind them.
        fault += math.sqrt(k) * UNIT * (self.units * norm + 24 * size)
        if not going:  # what was cut off is within the floor
            fault += 1.1e-13 * norm
        g = float(defect(self.basis, k + 1 if going else k)) * (1 + 1e-9)
        g += (k + 1) * UNIT * (2 * self.dots + 8)
        if not g < 0.1:
            return Ends(1.0, math.inf, k)
        d = 3 * (fault + 5 * g * (norm + size)) + 32 * UNIT * size
        slip = (d + 3 * g) * math.exp(min(norm + d, 709.0)) * (1 + 1e-9)
        low, loose = _first_entry(alpha, beta[:-1])
        high = low
        if going:
            last = norm * (1 + 1e-9) + 2 * d
            high, loose = _first_entry(np.append(alpha, _radau(alpha, beta, last)), beta)
        return Ends(low * (1 - loose) - slip, high * (1 + loose) + slip, k)


def _radau(alpha: Floats, beta: Floats, last: float) -> float:
    """The diagonal entry that gives the extended matrix the eigenvalue ``last``."""
    pivot = alpha[0] - last
    for j in range(1, len(alpha)):
        pivot = alpha[j] - last - beta[j - 1] ** 2 / pivot
    return float(last + beta[-1] ** 2 / pivot)


def _first_entry(alpha: Floats, beta: Floats) -> tuple[float, float]:
    """``(e^T)_11`` for the symmetric tridiagonal T, by terms that are all nonnegative.

    Also how far it may be off, relative to itself.

    T + s I is nonnegative with s as large as needed; the sum goes on until a term no longer counts.
    """
    shift = max(0.0, -float(alpha.min()))
    diagonal = alpha + shift
    term: Floats = np.zeros(len(alpha))
    term[0] = 1.0
    total = term.copy()
    reach = float(diagonal.max() + 2 * beta.max(initial=0.0))
    k = 0
    while True:
        k += 1
        fresh = diagonal * term
        fresh[:-1] += beta * term[1:]
        fresh[1:] += beta * term[:-1]
        term = fresh / k
        total += term
        if k > 2 * reach and float(term.sum()) < 1e-18 * float(total[0]):
            # Six roundings a term, the sum's, the exponential's and what is left out.
            return float(total[0]) * math.exp(-shift), UNIT * (8 * k + 16 + 2 * shift)


def between(
    rows: Adjacency,
    factor: float,
    nodes: NDArray[np.int64],
    norm: float,
    tol: float,
    watch: Watch,
) -> Generator[Iteration, None, Closed]:
    """The diagonal of ``e^(factor A)`` at ``nodes``, A symmetric of 2-norm at most ``norm/factor``.

    ``value`` is the middle of the two ends, ``error`` half their distance.  Every node is worked
    on by itself, so the number of threads changes nothing.  Cancelled, it returns what it has.
    """
    began = time.perf_counter()
    found = Closed(np.ones(len(nodes)), np.full(len(nodes), np.inf))
    if norm > 700.0:
        found.overflow = True
        return found
    lanes = [Quadrature(rows, factor, norm, watch) for _ in range(max(1, min(LANES, len(nodes))))]

    def lot(number: int) -> None:
        lane = lanes[number % len(lanes)]
        for k in range(number * _LOT, min((number + 1) * _LOT, len(nodes))):
            ends = lane.ends(int(nodes[k]), tol)
            middle = 0.5 * (ends.low + ends.high)
            found.value[k] = middle
            found.error[k] = 0.5 * (ends.high - ends.low) * (1 + 1e-12) + 2 * UNIT * middle
            lane.steps = max(lane.steps, ends.steps)

    lots = -(-len(nodes) // _LOT)
    try:
        for number in range(0, lots, len(lanes)):
            some = range(number, min(number + len(lanes), lots))
            each(lot, some, watch.threads)
            found.done = min(some.stop * _LOT, len(nodes))
            found.visits = sum(lane.visits for lane in lanes)
            found.products = max(lane.steps for lane in lanes)
            watch.report("closing in on every node", found.done, len(nodes), "nodes")
            worst = float((found.error[: found.done] / found.value[: found.done]).max())
            yield Iteration(
                some.stop, float("nan"), worst, found.visits, time.perf_counter() - began,
                part=f"nodes {number * _LOT + 1:,} to {found.done:,} of {len(nodes):,}",
            )  # fmt: skip
    except Interrupted:
        pass
    return found
