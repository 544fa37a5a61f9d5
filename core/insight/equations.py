"""The equations that known measures solve, fitted to given scores by least squares.

Each has the form ``t = sum_k theta_k r_k``: a target and columns made from the scores x and the
matrix, with A' x the score pulled along the edges, P' x the same with every node's score split
among its out-edges, 1 the constant and s = A' 1 the strength:

* degree             x = theta s (or s + the strength on the other side)
* eigenvector        x = theta A'x                       theta = 1/rho
* authorities, hubs  x = theta A'(A x)
* surfer             x = d P'x + c 1                     whatever the scale and the dangling jump
* surfer, staying    x = d (P'x + dangling x) + c 1      dangling nodes keep their walkers
* surfer, landing    x = t P'x + c 1 + e dangling        d = e / (c + e): jumps land on dangling
                                                         nodes by 1, on others by 1 - d
* katz               x = alpha A'x + beta 1
* katz, beta left out      x = alpha A'x + theta s
* katz, shifted      x = alpha A'x + b 1 + theta s       a constant subtracted
* katz, K steps only       one more column, (A')^(K+1) 1, with theta_3 = -theta_2 alpha^K

A row is used where its own score and those of all whom it is made from are known.  Fits are
scale-free: a normalisation multiplies x and leaves d, alpha and rho alone.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.operators import Pull, adjacency, walk
from kingpost.core.watch import Watch

STEPS = 10  # longest truncated Katz sum that is looked for
SOME = 200_000  # rows that a first look takes: the highest and a fixed choice of the others
FAR = 1e-2  # share left unexplained at which no equation is said to be solved
SIMPLEST = (
    "degree",
    "total degree",
    "eigenvector",
    "authorities",
    "surfer",
    "katz",
    "katz without beta",
    "surfer, dangling stay",
    "katz shifted",
    "surfer, landing on dangling",
    "katz in steps",
    "katz without beta in steps",
)


@dataclass(frozen=True)
class Fit:
    """One equation fitted.

    Attributes:
        form: one of :data:`SIMPLEST`; ``steps`` is K of a truncated sum, else 0.
        theta: the coefficients.
        unexplained: Euclidean length of the residual over that of the scores about their mean.
        residual: sum of ``|r|`` over the sum of ``|x|``, in the rows used.
        rows: number of rows used.
        within_rounding: whether rounding of the given digits explains every row's residual.
    """

    form: str
    theta: tuple[float, ...]
    unexplained: float
    residual: float
    rows: int
    within_rounding: bool
    steps: int = 0


class Frame:
    """Scores on one graph with one flow; products are made once and shared by the equations."""

    def __init__(
        self,
        graph: Graph,
        flow: Flow,
        scores: Floats,
        reach: Floats,
        watch: Watch,
        most: int | None = None,
    ) -> None:
        """``scores`` NaN where unknown, ``reach`` how far rounding may have moved each.

        ``most`` is the number of rows that fits are judged by; None takes all.
        """
        self.graph, self.flow, self.watch = graph, flow, watch
        self.known = np.isfinite(scores)
        self.x = np.where(self.known, scores, 0.0)
        self.reach = np.where(self.known, reach, 0.0)
        self.pull: Pull = adjacency(graph, flow)
        self.back: Pull = adjacency(graph, "against" if flow == "along" else "along")
        self.most = most
        self._powers: list[Floats] = []

    @cached_property
    def walk(self) -> tuple[Pull, NDArray[np.bool_]]:
        """P', and which nodes are dangling."""
        matrix, strength = walk(self.graph, self.flow)
        return matrix, strength == 0

    @cached_property
    def strength(self) -> Floats:
        """A' 1."""
        return self.graph.pull(self.flow).strengths()

    @cached_property
    def both(self) -> Floats:
        """A' 1 + A 1."""
        return self.strength + self.graph.push(self.flow).strengths()

    @cached_property
    def pulled(self) -> Floats:
        """A' x."""
        return self.pull.apply(self.x, self.watch)

    @cached_property
    def walked(self) -> Floats:
        """P' x."""
        return self.walk[0].apply(self.x, self.watch)

    @cached_property
    def twice(self) -> Floats:
        """A' A x."""
        return self.pull.apply(self.back.apply(self.x, self.watch), self.watch)

    def power(self, steps: int) -> Floats:
        """(A')^(steps + 1) 1."""
        while len(self._powers) < steps:
            last = self._powers[-1] if self._powers else self.strength
            self._powers.append(self.pull.apply(last, self.watch))
        return self._powers[steps - 1]

    @cached_property
    def near(self) -> NDArray[np.int64]:
        """Rows used: scores of their feeders are known."""
        return self._rows(self._usable(self.pull))

    @cached_property
    def far(self) -> NDArray[np.int64]:
        """Rows used where scores two steps away matter."""
        return self._rows(self._usable(self.back, self.pull))

    @cached_property
    def own(self) -> NDArray[np.int64]:
        """Rows used where only the row's own score matters."""
        return self._rows(self.known)

    def _usable(self, *ways: Pull) -> NDArray[np.bool_]:
        if self.known.all():
            return self.known
        lacking = (~self.known).astype(np.float64)
        for way in ways:
            lacking = (way.apply(lacking, self.watch) > 0).astype(np.float64)
        usable: NDArray[np.bool_] = self.known & (lacking == 0)
        return usable

    def _rows(self, usable: NDArray[np.bool_]) -> NDArray[np.int64]:
        rows = np.flatnonzero(usable)
        if self.most is None or len(rows) <= self.most:
            return rows
        top = self.most // 10
        order = np.argpartition(-np.abs(self.x[rows]), top)
        rest = np.random.default_rng(1).permutation(len(rows) - top)[: self.most - top]
        return np.sort(rows[np.concatenate((order[:top], order[top:][rest]))])

    def columns(self, form: str, steps: int = 0) -> list[Floats]:
        """What the scores are a combination of."""
        if form == "degree":
            return [self.strength]
        if form == "total degree":
            return [self.both]
        if form == "eigenvector":
            return [self.pulled]
        if form == "authorities":
            return [self.twice]
        ones = np.ones(len(self.x))
        if form == "surfer":
            return [self.walked, ones]
        if form == "surfer, dangling stay":
            return [self.walked + self.walk[1] * self.x, ones]
        if form == "surfer, landing on dangling":
            return [self.walked, ones, self.walk[1].astype(np.float64)]
        last = [self.power(steps)] if steps else []
        return [self.pulled, *({"katz": [ones], "katz shifted": [ones, self.strength]}.get(
            form.removesuffix(" in steps"), [self.strength])), *last]  # fmt: skip

    def blurred(self, form: str) -> Floats:
        """What rounding of the scores may do to the first column, shape (n,)."""
        if form in ("degree", "total degree"):
            return np.zeros(len(self.x))
        if form == "authorities":
            return self.pull.apply(self.back.apply(self.reach, self.watch), self.watch)
        if not form.startswith("surfer"):
            return self.pull.apply(self.reach, self.watch)
        stay = self.walk[1] * self.reach if form.endswith("stay") else 0.0
        moved: Floats = self.walk[0].apply(self.reach, self.watch) + stay
        return moved

    def fit(self, form: str, steps: int = 0) -> Fit | None:
        """Least squares over the rows used; None where they are too few, or nothing sensible."""
        rows = {"degree": self.own, "total degree": self.own}.get(form)
        if rows is None:
            rows = self.far if form == "authorities" else self.near
        every = self.columns(form, steps)
        if len(rows) < 2 + 2 * len(every):
            return None
        target, columns = self.x[rows], [column[rows] for column in every]
        theta = least_squares(columns, target)
        if theta is None:
            return None
        r = target - combined(theta, columns)
        spread = target - target.mean()
        size = float(np.sqrt(spread @ spread))
        unexplained = float(np.sqrt(r @ r)) / size if size > 0 else float("inf")
        reach = self.reach[rows] + 1e-13 * np.abs(target)
        blur = float(np.sqrt(reach @ reach)) / size if size > 0 else 0.0
        explained = False
        if unexplained <= max(1e-10, 4 * blur):
            allowed = reach + abs(theta[0]) * self.blurred(form)[rows]
            explained = bool((np.abs(r) <= allowed).all())
        found = Fit(
            form,
            tuple(theta),
            unexplained,
            float(np.abs(r).sum() / np.abs(target).sum()),
            len(rows),
            explained,
            steps,
        )
        return found if _sensible(found) else None


def least_squares(columns: list[Floats], target: Floats) -> list[float] | None:
    """Coefficients; by normal equations of scaled columns, refined twice against cancellation.

    None where the columns depend on each other.
    """
    sizes = [float(np.sqrt(column @ column)) for column in columns]
    if not all(size > 0 and np.isfinite(size) for size in sizes):
        return None
    scaled = [column / size for column, size in zip(columns, sizes, strict=True)]
    gram = np.array([[float(a @ b) for b in scaled] for a in scaled])
    if np.linalg.cond(gram) > 1e12:
        return None
    theta = np.zeros(len(columns))
    left = target.copy()
    for _ in range(3):
        step = np.linalg.solve(gram, np.array([float(column @ left) for column in scaled]))
        theta += step
        left = target - combined(theta, scaled)
    return [float(t / size) for t, size in zip(theta, sizes, strict=True)]


def combined(theta: Iterable[float], columns: list[Floats]) -> Floats:
    """``sum_k theta_k column_k``."""
    total = np.zeros(len(columns[0]))
    for factor, column in zip(theta, columns, strict=True):
        total += factor * column
    return total


def fits(frame: Frame, steps: bool = False) -> Iterator[Fit]:
    """Every equation fitted whose coefficients make sense for it.

    ``steps`` takes the sums of finitely many steps, which cost a product each, and no others.
    """
    for form in SIMPLEST:
        sums = form.endswith("in steps")
        if sums != steps or not _apart(frame, form):
            continue
        for number in range(1, STEPS + 1) if sums else (0,):
            frame.watch.check()
            fit = frame.fit(form, number)
            if fit is not None:
                yield fit


def _apart(frame: Frame, form: str) -> bool:
    """Whether a form is another than the ones before it on this graph and flow."""
    if form == "total degree":
        return frame.graph.directed and frame.flow == "along"
    if form == "authorities":
        return frame.graph.directed
    if form.startswith("surfer, "):
        dangling = frame.walk[1]
        return bool(dangling.any() and not dangling.all())
    return True


def _sensible(fit: Fit) -> bool:
    theta = fit.theta
    if not all(map(np.isfinite, theta)) or theta[0] <= 0:
        return False
    if fit.form == "surfer, landing on dangling":
        return theta[1] > 0 and theta[2] > 0
    if fit.form.startswith("surfer"):
        return theta[0] < 1 and theta[1] > 0
    if fit.form.endswith("in steps"):
        if theta[1] <= 0:
            return False
        # (A')^(K+1) 1 stands with alpha^(K+1), s with alpha and 1 with alpha^0.
        power = fit.steps + (0 if "without" in fit.form else 1)
        wanted = -theta[1] * theta[0] ** power
        return bool(abs(theta[2] - wanted) <= 1e-3 * abs(wanted))
    return all(t > 0 for t in theta[1:])
