"""The dominant eigenvector of the strong components of a nonnegative matrix, with brackets.

For every ``y > 0`` on an irreducible block, ``min (B y)_i / y_i <= rho <= max (B y)_i / y_i``
(Collatz 1942, Wielandt 1950).  The bracket is what is claimed; power iteration, with a
shift once iterates are seen to swing (periodic blocks), and dense or Krylov eigenvectors only
supply the y.

All cyclic components are bracketed at once: each product stays inside the components, and those
whose upper end falls below the best lower end are dropped.
"""

from __future__ import annotations

import time
from collections.abc import Generator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Floats
from kingpost.core.layout import layout
from kingpost.core.operators import Order, Pull, cut
from kingpost.core.parallel import each
from kingpost.core.result import Iteration
from kingpost.core.solvers.settling import Settling
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch

_DENSE = 300  # components up to this size get their first vector from a dense solver
_PATIENCE = 24  # power steps before a slow component is handed to a Krylov solver
_SAFE = 1.5  # movement of entries in the last sweep, as a share of the bracket's width asked for;
# the bracket after it has a fifth to a half of that width on the bench graphs
_MARGIN = 0.03  # a score is known some tens of times worse than rho, by experience
_PART = 0.25  # of the error of the scores that a bracket may leave once it is multiplied by the
# amount that circulates (see Settling.amount)
LEAST = 1e-14  # width of a bracket; less is not to be had by double precision
_LOOK = 3  # products after which the largest component need not be the only one left to be swept
_WIDE = 4  # at most this many components are worth a Krylov solve each


@dataclass
class Bracketed:
    """Brackets of the spectral radii of components, and a positive vector for each.

    ``low`` and ``high`` have one entry for each of ``components`` (numbers in the Structure) that
    may still be dominating; ``y`` is positive on their nodes, zero elsewhere, shape (n,).
    ``left`` is a rough left vector of the component that was decided for, if known; ``product``
    is ``B y`` by compensated sums and ``|B| |y|`` on its nodes, if the last bracket was of that.
    """

    components: NDArray[np.int64]
    low: Floats
    high: Floats
    y: Floats
    left: Floats | None = None
    product: tuple[Floats, Floats] | None = None
    cancelled: bool = False
    steps: int = 0
    edge_visits: int = 0
    log: list[Iteration] = field(default_factory=list)

    @property
    def rho(self) -> tuple[float, float]:
        """Bracket of the largest spectral radius of all."""
        return float(self.low.max()), float(self.high.max())

    @property
    def decided(self) -> bool:
        """Whether one component is proven to dominate all others."""
        return len(self.components) == 1


def bracket(
    matrix: Pull,
    structure: Structure,
    *,
    max_steps: int,
    watch: Watch,
    only: int | None = None,
    separate: bool = True,
    start: Floats | None = None,
    gives: Floats | None = None,
    width: float = 0.0,
    scores: float | None = None,
) -> Generator[Iteration, None, Bracketed]:
    """Bracket the spectral radius of ``matrix``; needs at least one cyclic component.

    Ends when the bracket's relative width is at most ``width`` and (with ``separate``) one
    component is proven dominating, or when rounding or ``max_steps`` allow no more.  ``only``
    names a single component to look at, ``start`` (n,) gives first vectors where it is positive,
    ``gives`` (n,) first left vectors, such as what every node gives away.  ``scores`` is the error
    that the scores are to have in the end: the width is then what they need, by experience until
    a left vector can tell.

    If ``watch`` is cancelled the state so far is returned, marked ``cancelled``.
    """
    laid = layout(structure, matrix.rows, watch)
    if start is not None:
        start = laid.there(start)
    work = _Brackets(laid.matrix(matrix), laid.structure, watch, only, start)
    work.gives = None if gives is None else laid.there(gives)
    work.width = width if scores is None else max(_MARGIN * scores, LEAST)
    work.scores = scores
    try:
        yield from _narrow(work, max_steps, separate)
    except Interrupted:
        work.state.cancelled = True
    work.state.y = laid.back(work.state.y)
    if work.state.left is not None:
        work.state.left = laid.back(work.state.left)
    if work.state.product is not None:
        product, size = work.state.product
        work.state.product = laid.back(product), laid.back(size)
    return work.state


def _narrow(work: _Brackets, max_steps: int, separate: bool) -> Generator[Iteration, None, None]:
    if work.settling:
        yield from work.settle()
    while True:
        yield work.step()
        state = work.state
        rho_low, rho_high = state.rho
        narrow = rho_high - rho_low <= work.width * rho_high
        if narrow and (state.decided or not separate):
            return
        if state.steps >= max_steps or work.stuck:
            return
        if work.settling:
            yield from work.settle()
        elif work.slow:
            work.accelerate()


class _Brackets:
    def __init__(
        self,
        matrix: Pull,
        structure: Structure,
        watch: Watch,
        only: int | None,
        start: Floats | None,
    ) -> None:
        self.matrix, self.structure, self.watch = matrix, structure, watch
        numbers = structure.cyclic if only is None else np.array([only], dtype=np.int64)
        y = np.zeros(matrix.n)
        self.state = Bracketed(numbers, np.zeros(len(numbers)), np.full(len(numbers), np.inf), y)
        self.began = time.perf_counter()
        self._led = -1
        self._choose(np.ones(len(numbers), dtype=bool))
        y[self.nodes] = 1.0
        if start is not None:
            # Any positive vector will do; tiny entries might be lost to underflow.
            near = start[self.nodes]
            top = float(near.max(initial=0.0)) or 1.0
            y[self.nodes] = np.where(near > 0, np.maximum(near / top, 1e-200), 1.0)
        self.stuck = False
        self.width = 0.0
        self.scores: float | None = None
        self._since = 0
        self._widths: list[float] = []
        self._shift = 0.0  # of the middle of the bracket, once iterates are seen to swing
        self._moves: list[float] = []
        self.gives: Floats | None = None
        self._exact = False
        self._tried: set[int] = set()

    def _choose(self, keep: NDArray[np.bool_]) -> None:
        """Keep the marked components and drop the others' nodes."""
        state = self.state
        state.components = state.components[keep]
        state.low, state.high = state.low[keep], state.high[keep]
        starts, sizes = self.structure.starts, self.structure.sizes
        sizes = sizes[state.components]
        at = np.repeat(starts[state.components] - np.cumsum(sizes) + sizes, sizes)
        self.nodes: Order = self.structure.order[at + np.arange(int(sizes.sum()))]
        self.firsts = np.cumsum(sizes) - sizes
        self.sizes = sizes
        alive = np.zeros(self.matrix.n, dtype=bool)
        alive[self.nodes] = True
        state.y[~alive] = 0.0
        rows = self.matrix.rows
        self.pieces = cut(rows, self.nodes, 0, len(self.nodes), 2_000_000)
        long = self.nodes.astype(np.int64)
        lengths = rows.offsets[long + 1] - rows.offsets[long]
        self.edges = int(lengths.sum())
        each_has = np.add.reduceat(lengths, self.firsts)
        self.leader = int(np.argmax(each_has))  # the one with most edges, by its place here
        self.leading_share = float(each_has[self.leader]) / max(self.edges, 1)
        if self._led != state.components[self.leader]:
            self._led, self._unsettled = int(state.components[self.leader]), 3
            state.left = None

    def product(self, y: Floats) -> Floats:
        """``B y`` inside the components, shape (n,); of other nodes whatever it may be."""
        from kingpost.core.kernels.rows import pull_inside
        from kingpost.core.kernels.sweep import pull_rows

        rows, group = self.matrix.rows, self.structure.component
        z = y * self.matrix.scale
        out = np.empty(self.matrix.n)
        alone = len(self.state.components) == 1  # nothing else is nonzero: no need to ask

        def piece(part: tuple[int, int]) -> None:
            self.watch.check()
            if alone:
                pull_rows(rows.offsets, rows.neighbours, rows.weights, self.nodes, *part, z, out)
            else:
                pull_inside(
                    rows.offsets, rows.neighbours, rows.weights, self.nodes, *part, group, z, out
                )

        each(piece, self.pieces, self.watch.threads)
        self.state.edge_visits += self.edges
        return out

    def step(self) -> Iteration:
        """One product: new brackets, the next vector, and who can no longer be dominating."""
        from kingpost.core.kernels.bracket import advance, ratios

        state = self.state
        # Once the vector is as good as it gets, the rounding of long rows is what is left.
        exactly = self._exact and len(state.components) == 1  # the others' edges do not count
        state.product = None
        if exactly:
            size = len(self.nodes)
            state.product = self.matrix.apply_exactly(state.y, self.nodes, 0, size, self.watch)
            state.edge_visits += self.edges
        product = self.product(state.y) if state.product is None else state.product[0]
        middle = np.empty(len(self.firsts))
        of_these = self.nodes, self.firsts, self.sizes
        offsets = self.matrix.rows.offsets
        ratios(offsets, *of_these, exactly, product, state.y, state.low, state.high, middle)
        low, high = state.rho
        if state.product is None or high - low > self.width * high:
            moved, total = advance(*of_these, product, self._shift, middle, state.y)
            self._watch_rate(moved / total)
            state.product = None
        state.steps += 1
        keep = state.high >= state.low.max()
        if not keep.all():
            self._choose(keep)
        lo, hi = state.rho
        self._widths.append((hi - lo) / hi if hi > 0 else 0.0)
        self._since += 1
        line = self._line(self._widths[-1], "bracket")
        recent = self._widths[-60:]
        self.stuck = (
            self._widths[-1] < 1e-13 and len(recent) > 20 and min(recent[:20]) <= min(recent[20:])
        )
        return line

    def _line(self, residual: float, part: str) -> Iteration:
        state = self.state
        line = Iteration(
            state.steps, residual, float("nan"), state.edge_visits,
            time.perf_counter() - self.began, eigenvalue=state.rho, part=part,
        )  # fmt: skip
        state.log.append(line)
        return line

    def _watch_rate(self, moved: float) -> None:
        self._moves = [*self._moves[-7:], moved]
        if len(self._moves) == 8 and self._shift == 0.0 and self.rate > 0.8:
            self._shift = 0.35
            self._moves = []

    @property
    def rate(self) -> float:
        """Factor by which the vectors' movement falls a step, over the last few."""
        if len(self._moves) < 4 or not self._moves[-4] > 0:
            return 0.0
        return float((self._moves[-1] / self._moves[-4]) ** (1 / 3))

    @property
    def settling(self) -> bool:
        """Whether one component, alone or by far the largest, is worth sweeps of its own."""
        size = int(self.sizes[self.leader])
        if self._unsettled == 0 or size == 1 or (size <= _DENSE and self._led not in self._tried):
            return False
        alone = len(self.state.components) == 1
        return alone or (self.state.steps >= _LOOK and self.leading_share > 0.5)

    def settle(self) -> Generator[Iteration, None, None]:
        """Gauss-Seidel sweeps; kept only if the vector they lead to is positive."""
        self._unsettled -= 1
        # As far as the bracket asked for needs, by experience; further if that was too short.
        further = (0.0, 0.01, 1.0)[self._unsettled]
        enough = _SAFE * further * (self.width if self.scores is None else _PART * self.scores)
        first = int(self.firsts[self.leader])
        nodes = self.nodes[first : first + int(self.sizes[self.leader])]
        work = Settling(
            self.matrix, nodes, self.state.y, self.watch, enough, self.gives,
            shared=self.scores is not None,
        )  # fmt: skip
        edges = self.matrix.edges_of(nodes)
        for moved in work.run():
            self.state.steps += 1
            self.state.edge_visits += edges
            yield self._line(moved, "settling sweep")
        self.state.edge_visits += edges  # for the left vector
        if work.left is not None and np.isfinite(work.left).all():
            self.state.left = work.left
        if work.sound:
            if self.scores is not None:
                self.width = max(_PART * self.scores / work.amount, LEAST)
            self.state.y[nodes] = work.x[nodes] / work.x[nodes].max()
            self._exact = True

    @property
    def slow(self) -> bool:
        """Whether a better vector is worth asking another solver for."""
        few = len(self.state.components) <= 64
        small = few and int(self.sizes.max()) <= _DENSE and self._since >= 3
        large = len(self.state.components) <= _WIDE and self._since >= _PATIENCE and self.rate > 0.5
        return (small or large) and self._widths[-1] > 1e-15

    def accelerate(self) -> None:
        """Replace the vectors by dense or Krylov ones where those come out positive."""
        self._since = -(10**9) if len(self._tried) > 3 * _WIDE + 64 else -_PATIENCE
        for number, first, size in zip(
            self.state.components.tolist(), self.firsts.tolist(), self.sizes.tolist(), strict=True
        ):
            if number in self._tried or size == 1:
                continue
            self._tried.add(number)
            nodes = self.nodes[first : first + size]
            vector = leading(self.matrix, nodes, self.state.y[nodes], self.watch, self._count)
            if vector is not None:
                self.state.y[nodes] = vector
                self._unsettled = 3

    def _count(self, edges: int) -> None:
        self.state.edge_visits += edges


def leading(
    matrix: Pull, nodes: Order, start: Floats, watch: Watch, count: object = None
) -> Floats | None:
    """The dominant eigenvector of one component by a library, or None if it is not positive.

    Dense up to 300 nodes, implicitly restarted Arnoldi (ARPACK through scipy) from there, with a
    fixed start.  Nothing is claimed of it until a bracket has closed around it.
    """
    from scipy.sparse.linalg import ArpackError, LinearOperator, eigs

    from kingpost.core.kernels.sweep import pull_rows

    rows, size = matrix.rows, len(nodes)
    place = np.zeros(matrix.n)
    out = np.empty(matrix.n)
    pieces = cut(rows, nodes, 0, size, 2_000_000)
    edges = matrix.edges_of(nodes)

    def apply(vector: Floats) -> Floats:
        place[nodes] = matrix.scale[nodes] * vector.ravel()

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            pull_rows(rows.offsets, rows.neighbours, rows.weights, nodes, *part, place, out)

        each(piece, pieces, watch.threads)
        if callable(count):
            count(edges)
        result: Floats = out[nodes]
        return result

    if size <= _DENSE:
        dense = np.column_stack([apply(column) for column in np.eye(size)])
        values, vectors = np.linalg.eig(dense)
        vector = vectors[:, int(np.argmax(values.real))]
    else:
        operator = LinearOperator((size, size), matvec=apply, dtype=np.float64)
        try:
            _, found = eigs(
                operator, k=1, which="LR", v0=start / np.linalg.norm(start), ncv=min(20, size - 1),
                maxiter=60, tol=1e-14,
            )  # fmt: skip
        except ArpackError:
            return None
        vector = found[:, 0]
    real = np.real(vector)
    if np.abs(np.imag(vector)).max() > 1e-6 * np.abs(real).max():
        return None
    real = real * np.sign(real[int(np.argmax(np.abs(real)))])
    top = float(real.max())
    # Entries lost in rounding are given a floor; a few power steps mend them.
    if not top > 0 or float(real.min()) < -1e-8 * top:
        return None
    result: Floats = np.maximum(real / top, 1e-17)
    return result
