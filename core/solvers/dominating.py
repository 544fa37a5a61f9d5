"""Sharpen the Perron vector of one irreducible block until every score's bound is small enough.

With one node p held fixed, the others solve ``(rho I - B_p) x = B[:, p] x_p``, an M-matrix system
for :mod:`kingpost.core.solvers.linear`, at the best rho known.  What row p then asks for shows
how far that rho was off: it is moved by the Rayleigh quotient first, by the secant rule from
there, and never out of its bracket, which each new vector narrows (Collatz-Wielandt).  Errors are
bounded by the guard of :mod:`kingpost.core.solvers.pinned` alone; how the vector came about proves
nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT, Residual
from kingpost.core.errors import Interrupted
from kingpost.core.graph import Floats, Flow
from kingpost.core.layout import layout
from kingpost.core.operators import Pull
from kingpost.core.result import Bound, BoundKind, Iteration, Stop
from kingpost.core.solvers.guard import Guard
from kingpost.core.solvers.ledger import Ledger
from kingpost.core.solvers.linear import Solution, System
from kingpost.core.solvers.linear import solve as solve_linear
from kingpost.core.solvers.pinned import perron_reach, pinned_guard
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

_ROUNDS = 12


@dataclass
class Block:
    """An irreducible block of a nonnegative matrix, its vector and the bracket of its root.

    ``y`` is positive on ``inside`` and zero elsewhere, shape (n,); ``spread`` is the relative error
    that the entries of ``matrix`` themselves may have (0 where they are exact).  Where ``inside``
    also holds what the block feeds, ``home`` marks the block alone.  ``left`` is a left vector of
    the block, as near to an eigenvector as is known; ``product`` is ``B y`` by compensated sums
    and ``|B| |y|`` on the block, if known for this y.
    """

    matrix: Pull
    structure: Structure
    flow: Flow
    inside: NDArray[np.bool_]
    y: Floats
    rho: tuple[float, float]
    spread: float = 0.0
    home: NDArray[np.bool_] | None = None
    left: Floats | None = None
    product: tuple[Floats, Floats] | None = None


# From the vector and the bounds of its errors to the scores and the bounds of theirs.
Shape = Callable[[Floats, Floats], tuple[Floats, Floats]]
Enough = Callable[[Floats, Bound], bool]


def sharpen(
    block: Block,
    shape: Shape,
    *,
    tol: float,
    max_sweeps: int,
    watch: Watch,
    ledger: Ledger,
    enough: Enough | None = None,
) -> Generator[Iteration, None, tuple[Bound, Stop]]:
    """Improve ``block.y`` and ``block.rho`` in place; returns the bound and why it ended.

    The bound is that of the scores ``shape`` makes of y; its kind is NONE where none is proven.
    ``enough(scores, bound)`` may be content with less than ``tol``.
    """
    work = _Sharpening(block, shape, watch, ledger, max_sweeps)
    try:
        stop = yield from work.run(tol, enough)
    except Interrupted:
        stop = Stop.CANCELLED
    return work.bound, stop


class _Sharpening:
    def __init__(
        self, block: Block, shape: Shape, watch: Watch, ledger: Ledger, max_sweeps: int
    ) -> None:
        self.block, self.shape, self.watch = block, shape, watch
        self.ledger, self.max_sweeps = ledger, max_sweeps
        self.bound = Bound(BoundKind.NONE, float("inf"))
        home = block.inside if block.home is None else block.home
        # With the node held fixed through which most of the circulation runs, least is left of it.
        self.left = None if block.left is None else np.where(home, block.left, 0.0)
        through = block.y if self.left is None else block.y * self.left
        self.pin = int(np.argmax(np.where(home, through, 0.0)))
        self.fixed = block.rho[0] == block.rho[1]
        self._given = block.y
        self._all = np.arange(block.matrix.n, dtype=np.uint32)
        self._tried: list[tuple[float, float]] = []  # rho, and what row p made of it

    def run(self, tol: float, enough: Enough | None) -> Generator[Iteration, None, Stop]:
        """Bound, improve, bound again."""
        block, ledger = self.block, self.ledger
        guard = yield from self._guard()
        y: Floats = block.y
        for turn in range(_ROUNDS):
            if guard is None:
                break
            before = self.bound.value
            self._judge(y, guard)
            yield self._line()
            if self.bound.value <= tol:
                return Stop.CONVERGED
            if enough is not None and np.isfinite(self.bound.value):
                scores, _ = self.shape(block.y, np.zeros(len(y)))
                if enough(scores, self.bound):
                    return Stop.ORDER_PROVEN
            if ledger.sweeps >= self.max_sweeps:
                return Stop.LIMIT
            if turn > 1 and not self.bound.value < 0.7 * before:
                # What is left is rounding: let each row answer for its own.
                tight = yield from self._guard(self._reach(block.y))
                if tight is not None:
                    self._judge(block.y, tight)
                    yield self._line()
                return Stop.CONVERGED if self.bound.value <= tol else Stop.STALLED
            y = yield from self._improved(tol)
        if self.watch.cancelled:
            return Stop.CANCELLED
        return Stop.LIMIT if ledger.sweeps >= self.max_sweeps else Stop.STALLED

    def _line(self) -> Iteration:
        low, high = self.block.rho
        width = (high - low) / high
        return self.ledger.line(width, self.bound.value, "certified", (low, high))

    def _guard(self, g: Floats | None = None) -> Generator[Iteration, None, Guard | None]:
        block = self.block
        return (
            yield from self.ledger.relay(
                pinned_guard(
                    block.matrix, block.structure, block.flow, block.y, self.pin, block.rho[0],
                    max_sweeps=self.max_sweeps, watch=self.watch, g=g, left=self.left,
                ),
                "certificate",
            )
        )  # fmt: skip

    def _reach(self, y: Floats) -> Floats:
        block = self.block
        product = self._products(y)
        reach = perron_reach(*product, y, block.rho)
        if block.spread:
            # The entries' own errors: as much of B y, which is y up to the reach.
            reach = reach + 2 * block.spread * (y + reach)
        return np.where(block.inside, reach, 0.0)

    def _products(self, y: Floats) -> tuple[Floats, Floats]:
        """``B y`` by compensated sums, and ``|B| |y|``, shape (n,); right inside alone."""
        block = self.block
        if block.product is None or y is not self._given:
            self.ledger.visits += block.matrix.stored
            laid = layout(block.structure, block.matrix.rows, self.watch)
            return laid.apply_exactly(block.matrix, y, self.watch)
        product, size = block.product
        if block.home is not None:
            fed = np.flatnonzero(block.inside & ~block.home).astype(np.uint32)
            more, larger = block.matrix.apply_exactly(y, fed, 0, len(fed), self.watch)
            self.ledger.visits += block.matrix.edges_of(fed)
            product = np.where(block.home, product, more)
            size = np.where(block.home, size, larger)
        return product, size

    def _judge(self, y: Floats, guard: Guard) -> None:
        """Take ``y`` and its bound if that is less than the bound so far."""
        reach = self._reach(y)
        kept = guard.kept
        if self.block.spread:
            kept = kept - 2 * self.block.spread * guard.w
        live = guard.live
        if not (kept[live] > 0).all():
            return
        factor = float((reach[live] / kept[live]).max(initial=0.0)) * (1 + 1e-15)
        errors = np.where(live, factor * guard.w, 0.0)
        scores, errors = self.shape(y, errors)
        value = float(errors.sum() / scores.sum())
        if value < self.bound.value:
            self.block.y = y
            self.bound = Bound(BoundKind.COMPONENTWISE, value, absolute=errors)

    def _improved(self, tol: float) -> Generator[Iteration, None, Floats]:
        """A better vector, and a narrower bracket of rho with it."""
        block, pin = self.block, self.pin
        root = self._next_root()
        scale = np.where(block.inside, block.matrix.scale / root, 0.0)
        held = np.zeros(block.matrix.n)
        held[pin] = block.y[pin]
        given = block.matrix.apply(held, self.watch) / root
        given = np.where(block.inside, given, 0.0)
        given[pin] = 0.0
        scale[pin] = 0.0
        whole = float(block.y.sum())

        def judge(x: Floats, r: Residual) -> tuple[float, bool]:
            return (r.norm - float(r.reach[pin])) / whole, False

        start = block.y.copy()
        found: Solution = yield from self.ledger.relay(
            solve_linear(
                System(Pull(block.matrix.rows, scale), given, block.structure, block.flow), judge,
                tol=max(1e-2 * tol, 1e-15), max_sweeps=self.max_sweeps, watch=self.watch,
                start=start,
            ),
            "sharpening",
        )  # fmt: skip
        self.watch.check()
        y = np.where(block.inside, np.maximum(found.x, 0.0), 0.0)
        y[pin] = held[pin]
        product, _ = block.matrix.apply_exactly(y, self._all, 0, block.matrix.n, self.watch)
        self.ledger.visits += block.matrix.stored
        self._tried.append((root, float(product[pin] / y[pin])))
        if not self.fixed and (y[block.inside] > 0).all():
            self._narrow(y, product)
        return y

    def _narrow(self, y: Floats, product: Floats) -> None:
        inside = self.block.inside
        ratio = product[inside] / y[inside]
        low, high = self.block.rho
        low = max(low, float(ratio.min()) * (1 - 16 * UNIT))
        high = min(high, float(ratio.max()) * (1 + 16 * UNIT))
        if low <= high:
            self.block.rho = (low, high)

    def _next_root(self) -> float:
        low, high = self.block.rho
        root = 0.5 * (low + high)
        if self.fixed:
            return root
        if len(self._tried) < 2:
            y = self.block.y
            root = float(y @ self.block.matrix.apply(y, self.watch) / (y @ y))
        else:
            (a, fa), (b, fb) = self._tried[-2:]
            slope = (fb - fa) / (b - a) - 1 if b != a else -1.0
            root = b - (fb - b) / slope if slope < 0 else root
        return min(max(root, low), high)
