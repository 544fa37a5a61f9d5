"""What a solve hands back: scores that carry their own proof."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from enum import StrEnum
from functools import cached_property
from importlib import import_module
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats

if TYPE_CHECKING:
    import pyarrow as pa

    from kingpost.core.standing import Standing


class Stop(StrEnum):
    """Why a solve ended."""

    CONVERGED = "converged"
    ORDER_PROVEN = "order proven"
    STALLED = "stalled at rounding"
    LIMIT = "sweep limit"
    CANCELLED = "cancelled"
    REFUSED = "refused"

    @property
    def accurate(self) -> bool:
        """Whether the accuracy asked for was reached."""
        return self in (Stop.CONVERGED, Stop.ORDER_PROVEN)


class BoundKind(StrEnum):
    """What sort of statement an error bound makes."""

    EXACT = "exact"  # arithmetic on integers or a closed formula; rounding only
    COMPONENTWISE = "componentwise"  # each score by itself
    L1 = "L1"  # the absolute errors add up to at most this
    BRACKET = "eigenvalue bracket"  # encloses the eigenvalue; the vector's error is an estimate
    STATISTICAL = "statistical"  # a sketch: a standard error, no hard bound
    NONE = "none"


@dataclass(frozen=True, slots=True)
class Iteration:
    """One line of a convergence log.

    ``residual`` and ``bound`` are relative to the sum of the scores (NaN where not known at
    this point); ``edge_visits`` and ``seconds`` count from the start of the solve;
    ``eigenvalue`` is a bracket of the spectral radius where the method keeps one; ``part``
    says which stage of a method of several stages the line belongs to.
    """

    index: int
    residual: float
    bound: float
    edge_visits: int
    seconds: float
    proven: int | None = None
    eigenvalue: tuple[float, float] | None = None
    part: str = ""


@dataclass(frozen=True, slots=True)
class Bound:
    """How far the scores ``y`` may be from the exact ``x``, as a theorem, rounding included.

    ``value`` is the headline: a bound of ``sum |x - y| / sum |y|``.  The interval of each score
    is the intersection of ``y (1 -+ relative)`` and ``y -+ absolute``, whichever are given;
    ``absolute`` is a number for all nodes or one per node.
    """

    kind: BoundKind
    value: float
    relative: float | None = None
    absolute: float | Floats | None = None

    def interval(self, scores: Floats) -> tuple[Floats, Floats]:
        """Lower and upper ends for every score, each of shape (n,)."""
        low = np.full(len(scores), -np.inf)
        high = np.full(len(scores), np.inf)
        if self.relative is not None:
            reach = np.abs(scores) * self.relative
            low, high = scores - reach, scores + reach
        if self.absolute is not None:
            low = np.maximum(low, scores - self.absolute)
            high = np.minimum(high, scores + self.absolute)
        return low, high


@dataclass(frozen=True, slots=True)
class Seconds:
    """Where the time went."""

    load: float = 0.0
    prepare: float = 0.0
    solve: float = 0.0


@dataclass(frozen=True, slots=True)
class Refusal:
    """Why the mathematics has no such answer, and the nearest question that has one."""

    reason: str
    instead: str

    @property
    def sentence(self) -> str:
        """Both, as one line."""
        return f"{self.reason}; {self.instead}"


@dataclass(frozen=True)
class Result:
    """Scores of one measure on one graph, with everything needed to trust and repeat them.

    ``scores`` has shape (n,), float64, in the graph's numbering; it is all NaN when ``stop`` is
    ``REFUSED``, and ``refusal`` says why.  ``exact_zero`` marks nodes whose score is zero by
    structure rather than by rounding; ``symmetry(pools)`` gives classes of nodes whose equations
    are the same, so that their exact scores are equal (or None); nodes of different pools are
    known to differ.  ``conventions`` names, in words,
    every choice that other software may make otherwise.  ``labels`` are the ids of the nodes
    where ``Graph.rank`` made the result.  ``solved_on`` is None for what was solved just now;
    else the result comes from the store, and it says when it was solved (ISO 8601, UTC);
    ``known_standing`` is its order, which came with it.
    """

    measure: str
    settings: Any
    scores: Floats
    stop: Stop
    reason: str
    bound: Bound
    log: tuple[Iteration, ...] = ()
    conventions: Mapping[str, str] = field(default_factory=dict)
    seconds: Seconds = field(default_factory=Seconds)
    refusal: Refusal | None = None
    facts: Mapping[str, Any] = field(default_factory=dict)
    exact_zero: NDArray[np.bool_] | None = None
    symmetry: Callable[[NDArray[np.uint32] | None], NDArray[np.int64] | None] | None = None
    labels: pa.Array | None = None
    solved_on: str | None = None
    known_standing: Standing | None = field(default=None, repr=False, compare=False)

    def __repr__(self) -> str:
        if self.refusal is not None:
            return f"<Result {self.measure}: refused, {self.refusal.reason}>"
        size = f"{len(self.scores):,} nodes"
        return (
            f"<Result {self.measure}: {size}, {self.stop.value}, error {self.bound.value:.1e} "
            f"({self.bound.kind.value})>"
        )

    def to_arrow(self) -> pa.Table:
        """All rows, highest score first: rank, rank_low, rank_high, node, score, bound, rail.

        ``rank_low`` to ``rank_high`` are the ranks a node may truly have; ``bound`` is the most
        its score may be off, null where nothing is known; ``rail`` says how the row stands
        against the next: ``proven``, ``not proven``, ``tied``, ``not told from zero``.

        Raises:
            SettingsError: if the measure was refused, with the reason.
        """
        return self.top(len(self.scores))

    def top(self, rows: int = 10) -> pa.Table:
        """The first rows of :meth:`to_arrow`."""
        # By name: what a result is must not depend on how it is shown.
        return import_module("kingpost.core.library").table(self, rows)

    @property
    def sweeps(self) -> int:
        """Number of passes over the edges that changed the scores."""
        return self.log[-1].index if self.log else 0

    @property
    def edge_visits(self) -> int:
        """Number of edges read in all passes together."""
        return self.log[-1].edge_visits if self.log else 0

    @cached_property
    def standing(self) -> Standing:
        """Order, rank ranges and what is proven about them; computed on first use and kept."""
        from kingpost.core.standing import settle

        if self.known_standing is not None:
            return self.known_standing
        return settle(self.scores, self.bound, self.exact_zero, self.symmetry)

    @property
    def proven_order(self) -> int:
        """Largest K for which ranks 1..K are proven, exact ties counting as proven."""
        return self.standing.proven
