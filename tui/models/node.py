"""The node view's model: what gives score to a node, what it gives score to, the way come."""

from __future__ import annotations

import math
from collections.abc import Callable, Container, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from kingpost.core.graph import Graph
from kingpost.core.insight.contributions import Contributions, contributions, shares_given
from kingpost.core.result import Result
from kingpost.core.standing import UNRANKED
from kingpost.tui.models.columns import Column, attribute_text
from kingpost.tui.models.drawing import bar
from kingpost.tui.models.numbers import percent, rank_range
from kingpost.tui.terminal import UNICODE, Glyphs

_NAME = 60
BAR = 14

# Above this many neighbours a node is worked out in a job rather than at once.
MANY = 50_000


class Neighbours:
    """The neighbours on one side, by falling share; a source for the row-window table."""

    def __init__(self, nodes: Any, head: Sequence[Column]) -> None:
        self.nodes = nodes
        self.head = list(head)
        self.marks: Container[int] = ()

    @property
    def count(self) -> int:
        """Number of neighbours."""
        return len(self.nodes)

    def item(self, row: int) -> int:
        """Neighbours are addressed by their place in the list."""
        return row

    def node(self, row: int) -> int:
        """The node in a row."""
        return int(self.nodes[row])

    def rail(self, row: int) -> int:
        """Neighbours have no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is found here."""
        return False

    def kept(self, item: int) -> bool:
        """Whether a neighbour is on the shortlist."""
        return int(self.nodes[item]) in self.marks


@dataclass(frozen=True)
class NodeModel:
    """One node at the centre of its load path."""

    node: int
    name: str
    attributes: tuple[tuple[str, str], ...]
    feeders: Neighbours
    receivers: Neighbours
    given: Contributions


def centre(graph: Graph, result: Result, node: int, glyphs: Glyphs = UNICODE) -> NodeModel:
    """Both neighbour lists of a node, by falling share; O(k log k) in its k neighbours."""
    given = contributions(graph, result, node)
    cumulative = np.cumsum(given.share)
    near, weights, shares = shares_given(graph, result, node)
    feeders = Neighbours(
        given.neighbours,
        _columns(
            "gives to it",
            graph,
            result,
            given.neighbours,
            given.weights,
            given.share,
            cumulative,
            glyphs,
        ),
    )
    receivers = Neighbours(
        near, _columns("it gives to", graph, result, near, weights, shares, None, glyphs)
    )
    return NodeModel(
        node, graph.name(node, 200), _attributes(graph, node), feeders, receivers, given
    )


def _attributes(graph: Graph, node: int) -> tuple[tuple[str, str], ...]:
    if graph.attributes is None:
        return ()
    from kingpost.core.text import visible

    return tuple(
        (visible(name, 24), attribute_text(graph.attributes.column(name)[node].as_py()))
        for name in graph.attributes.column_names
    )


def _columns(
    title: str,
    graph: Graph,
    result: Result,
    nodes: Any,
    weights: Any,
    shares: Any,
    cumulative: Any,
    glyphs: Glyphs,
) -> list[Column]:
    standing, n = result.standing, graph.n
    refused = result.refusal is not None
    rank_width = min(2 * len(f"{n:,}") + 1, 11)

    def rank(at: int) -> str:
        return "-" if refused else rank_range(*standing.range_of(int(nodes[at])), rank_width)

    names = [len(graph.name(int(i), _NAME)) for i in nodes[:200]]
    longest = max([*names, len(title)])
    columns = [
        Column(
            "name",
            title,
            min(max(longest, 12), 24),
            lambda at: graph.name(int(nodes[at]), 4 * _NAME),
            frozen=True,
            stretch=min(max(longest, 12), _NAME),
        ),
        Column("bar", "", BAR, lambda at: bar(float(shares[at]), BAR, glyphs), style="bar"),
        Column("share", "share", 5, lambda at: percent(float(shares[at])), right=True),
    ]
    if cumulative is not None:
        columns.append(
            Column("cum", "cum", 4, lambda at: percent(float(cumulative[at])), right=True)
        )
    columns.append(Column("rank", "rank", max(rank_width, 4), rank, right=True))
    weight = weight_format(weights)
    widest = max((len(weight(float(w))) for w in weights[:200]), default=6)
    columns.append(
        Column(
            "weight", "weight", max(widest, 6), lambda at: weight(float(weights[at])), right=True
        )
    )
    return columns


def weight_format(weights: Any) -> Callable[[float], str]:
    """One number of decimals for a list of weights: about four digits at the heaviest."""
    few = weights[:MANY]
    if len(few) == 0 or bool(np.all(few == np.floor(few))):
        return lambda weight: f"{weight:,.0f}"
    decimals = min(max(3 - math.floor(math.log10(float(few.max()))), 0), 6)
    least = 0.5 * 10.0**-decimals
    return lambda weight: f"<{10.0**-decimals:g}" if weight < least else f"{weight:,.{decimals}f}"


@dataclass
class Trail:
    """The way walked: nodes in order, and where on it one stands."""

    nodes: list[int] = field(default_factory=list)
    at: int = -1

    def walk(self, node: int) -> None:
        """Go on to a node; whatever lay ahead is forgotten."""
        if self.nodes and self.nodes[self.at] == node:
            return
        self.nodes = [*self.nodes[: self.at + 1], node]
        self.at = len(self.nodes) - 1

    def back(self) -> int | None:
        """Step back; the node now at the centre, None at the start."""
        if self.at <= 0:
            return None
        self.at -= 1
        return self.nodes[self.at]

    def on(self) -> int | None:
        """Step forth again; None at the end."""
        if self.at + 1 >= len(self.nodes):
            return None
        self.at += 1
        return self.nodes[self.at]

    @property
    def before(self) -> list[int]:
        """The nodes passed on the way here."""
        return self.nodes[: max(self.at, 0)]

    @property
    def ahead(self) -> int | None:
        """The node one comes to by going forth again."""
        return self.nodes[self.at + 1] if self.at + 1 < len(self.nodes) else None
