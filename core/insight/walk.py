"""A walker let loose: where it may be after each step, how soon it forgets where it began.

The chain is that of the random surfer (:mod:`kingpost.core.measures.surfer`): follow an edge with
probability d in proportion to its weight, else jump by v; from a node without out-edges jump
by w, or be lost (``leak``)::

    p' = d P^T p + d (a^T p) w + (1 - d) (sum p) v

One product with P^T a step; matrix powers are never formed.  Rounding is bounded on the way: a
product of rows of k entries is off by at most (k / 4 + 12) u of itself, and the chain never
enlarges the sum of errors.

Distance is total variation to the stationary distribution, ``1/2 sum |p - x|``: the largest
difference of the probabilities of any set of nodes.  It never grows from step to step, so the
first step within eps is where the walk has mixed (from this start).
Reference: Levin, Peres, Wilmer, "Markov Chains and Mixing Times", 2009, ch. 4 and 12.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.modes import Mode, dense_chain, modes_of
from kingpost.core.measures import measure
from kingpost.core.measures.base import finish
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.measures.vectors import distribution
from kingpost.core.operators import walk as walk_matrix
from kingpost.core.result import Result
from kingpost.core.watch import Watch

EPS = 0.01
STEPS = 10
MOST = 1_000  # steps after which the search for mixing is given up
PLACES = 5
SMALL = 256  # nodes up to which the eigen-decomposition is shown


@dataclass(frozen=True, slots=True)
class Place:
    """A node and the probability of being there; ``lasting`` in the long run, NaN if unknown."""

    node: int
    mass: float
    lasting: float


@dataclass(frozen=True, slots=True)
class Step:
    """The walk after ``step`` steps.

    Attributes:
        distance: total variation to the stationary distribution, NaN where there is none;
            ``distance_error`` is how far it may be off.
        home: probability of being at a node where the walk began.
        lost: probability that the walk has ended (leaked from a node without out-edges).
        reached: nodes where the walk can have been so far, the first ones included.
        holding: nodes where it can be now.
        half: fewest nodes that hold half of what is not lost.
        places: the most probable nodes.
        error: bound of the sum of the errors of all probabilities.
    """

    step: int
    distance: float
    distance_error: float
    home: float
    lost: float
    reached: int
    holding: int
    half: int
    places: tuple[Place, ...]
    error: float


@dataclass(frozen=True)
class Walk:
    """What :func:`walk` found.

    Attributes:
        settings: the conventions of the chain.
        begins: nodes the walk may begin at, ascending.
        steps: step 0 (the start) to the last one asked for.
        last: the distribution after the last of them, shape (n,).
        eps: the distance that counts as mixed; ``mixed`` the first step proven within it, None
            where that was not met in ``searched`` steps or cannot be.
        stationary: the stationary distribution as a Result, refused where there is none.
        period: greatest common divisor of the lengths of all ways around, where the walk goes
            round for good (damping 1, no jumps); a walk of period above 1 never mixes.
        modes: the eigenvalues of a small chain, largest modulus first; else empty.
    """

    settings: SurferSettings
    begins: NDArray[np.int64]
    steps: tuple[Step, ...]
    last: Floats
    eps: float
    mixed: int | None
    searched: int
    stationary: Result
    period: int | None
    modes: tuple[Mode, ...]


def walk(
    graph: Graph,
    start: Floats,
    settings: SurferSettings | None = None,
    *,
    steps: int = STEPS,
    eps: float = EPS,
    most: int = MOST,
    places: int = PLACES,
    watch: Watch | None = None,
) -> Walk:
    """Follow a walker for ``steps`` steps, and on until it has mixed.

    Args:
        start: where it begins, weights of shape (n,), nonnegative; scaled to sum 1.
        settings: flow, damping (1 where None: no jumps), dangling, teleport; ``tol`` is for the
            stationary distribution.
        eps: total variation distance that counts as mixed, in (0, 1).
        most: steps after which the search for that is given up; 0 looks no further than ``steps``.
        places: how many of the most probable nodes to name at each step.

    Raises:
        SettingsError: for a start or numbers out of range.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    settings = settings or SurferSettings(damping=1.0)
    if graph.n == 0:
        raise SettingsError("the graph has no nodes, so there is nowhere to walk")
    if steps < 0 or most < 0:
        raise SettingsError(f"a walk takes a number of steps from 0, not {min(steps, most)}")
    if not 0 < eps < 1:
        raise SettingsError(f"eps is {eps:g}; it takes a number between 0 and 1")
    chain = _Chain(graph, settings)
    p = distribution(graph, start, "the start")
    first = last = p
    begins = np.flatnonzero(p)
    stationary = _stationary(graph, settings, chain, watch)
    watch.check()
    period = _period(graph, chain, stationary)
    seen = _Seen(chain, p, stationary, begins, places)
    told = [seen.step(0, p)]
    mixed = 0 if seen.within(eps) else None
    number = 0
    while number < steps or (mixed is None and number < most and seen.may_mix(period)):
        number += 1
        watch.check()
        watch.report("walking", number, max(steps, most), "steps")
        p = chain.advance(p, watch)
        if number <= steps:
            told.append(seen.step(number, p))
            last = p
        else:
            seen.measure(p)
        if mixed is None and seen.within(eps):
            mixed = number
    modes: tuple[Mode, ...] = ()
    if graph.n <= SMALL:
        modes = modes_of(dense_chain(graph, settings.flow, chain.damping, chain.jump,
                                     chain.landing), first)  # fmt: skip
    return Walk(settings, begins, tuple(told), last, eps, mixed, number, stationary, period, modes)


class _Chain:
    """One step of the walk, with a running bound of what rounding may have done."""

    def __init__(self, graph: Graph, settings: SurferSettings) -> None:
        self.damping = settings.damping
        self.matrix, strength = walk_matrix(graph, settings.flow, settings.damping)
        self.hanging = strength == 0
        n = graph.n
        uniform = np.full(n, 1.0 / n)
        self.jump: Floats = (
            uniform
            if settings.teleport is None
            else distribution(graph, settings.teleport, "--teleport")
        )
        mode = settings.dangling
        self.landing: Floats | None
        if not isinstance(mode, str):
            self.landing = distribution(graph, mode, "the dangling distribution")
        else:
            self.landing = {"teleport": self.jump, "uniform": uniform, "leak": None}[mode]
        self.leaks = self.landing is None and bool(self.hanging.any())
        self.lost, self.error = 0.0, 64 * UNIT  # the start is scaled to sum 1
        self._lengths = self.matrix.rows.degrees / 4.0

    def advance(self, p: Floats, watch: Watch) -> Floats:
        """The distribution one step on."""
        after = self.matrix.apply(p, watch)
        given = float(self._lengths @ after)
        hang = self.damping * float(p[self.hanging].sum())
        if self.landing is None:
            self.lost += hang
        elif hang:
            after += hang * self.landing
        if self.damping < 1.0:
            after += ((1.0 - self.damping) * float(p.sum())) * self.jump
        # Rows: (k / 4 + 12) u; sums of all or of dangling nodes 64 u; three additions.
        self.error += UNIT * (given + 160.0)
        return after


class _Seen:
    """What is measured on the way."""

    def __init__(
        self,
        chain: _Chain,
        p: Floats,
        stationary: Result,
        begins: NDArray[np.int64],
        places: int,
    ) -> None:
        self.chain, self.begins, self.places = chain, begins, places
        self.x = None if stationary.refusal is not None else stationary.scores
        self.off = float(stationary.bound.value)
        self.ever = p > 0
        self.distance = self.wide = float("nan")

    def measure(self, p: Floats) -> None:
        """Distance to the stationary distribution, and its error."""
        if self.x is None:
            return
        self.distance = 0.5 * float(np.abs(p - self.x).sum())
        self.wide = 0.5 * (self.chain.error + self.off) + 64 * UNIT

    def within(self, eps: float) -> bool:
        """Whether the distance is proven to be at most ``eps``."""
        return self.distance + self.wide <= eps

    def may_mix(self, period: int | None) -> bool:
        """Whether walking on can bring the distance down."""
        return self.x is not None and (period is None or period == 1)

    def step(self, number: int, p: Floats) -> Step:
        """Everything about one step."""
        self.measure(p)
        self.ever |= p > 0
        k = min(self.places, len(p))
        some = np.argpartition(-p, k - 1)[:k] if k else np.empty(0, np.int64)
        top = [int(node) for node in some[np.lexsort((some, -p[some]))] if p[node] > 0]
        nan = float("nan")
        return Step(
            number,
            self.distance,
            self.wide,
            float(p[self.begins].sum()),
            self.chain.lost,
            int(self.ever.sum()),
            int(np.count_nonzero(p)),
            _half(p),
            tuple(
                Place(node, float(p[node]), nan if self.x is None else float(self.x[node]))
                for node in top
            ),
            self.chain.error,
        )


def _half(p: Floats) -> int:
    """Fewest nodes that hold half of all mass."""
    held = np.sort(p)[::-1]
    mass = np.cumsum(held)
    return int(np.searchsorted(mass, 0.5 * mass[-1] * (1 - 1e-12))) + 1 if mass[-1] > 0 else 0


def _stationary(graph: Graph, settings: SurferSettings, chain: _Chain, watch: Watch) -> Result:
    """The distribution that lasts; refused where walkers leak, or where there is more than one."""
    from kingpost.core.measures.common import refused

    if chain.leaks:
        return refused(
            "surfer", graph, settings,
            "walkers are lost at nodes without out-edges, so no distribution lasts",
            "give --dangling teleport or uniform", [],
        )  # fmt: skip
    return finish(
        measure("surfer").solve(graph, settings, watch),
        lambda line: watch.report("stationary distribution", line.index, None, "sweeps"),
    )


def _period(graph: Graph, chain: _Chain, stationary: Result) -> int | None:
    """Period of the class where the walk ends up; None where jumps (or nothing) decide."""
    if chain.damping < 1.0 or stationary.refusal is not None or stationary.exact_zero is None:
        return None
    inside = ~stationary.exact_zero
    if (chain.hanging & inside).any():
        return None
    component = int(graph.structure.component[int(np.argmax(inside))])
    return graph.structure.period(component)


def steps_at_most(damping: float, eps: float) -> int | None:
    """Steps after which any walk has mixed by its jumps alone: ``d^t <= eps``; None at d = 1."""
    if not 0 < damping < 1:
        return None if damping else 1
    return math.ceil(math.log(eps) / math.log(damping))
