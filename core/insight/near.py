"""Solving a problem near one that is solved: from the scores of that one where the measure can."""

from __future__ import annotations

import inspect
from collections.abc import Callable
from typing import Any

from kingpost.core.graph import Floats, Graph
from kingpost.core.measures import measure
from kingpost.core.measures.base import Settings, finish
from kingpost.core.result import Iteration, Result
from kingpost.core.watch import Watch

WARM = "warm start"
COLD = "solved anew"


def starts_warm(name: str, settings: Any) -> bool:
    """Whether the solver of a measure makes use of scores to start from."""
    if name == "surfer":
        mode, own = settings.dangling, settings.teleport is not None
        apart = not isinstance(mode, str) or (mode == "uniform" and own)
        return settings.damping < 1.0 and not apart
    return "start" in inspect.signature(measure(name).solver).parameters


def solve_near(
    name: str, graph: Graph, settings: Settings, start: Floats | None, watch: Watch
) -> tuple[Result, str]:
    """The result of a measure, and how it was found: :data:`WARM` or :data:`COLD`.

    ``start`` are scores of a near problem, shape (n,), or None.
    """
    if start is None or not starts_warm(name, settings):
        return finish(measure(name).solve(graph, settings, watch), _reporter(watch)), COLD
    work = measure(name).solve(graph, settings, watch, start)
    return finish(work, _reporter(watch)), WARM


def _reporter(watch: Watch) -> Callable[[Iteration], None]:
    return lambda line: watch.report("solving", line.index, None, "sweeps")
