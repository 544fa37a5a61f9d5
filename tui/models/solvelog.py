"""The solve log's model: series for the chart, rows for the table, the sentence beneath."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import groupby
from typing import TYPE_CHECKING, Any

from kingpost.core.standing import UNRANKED
from kingpost.tui.models.chart import Series
from kingpost.tui.models.columns import Column
from kingpost.tui.models.numbers import compact, middle, small

if TYPE_CHECKING:
    from kingpost.core.result import Iteration, Result
    from kingpost.tui.jobs import Job

_NAN = math.nan


class Sweeps:
    """The lines of a convergence log, oldest first, as a source for the row-window table."""

    def __init__(self, log: Sequence[Iteration]) -> None:
        self.log = list(log)
        self.head = [
            Column(
                "index", "sweep", 6, lambda at: f"{self.log[at].index:,}", right=True, frozen=True
            ),
            Column("residual", "residual", 8, lambda at: small(self.log[at].residual), right=True),
            Column("bound", "bound", 8, lambda at: small(self.log[at].bound), right=True),
            Column("factor", "factor", 6, self._factor, right=True),
            Column("proven", "proven", 7, self._proven, right=True),
            Column("visits", "read", 6, lambda at: compact(self.log[at].edge_visits), right=True),
            Column("seconds", "seconds", 7, lambda at: f"{self.log[at].seconds:.3f}", right=True),
        ]
        if any(line.part for line in self.log):
            self.head.append(Column("part", "part", 22, self._part))
        if any(line.eigenvalue for line in self.log):
            self.head.append(Column("rho", "spectral radius within", 24, self._bracket))

    @property
    def count(self) -> int:
        """Number of sweeps."""
        return len(self.log)

    def item(self, row: int) -> int:
        """Sweeps are addressed by their place in the log."""
        return row

    def rail(self, row: int) -> int:
        """Sweeps have no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is marked here."""
        return False

    def _factor(self, at: int) -> str:
        # From one part of a solve, or of the graph, to the next there is no rate.
        if at == 0 or self.log[at].part != self.log[at - 1].part:
            return ""
        before, here = self.log[at - 1].residual, self.log[at].residual
        if here > 1e3 * before:
            return ""
        return f"{here / before:.3f}" if before > 0.0 and math.isfinite(here / before) else ""

    def _proven(self, at: int) -> str:
        proven = self.log[at].proven
        return "" if proven is None else f"{proven:,}"

    def _bracket(self, at: int) -> str:
        found = self.log[at].eigenvalue
        return "" if found is None else f"{found[0]:.9g} .. {found[1]:.9g}"

    def _part(self, at: int) -> str:
        from kingpost.core.text import visible

        return visible(self.log[at].part, 40)


def series_of(
    log: Sequence[Iteration], tolerance: float | None, n: int, proven: int | None = None
) -> Series:
    """The chart's series; a log of many thousand sweeps is thinned to what a screen can show.

    ``proven`` is the order proven by the finished result, known beyond what the log holds.
    """
    every = max(1, len(log) // 500)
    kept = [line for at, line in enumerate(log) if at % every == 0 or at == len(log) - 1]
    return Series(
        [line.index for line in kept],
        [line.residual for line in kept],
        [line.bound for line in kept],
        [line.proven for line in kept[:-1]] + [proven or line.proven for line in kept[-1:]],
        tolerance,
        n,
    )


def observed_factor(log: Sequence[Iteration]) -> float:
    """Geometric mean of the residual's factor a sweep; NaN if unknown.

    Taken over the second half of the longest part: a method of several parts starts anew in
    each.
    """
    parts = [list(lines) for _, lines in groupby(log, key=lambda line: line.part)]
    lines = max(parts, key=len, default=[])
    lines = [line for line in lines if math.isfinite(line.residual) and line.residual > 0.0]
    lines = lines[len(lines) // 2 :]
    if len(lines) < 2 or lines[-1].index == lines[0].index:
        return _NAN
    # Indices may fall where a log was put together from several: no factor a sweep then.
    sweeps = lines[-1].index - lines[0].index
    if sweeps < 0:
        return _NAN
    # By logarithms: the quotient itself may leave the range of a float.
    fall = math.log(lines[-1].residual) - math.log(lines[0].residual)
    return math.exp(min(fall / sweeps, 700.0))


def expected_factor(result: Result) -> tuple[float, str]:
    """The factor theory promises for plain sweeps, and where it comes from; NaN if none.

    The second eigenvalue of the surfer's matrix is at most the damping (Haveliwala and Kamvar
    2003); Katz sweeps contract by alpha times the spectral radius.
    """
    facts: Any = result.facts
    if result.measure == "surfer":
        damping = getattr(result.settings, "damping", facts.get("damping"))
        return (float(damping), "the damping") if damping is not None else (_NAN, "")
    if result.measure == "katz" and facts.get("alpha") and facts.get("rho"):
        return float(facts["alpha"]) * middle(facts["rho"]), "alpha times the spectral radius"
    return _NAN, ""


def why_stopped(result: Result) -> str:
    """One sentence: why it stopped, at what rate it converged, what rate was to be expected."""
    parts = [f"{result.stop}: {result.reason}".rstrip(": ")]
    if result.solved_on:
        parts.append(f"from the store, solved on {result.solved_on}")
    observed = observed_factor(result.log)
    expected, origin = expected_factor(result)
    if math.isfinite(observed):
        parts.append(f"the residual fell by a factor of {observed:.3f} a sweep")
    if math.isfinite(expected):
        parts.append(f"at most {expected:.3f} was to be expected ({origin})")
    kind = str(result.bound.kind)
    if math.isfinite(result.bound.value):
        parts.append(f"error bound {small(result.bound.value)} ({kind})")
    return "; ".join(parts)


def sweep_words(job: Job) -> str:
    """How far a solve has come, for the rule."""
    from kingpost.core.text import visible

    if not job.log:
        stage = f": {visible(job.progress.stage, 60)}" if job.progress else ""
        return f"{job.words}{stage}"
    line = job.log[-1]
    proven = f", order proven to {line.proven:,}" if line.proven else ""
    return f"{job.words}: sweep {line.index:,}, bound {small(line.bound)}{proven}"


def solved_words(result: Result) -> str:
    """What came of a solve, for the rule."""
    words = f"{result.measure}: {result.stop} after {result.sweeps:,} sweeps"
    words = f"{words}, bound {small(result.bound.value)}"
    return words + (f"; from the store, solved on {result.solved_on}" if result.solved_on else "")
