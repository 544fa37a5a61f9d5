"""One sitting: a graph, the results solved so far, the settings in force, every solve made."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from kingpost.core.insight.contributions import contributions
from kingpost.core.measures import NAMES, measure
from kingpost.tui.models.headings import Choice
from kingpost.tui.models.numbers import ScoreFormat, middle, score_format

if TYPE_CHECKING:
    from kingpost.core.graph import Flow, Graph
    from kingpost.core.measures.base import Measure, Settings
    from kingpost.core.result import Result


@dataclass
class Sitting:
    """What the views share.  ``current`` is the measure the standings show."""

    graph: Graph
    current: str
    settings: dict[str, Settings] = field(default_factory=dict)
    results: dict[str, Result] = field(default_factory=dict)
    solves: list[Result] = field(default_factory=list)
    names: Sequence[str] = NAMES
    find: Callable[[str], Measure] = measure
    formats: dict[int, tuple[Result, ScoreFormat]] = field(default_factory=dict)
    columns: Choice = field(default_factory=Choice)  # of the standings: what is shown, in order
    within: str = ""  # which part of a larger graph this is, if it is one
    peers: str = ""  # attribute among whose peers scores are rescaled beside the score
    makeup: dict[Any, Any] = field(default_factory=dict)  # pages of the makeup worked out so far

    def measure(self, name: str) -> Measure:
        """The measure of that name, by default from the registry."""
        return self.find(name)

    def settings_of(self, name: str) -> Settings:
        """Settings in force for a measure, at first its defaults; the flow is the one shown."""
        flow: Flow = getattr(self.settings.get(self.current), "flow", "along")
        if name not in self.settings:
            self.settings[name] = self.measure(name).settings(flow=flow)
        elif self.settings[name].flow != flow:
            self.settings[name] = dataclasses.replace(self.settings[name], flow=flow)
        return self.settings[name]

    def prepare(self, result: Result) -> None:
        """Work out, away from the screen, what a result needs each time a row of it is shown."""
        _ = result.standing.position, self.graph.m
        self.formats[id(result)] = (result, score_format(result.scores, result.bound))
        if self.graph.n and result.refusal is None:
            contributions(self.graph, result, int(result.standing.order[0]))

    def format_of(self, result: Result) -> ScoreFormat:
        """How the scores of a prepared result are written."""
        return self.formats[id(result)][1]

    def record(self, result: Result) -> None:
        """Keep a result as the latest of its measure."""
        before = self.results.get(result.measure)
        if before is not None:
            self.formats.pop(id(before), None)
        self.results[result.measure] = result
        self.settings[result.measure] = result.settings
        self.solves.append(result)

    def refuse(self, result: Result) -> None:
        """Note that a measure has no answer; what the standings show stays as it is."""
        self.solves.append(result)
        if result.measure != self.current:
            self.results[result.measure] = result

    @property
    def result(self) -> Result | None:
        """The result the standings show."""
        return self.results.get(self.current)

    @property
    def flow(self) -> str:
        """The flow the standings show."""
        return str(getattr(self.settings_of(self.current), "flow", "along"))

    def others(self) -> list[Result]:
        """Answers of the other measures under the same flow, in the registry's order."""
        return [
            self.results[name]
            for name in self.names
            if name != self.current
            and name in self.results
            and self.results[name].refusal is None
            and getattr(self.results[name].settings, "flow", "along") == self.flow
        ]

    def measures_shown(self) -> list[str]:
        """Names of the measures whose ranks are shown side by side, in the registry's order."""
        shown = [result.measure for result in self.others()]
        if self.result is not None and self.result.refusal is None:
            shown.append(self.current)
        return [name for name in self.names if name in shown]

    def ranks(self, node: int) -> dict[str, tuple[str, int, int]]:
        """Letter -> (measure, first rank, last rank) of a node in every answer shown."""
        found: dict[str, tuple[str, int, int]] = {}
        for name in self.names:
            result = self.results.get(name)
            if result is None or result.refusal is not None:
                continue
            if name != self.current and result not in self.others():
                continue
            first, last = result.standing.range_of(node)
            found[self.measure(name).letter] = (name, first, last)
        return found


def flow_words(graph: Graph, flow: str) -> str:
    """Which way score flows, in the words of the table's own columns."""
    origin = graph.origin
    if not graph.directed:
        return f"undirected, score flows both ways between {origin.source} and {origin.target}"
    if flow == "along":
        return f"score flows along {origin.source} -> {origin.target}"
    return f"score flows against {origin.source} -> {origin.target}"


def settings_words(settings: Any, facts: Mapping[str, Any] | None = None) -> str:
    """The settings that shape the answer, in a few words: all but accuracy and limits.

    What is done with dangling nodes is left out where ``facts`` say there are none.
    """
    facts = facts or {}
    skipped = {"flow", "tol", "stop", "max_sweeps"}
    parts = []
    if facts.get("alpha") is not None:
        # What alpha came to says more than the setting it was made from.
        skipped |= {"alpha", "alpha_fraction"}
        rho = facts.get("rho")
        share = f" = {facts['alpha'] * middle(rho):.3g}/rho" if rho else ""
        parts.append(f"alpha {facts['alpha']:.3g}{share}")
    elif facts.get("rho"):
        parts.append(f"rho {middle(facts['rho']):.6g}")
    for item in dataclasses.fields(settings):
        if item.name in skipped:
            continue
        if item.name == "dangling" and facts.get("dangling nodes") == 0:
            continue
        value = getattr(settings, item.name)
        if value is None or value == {} or value == ():
            continue
        words = f"{value:g}" if isinstance(value, float) else _short(value)
        # The trade writes the damping as d.
        name = "d=" if item.name == "damping" else item.name.replace("_", " ") + " "
        parts.append(name + words)
    return ", ".join(parts)


def _short(value: Any) -> str:
    from kingpost.core.text import visible

    if isinstance(value, dict):
        return f"on {len(value):,} nodes"
    if isinstance(value, (list, tuple)) and len(value) > 3:
        return f"{len(value):,} given"
    return visible(str(value), 24)
