"""Ranks along a setting: what can be swept, the first nodes as lines, who leads where."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from kingpost.core.export.sweep_answer import leader_words, stable_words, value_text
from kingpost.core.graph import Graph
from kingpost.core.insight.over import Over, at, parse_over
from kingpost.core.insight.sweep import Sweep, sweep
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import Answer, Listing, Page, names_width, said
from kingpost.tui.models.columns import Column
from kingpost.tui.models.curves import LETTERS, Axes, Curve, curves_chart
from kingpost.tui.models.numbers import rank_range, small

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings
    from kingpost.tui.models.chart import Cell
    from kingpost.tui.terminal import Glyphs

TOP = 10
# What is offered for a setting: the others are written by hand.
_OFFERED = {
    "damping": ("0.5:0.99:12", "0.5 to 0.99, 12 values"),
    "alpha_fraction": ("0.1:0.95:12", "0.1 to 0.95 of the largest it may be, 12 values"),
    "dangling": ("teleport,uniform,leak", "teleport, uniform, leak"),
    "inverse_temperature": ("0.1:2:12", "0.1 to 2, 12 values"),
}
FORMS = "damping=0.5:0.99:12, alpha=1e-4:1e-2:9:log or dangling=teleport,leak"
_ROLES = ("residual", "bound", "step", "plain")


def offered(settings: Settings) -> list[tuple[str, str]]:
    """(what to sweep as it is written, in words) of the settings of a measure."""
    found = []
    for name, (values, words) in _OFFERED.items():
        if hasattr(settings, name):
            flag = name.replace("_", "-")
            found.append((f"{flag}={values}", f"{name.replace('_', ' ')}: {words}"))
    return found


def checked(text: str, settings: Settings) -> Over:
    """What a text asks to be swept.

    Raises:
        SettingsError: for another form, a setting there is not, or a value out of its range; the
            sentence speaks of the setting, not of the command line.
    """
    from kingpost.core.errors import SettingsError

    try:
        over = parse_over(text)
        for value in over.values:
            at(settings, over, value)
    except SettingsError as error:
        raise SettingsError(error.sentence.replace("--over", "what is swept", 1)) from None
    return over


def along_answer(
    graph: Graph, name: str, settings: Settings, over: Over, watch: Watch | None = None
) -> Answer:
    """Pages: lines of the first ranks, every value, leader changes, words; run it in a job.

    Raises:
        SettingsError: for values out of range, or where no value has an answer.
        Interrupted: if ``watch`` was cancelled.
    """
    found = sweep(graph, name, settings, over, top=TOP, watch=watch)
    first, last = (value_text(found.points[end].value) for end in (0, -1))
    head = f"{name} along {over.flag}, {len(found.points):,} values from {first} to {last}"
    sentences = [
        ("stable", stable_words(graph, found)),
        ("leader", leader_words(graph, found)),
        *(
            (f"no answer at {value_text(point.value)}", point.refusal)
            for point in found.points
            if point.refusal is not None
        ),
    ]
    pages = [_lines_page(graph, found), _values_page(graph, found)]
    if over.numeric:
        pages.append(_changes_page(graph, found))
    return Answer(head, (*pages, said("in words", "in words", sentences)))


def _lines_page(graph: Graph, found: Sweep) -> Page:
    letters = [_letter(at) for at in range(len(found.nodes))]
    names = [graph.name(int(node), 96) for node in found.nodes]
    mean = found.ranks.astype(np.float64).mean(axis=2)
    mean[found.ranks[:, :, 0] < 0] = np.nan
    highest = float(np.nanmax(mean)) if mean.size else 1.0
    over = found.over
    values: list[Any] = [point.value for point in found.points]
    places = [float(at) for at in range(len(values))]
    if over.numeric:
        places = [math.log(value) if over.log else float(value) for value in values]
    axes = Axes(places, [value_text(value) for value in values], 1.0, max(highest, 2.0), True, True)
    drawn = [
        Curve(letters[at], _ROLES[at % len(_ROLES)], mean[:, at].tolist())
        for at in range(len(names))
    ]

    def draw(width: int, height: int, glyphs: Glyphs, row: int) -> list[list[Cell]]:
        return curves_chart(axes, drawn, width, height, glyphs, row)

    def rank(value: int) -> Callable[[int], str]:
        ranks = found.ranks[value]
        return lambda at: (
            "-" if ranks[at, 0] < 0 else rank_range(int(ranks[at, 0]), int(ranks[at, 1]), 11)
        )

    few = np.unique(np.linspace(0, len(values) - 1, min(len(values), 7)).round().astype(int))
    width = max([5, *(len(rank(value)(row)) for value in few for row in range(len(names)))])
    head = [
        Column("letter", "", 2, lambda at: letters[at], frozen=True),
        Column(
            "node", f"rank by {over.flag}", names_width(names, 12, 20), lambda at: names[at],
            frozen=True, stretch=names_width(names, 12, 40),
        ),
        *(
            Column(
                f"v{value}", value_text(values[value]), max(width, len(value_text(values[value]))),
                rank(value), right=True,
            )
            for value in few.tolist()
        ),
    ]  # fmt: skip

    def words(row: int) -> str:
        ranks = found.ranks[found.ranks[:, row, 0] > 0, row]
        best, worst = int(ranks[:, 0].min()), int(ranks[:, 1].max())
        kept = " at every value, proven" if found.always[row] else ""
        among = f"; among the first {found.top:,}{kept}" if kept else ""
        leads = leader_words(graph, found)
        return f"{names[row]}: ranks {best:,} to {worst:,}{among}. {leads[:1].upper()}{leads[1:]}"

    listing = Listing(head, len(names), lambda at: int(found.nodes[at]))
    return Page(
        "ranks",
        f"rank down (mean where open), {over.flag} across; a line is a letter",
        listing,
        words=words,
        draw=draw,
    )


def _letter(at: int) -> str:
    both = LETTERS + LETTERS.upper()
    return both[at] if at < len(both) else "+"


def _values_page(graph: Graph, found: Sweep) -> Page:
    points = found.points
    texts = [value_text(point.value) for point in points]
    leaders = ["-" if p.leader < 0 else graph.name(p.leader, 60) for p in points]
    head = [
        Column("value", found.over.flag, max(len(found.over.flag), *map(len, texts)),
               lambda at: texts[at], right=True, frozen=True),
        Column("leader", "proven first", names_width(leaders, 12, 30), lambda at: leaders[at]),
        Column("error", "error", 7, lambda at: small(points[at].error), right=True),
        Column("sweeps", "sweeps", 6, lambda at: f"{points[at].sweeps:,}", right=True),
        Column("seconds", "seconds", 7, lambda at: f"{points[at].seconds:.2f}", right=True),
        Column("method", "begun by", 12, lambda at: points[at].method),
    ]  # fmt: skip
    listing = Listing(head, len(points), lambda at: points[at].leader)

    def words(row: int) -> str:
        why = points[row].refusal
        return f"no answer at {texts[row]}: {why}" if why else stable_words(graph, found)

    return Page("values", "who is proven first at each value", listing, words=words)


def _changes_page(graph: Graph, found: Sweep) -> Page:
    changes = found.changes

    def name(node: int) -> str:
        return "no proven one" if node < 0 else graph.name(node, 60)

    head = [
        Column("low", "from", 10, lambda at: f"{changes[at].low:.7g}", right=True, frozen=True),
        Column("high", "to", 10, lambda at: f"{changes[at].high:.7g}", right=True, frozen=True),
        Column("before", "leader before", 20, lambda at: name(changes[at].before)),
        Column("after", "leader after", 20, lambda at: name(changes[at].after)),
    ]
    return Page(
        "leader changes",
        "where the leader changes, found by halving",
        Listing(head, len(changes), lambda at: changes[at].after),
        words=lambda row: leader_words(graph, found),
        empty="the leader does not change from one value to the next",
    )
