"""A walk from a node, step by step: how far and how fast what leaves it spreads."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from kingpost.core.export.answer import CAUTION
from kingpost.core.export.walk_answer import MODEL, conventions_words, mixing_words, reach_words
from kingpost.core.graph import Flow, Graph
from kingpost.core.insight.walk import Walk, walk
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.text import count
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import Answer, Listing, Page, names_width, said
from kingpost.tui.models.columns import Column
from kingpost.tui.models.curves import Axes, Curve, curves_chart
from kingpost.tui.models.drawing import bar
from kingpost.tui.models.numbers import percent
from kingpost.tui.terminal import UNICODE, Glyphs

if TYPE_CHECKING:
    from kingpost.tui.models.chart import Cell

STEPS = 20
PLACES = 8
LEAST = 1e-9  # what is less is not drawn
_BAR = 10
_CAUTION = MODEL[:1].upper() + MODEL[1:] + "."


def walk_answer(
    graph: Graph,
    node: int,
    damping: float,
    flow: Flow,
    glyphs: Glyphs = UNICODE,
    watch: Watch | None = None,
) -> Answer:
    """Pages: step by step, where the walkers are, the modes of a small chain, in words.

    ``damping`` is the chance of following an edge rather than jumping to any node alike.  Run it
    in a job.

    Raises:
        SettingsError: for a damping out of range.
        Interrupted: if ``watch`` was cancelled.
    """
    start = np.zeros(graph.n)
    start[node] = 1.0
    settings = SurferSettings(damping=damping, flow=flow)
    found = walk(graph, start, settings, steps=STEPS, places=PLACES, watch=watch)
    name = graph.name(node, 60)
    jumps = "" if damping == 1.0 else f", jumping with chance {1.0 - damping:.3g}"
    pages = [_steps_page(graph, found), _places_page(graph, found, glyphs)]
    if found.modes:
        pages.append(_modes_page(found))
    words = [
        ("walker", conventions_words(graph, found)),
        ("mixing", mixing_words(found)),
        ("reach", reach_words(graph, found)),
        ("distance", "total variation to where it settles: 1 all elsewhere, 0 no difference"),
        ("caution", MODEL),
        ("", CAUTION.removeprefix("caution: ")),
    ]
    return Answer(
        f"walk from {name}{jumps}", (*pages, said("in words", "in words", words)), _CAUTION
    )


def _steps_page(graph: Graph, found: Walk) -> Page:
    steps = found.steps
    distances = [step.distance for step in steps]
    homes = [step.home for step in steps]
    known = [value for value in (*distances, *homes) if value > LEAST]
    low = min([0.1, *known])
    axes = Axes(
        [float(step.step) for step in steps], [f"{step.step:,}" for step in steps], low, 1.0, True
    )
    lost = any(step.lost for step in steps)
    tops = [step.places[0] if step.places else None for step in steps]
    names = ["-" if top is None else graph.name(top.node, 60) for top in tops]

    def draw(width: int, height: int, glyphs: Glyphs, row: int) -> list[list[Cell]]:
        curves = [
            Curve(glyphs.residual, "residual", distances),
            Curve(glyphs.bound, "bound", homes),
        ]
        return curves_chart(axes, curves, width, height, glyphs)

    def most(at: int) -> str:
        top = tops[at]
        return "-" if top is None else f"{percent(top.mass)} {names[at]}"

    head = [
        Column("step", "step", 4, lambda at: f"{steps[at].step:,}", right=True, frozen=True),
        Column("distance", "distance", 8, lambda at: share(distances[at]), right=True),
        Column("home", "at start", 8, lambda at: share(homes[at]), right=True),
        *(
            [Column("lost", "ended", 6, lambda at: share(steps[at].lost), right=True)]
            if lost
            else []
        ),
        Column("reached", "reached", 11, lambda at: f"{steps[at].reached:,}", right=True),
        Column("half", "half on", 11, lambda at: f"{steps[at].half:,}", right=True),
        Column("most", "most at", names_width(names, 12, 40) + 5, most),
    ]

    def node(row: int) -> int:
        top = tops[row]
        return -1 if top is None else top.node

    reach = reach_words(graph, found)
    sentence = f"{mixing_words(found)}. {reach[:1].upper()}{reach[1:]}"
    distance = "distance to where it settles, " if known and not math.isnan(distances[0]) else ""
    title = f"by step: {distance}chance to be at the start again"
    return Page(
        "steps", title, Listing(head, len(steps), node), words=lambda row: sentence, draw=draw
    )


def share(value: float) -> str:
    """A probability or distance with four decimals; a dash where it is not known."""
    if math.isnan(value):
        return "-"
    return f"{value:.4f}" if value >= 5e-5 or value == 0 else f"{value:.0e}"


def _places_page(graph: Graph, found: Walk, glyphs: Glyphs) -> Page:
    rows = [(step, place) for step in found.steps for place in step.places]
    names = [graph.name(place.node, 96) for _, place in rows]

    def opens(at: int) -> bool:
        return at == 0 or rows[at - 1][0] is not rows[at][0]

    head = [
        Column("step", "step", 4, lambda at: f"{rows[at][0].step:,}" if opens(at) else "",
               right=True, frozen=True),
        Column("node", "most of the walkers at", names_width(names, 22, 24), lambda at: names[at],
               frozen=True, stretch=names_width(names, 22, 48)),
        Column("bar", "", _BAR, lambda at: bar(rows[at][1].mass, _BAR, glyphs), style="bar"),
        Column("mass", "now", 7, lambda at: share(rows[at][1].mass), right=True),
        Column("lasting", "in the long run", 15, lambda at: share(rows[at][1].lasting),
               right=True),
    ]  # fmt: skip

    def words(row: int) -> str:
        step = rows[row][0]
        return (
            f"after step {step.step:,} the walker can be at {count(step.holding, 'node')}; half of "
            f"the chance lies on {count(step.half, 'node')}"
        )

    return Page(
        "places",
        f"where the walker may be, the first {PLACES} of each step",
        Listing(head, len(rows), lambda at: rows[at][1].node),
        words=words,
    )


def _modes_page(found: Walk) -> Page:
    modes = found.modes

    def value(at: int) -> str:
        mode = modes[at]
        if abs(mode.imaginary) < 1e-12:
            return f"{mode.real:.6f}"
        return f"{mode.real:.4f}{mode.imaginary:+.4f}i"

    def steps(number: float) -> str:
        return "lasts" if math.isinf(number) else "-" if math.isnan(number) else f"{number:.3g}"

    head = [
        Column("value", "eigenvalue", 16, value, right=True, frozen=True),
        Column("modulus", "modulus", 8, lambda at: f"{modes[at].modulus:.6f}", right=True),
        Column("life", "half-life", 9, lambda at: steps(modes[at].half_life), right=True),
        Column("swing", "swing", 7, lambda at: steps(modes[at].period), right=True),
        Column("weight", "of the start", 12, lambda at: share(modes[at].weight), right=True),
    ]
    words = "each mode fades by its modulus a step; half-life and swing are in steps"
    return Page(
        "modes", "eigenvalues of the walk", Listing(head, len(modes)), words=lambda row: words
    )
