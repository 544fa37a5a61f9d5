"""What every measure has in common: settings that validate themselves, and the way to solve."""

from __future__ import annotations

import dataclasses
import math
import re
import time
from collections.abc import Callable, Generator, Mapping
from dataclasses import dataclass, replace
from typing import Any, TypeVar

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Flow, Graph
from kingpost.core.result import Iteration, Result
from kingpost.core.structure import structure_of
from kingpost.core.watch import Watch

_PROMPT = 4_000_000  # stored edges whose structure is found in less than 0.1 s

Solve = Generator[Iteration, None, Result]


def option(
    default: Any,
    words: str,
    *,
    low: float | None = None,
    high: float | None = None,
    choices: tuple[str, ...] | None = None,
    open_low: bool = False,
    open_high: bool = False,
) -> Any:
    """A settings field with its meaning and range; forms and command lines are made from it."""
    about = {
        "words": words,
        "low": low,
        "high": high,
        "choices": choices,
        "open_low": open_low,
        "open_high": open_high,
    }
    if isinstance(default, (dict, list)):
        return dataclasses.field(default_factory=lambda: default, metadata=about)
    return dataclasses.field(default=default, metadata=about)


@dataclass(frozen=True, kw_only=True)
class Settings:
    """Settings every iterative measure shares; each field says its range in its metadata."""

    flow: Flow = option(
        "along",
        "score flows along the edges (a node is high when what points at it is high) or against",
        choices=("along", "against"),
    )
    tol: float = option(
        1e-10,
        "stop when the proven error, summed over all nodes, is at most this share of the scores",
        low=0.0,
        high=1.0,
        open_low=True,
        open_high=True,
    )
    stop: str = option(
        "bound", "stop at the error bound, or once the order of the top K is proven: order:K"
    )
    max_sweeps: int = option(10_000, "give up after this many sweeps over the edges", low=1)

    def __post_init__(self) -> None:
        for item in dataclasses.fields(self):
            _validate(item.name, getattr(self, item.name), item.metadata)
        if self.stop != "bound" and self.stop_order is None:
            raise SettingsError(f"--stop is {self.stop!r}; it takes 'bound' or 'order:K', K from 1")

    @property
    def stop_order(self) -> int | None:
        """K of ``order:K``, else None."""
        match = re.fullmatch(r"order:([1-9][0-9]*)", self.stop)
        return int(match[1]) if match else None


def _validate(name: str, value: Any, about: Mapping[str, Any]) -> None:
    flag = "--" + name.replace("_", "-")
    choices = about.get("choices")
    if choices and isinstance(value, str) and value not in choices:
        raise SettingsError(f"{flag} is {value!r}; it takes {', '.join(choices)}")
    low, high = about.get("low"), about.get("high")
    if value is None or (low is None and high is None):
        return
    if not isinstance(value, (int, float)) or math.isnan(value):
        raise SettingsError(f"{flag} is {value!r}; it takes a number")
    below = low is not None and (value < low or (about["open_low"] and value == low))
    above = high is not None and (value > high or (about["open_high"] and value == high))
    if below or above:
        raise SettingsError(f"{flag} is {value:g}; it takes {_range_words(about)}")


def _range_words(about: Mapping[str, Any]) -> str:
    parts = []
    if about["low"] is not None:
        parts.append(f"{'more than' if about['open_low'] else 'at least'} {about['low']:g}")
    if about["high"] is not None:
        parts.append(f"{'less than' if about['open_high'] else 'at most'} {about['high']:g}")
    return "a number " + " and ".join(parts)


@dataclass(frozen=True)
class Measure:
    """A measure as the registry knows it.

    Attributes:
        name: the word used on the command line and in files.
        letter: one capital letter for the rank ruler, unique among the measures.
        title: a few words for a heading.
        settings: the Settings class.
        solver: ``solver(graph, settings, watch)``, a generator of Iterations that returns a
            Result; it may take ``start``, scores of a near problem, too.  It must look at
            ``watch.cancelled`` at least five times a second and then return its best iterate.
        structured: whether the solver looks at ``graph.structure``; it is then found beforehand.
    """

    name: str
    letter: str
    title: str
    settings: type[Settings]
    solver: Callable[..., Solve]
    structured: bool = True

    def solve(
        self,
        graph: Graph,
        settings: Settings | None = None,
        watch: Watch | None = None,
        start: Floats | None = None,
    ) -> Solve:
        """Start a solve; drive the generator, or hand it to :func:`finish`.

        ``start`` are scores of a near problem, shape (n,), for solvers that take them.
        Cancelled, it returns the best there is.  On a large graph the first step may raise
        Interrupted: where there is nothing at all yet, not even the structure of the graph.
        """
        watch = watch or Watch()
        began = time.perf_counter()
        if self.structured:
            structure_of(graph, watch if graph.stored > _PROMPT else Watch())
        taken = time.perf_counter() - began
        near = () if start is None else (start,)
        found = yield from self.solver(graph, settings or self.settings(), watch, *near)
        seconds = replace(found.seconds, prepare=found.seconds.prepare + taken)
        return replace(found, seconds=seconds)

    def rank(
        self,
        graph: Graph,
        settings: Settings | None = None,
        watch: Watch | None = None,
        on_iteration: Callable[[Iteration], None] | None = None,
    ) -> Result:
        """Solve to the end and return the Result."""
        return finish(self.solve(graph, settings, watch), on_iteration)


T = TypeVar("T")


def finish(
    work: Generator[Iteration, None, T], on_iteration: Callable[[Iteration], None] | None = None
) -> T:
    """Drive a generator of iterations to its end and return what it returns."""
    while True:
        try:
            line = next(work)
        except StopIteration as end:
            return end.value  # type: ignore[no-any-return]
        if on_iteration is not None:
            on_iteration(line)
