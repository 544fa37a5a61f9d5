"""A walk, step by step, for every format."""

from __future__ import annotations

import math

from kingpost.core.export.answer import (
    CAUTION,
    Answer,
    Field,
    Sheet,
    graph_facts,
    nodes_field,
    reals,
    solve_facts,
    whole,
)
from kingpost.core.export.digits import number, small
from kingpost.core.export.heading import graph_line
from kingpost.core.graph import Graph
from kingpost.core.insight.walk import Walk, steps_at_most
from kingpost.core.text import count, listed

_NAMED = 5
MODEL = (
    "a walker is a model: what spreads by copies, by choice or through queues goes other ways and "
    "at other speeds"
)


def walk_answer(graph: Graph, found: Walk) -> Answer:
    """Sheets: ``steps``, ``places`` (most probable nodes at each), ``modes`` of a small chain."""
    settings = found.settings
    names = [graph.name(int(node), 60) for node in found.begins[: _NAMED + 1]]
    more = len(found.begins) - len(names)
    begin = listed(names, _NAMED) if more <= 0 else f"{count(len(found.begins), 'node')}"
    lasting = found.stationary
    head = [
        graph_line(graph, settings.flow),
        f"a walk from {begin}: {conventions_words(graph, found)}",
        "distance: total variation to the stationary distribution, 1 for all elsewhere to 0 for no "
        "difference; half: fewest nodes that hold half of the walkers",
    ]
    sheets = [_steps(graph, found), _places(graph, found), _last(graph, found)]
    if found.modes:
        sheets.append(_modes(found))
    facts = {
        **graph_facts(graph),
        "begins": [graph.label(int(node)) for node in found.begins[:1000]],
        "damping": settings.damping,
        "eps": found.eps,
        "mixed": found.mixed,
        "searched": found.searched,
        "period": found.period,
        "stationary": solve_facts(lasting),
        "sentence": mixing_words(found),
    }
    tail = [mixing_words(found), reach_words(graph, found), MODEL, CAUTION]
    return Answer(head, sheets, facts, tail)


def conventions_words(graph: Graph, found: Walk) -> str:
    """How the walker moves, in words."""
    settings = found.settings
    d = settings.damping
    jump = "to any node alike" if settings.teleport is None else "by the teleport vector"
    words = "follows edges and never jumps of itself"
    if d < 1:
        words = f"follows an edge with probability {d:g}, else jumps {jump}"
    landing = {
        "teleport": f"it jumps {jump}",
        "uniform": "it jumps to any node alike",
        "leak": "it ends",
    }
    mode = settings.dangling
    where = landing[mode] if isinstance(mode, str) else "it jumps by a distribution of its own"
    return f"{words}; at a node without out-edges {where}"


def mixing_words(found: Walk) -> str:
    """How soon the walk forgets its start, in one sentence."""
    lasting = found.stationary
    if lasting.refusal is not None:
        return f"there is no distribution to settle to: {lasting.refusal.sentence}"
    if found.mixed is not None:
        return (
            f"mixed after {count(found.mixed, 'step')}: from there on the distance to the "
            f"stationary distribution is at most {found.eps:g}, from this start"
        )
    if found.period is not None and found.period > 1:
        return (
            f"never mixes: all ways around have lengths that are multiples of {found.period:,}, so "
            "the walk goes round for good"
        )
    words = f"not within {found.eps:g} of the stationary distribution in {found.searched:,} steps"
    certain = steps_at_most(found.settings.damping, found.eps)
    return words if certain is None else f"{words}; the jumps alone bring it there in {certain:,}"


def reach_words(graph: Graph, found: Walk) -> str:
    """How far the walk can have come, in one sentence."""
    last = found.steps[-1]
    words = (
        f"after {count(last.step, 'step')} the walk can have been at {last.reached:,} of "
        f"{count(graph.n, 'node')}, and {count(last.half, 'node')} hold half of the walkers"
    )
    return words if not last.lost else f"{words}; {last.lost:.1%} of them have ended"


def _share(value: float) -> str:
    return "-" if math.isnan(value) else f"{value:.4f}"


def _steps(graph: Graph, found: Walk) -> Sheet:
    rows = found.steps
    tops = [row.places[0] if row.places else None for row in rows]
    names = ["-" if top is None else f"{graph.name(top.node, 60)} {top.mass:.1%}" for top in tops]
    most = nodes_field(graph.labels, [-1 if top is None else top.node for top in tops], "most_at")
    lost = any(row.lost for row in rows)
    fields = [
        Field("step", whole([row.step for row in rows]), "step"),
        _number("distance", "distance", [row.distance for row in rows]),
        Field("distance_error", reals([row.distance_error for row in rows])),
        _number("home", "at start", [row.home for row in rows]),
        _number("lost", "ended" if lost else None, [row.lost for row in rows]),
        Field("reached", whole([row.reached for row in rows]), "reached"),
        Field("holding", whole([row.holding for row in rows])),
        Field("half", whole([row.half for row in rows]), "half"),
        Field(most.name, most.values, "most at", names, align="<", least=12),
        Field("error", reals([row.error for row in rows])),
    ]
    return Sheet("steps", fields)


def _number(name: str, title: str | None, values: list[float]) -> Field:
    return Field(name, reals(values), title, [_share(value) for value in values])


def _places(graph: Graph, found: Walk) -> Sheet:
    rows = [(row.step, place) for row in found.steps for place in row.places]
    fields = [
        Field("step", whole([step for step, _ in rows])),
        nodes_field(graph.labels, [place.node for _, place in rows]),
        Field("mass", reals([place.mass for _, place in rows])),
        Field("lasting", reals([place.lasting for _, place in rows])),
    ]
    return Sheet("places", fields, read=False)


def _last(graph: Graph, found: Walk) -> Sheet:
    last = found.steps[-1]
    fields = [
        nodes_field(graph.labels, [place.node for place in last.places]),
        _number("mass", f"step {last.step:,}", [place.mass for place in last.places]),
        _number("lasting", "in the long run", [place.lasting for place in last.places]),
    ]
    return Sheet("last", fields, "most of the walkers are then at", data=False)


def _modes(found: Walk) -> Sheet:
    rows = found.modes
    lives = [row.half_life for row in rows]
    swings = [row.period for row in rows]
    weights = [row.weight for row in rows]
    fields = [
        Field("real", reals([row.real for row in rows]), "eigenvalue", [_value(r) for r in rows]),
        Field("imaginary", reals([row.imaginary for row in rows])),
        Field("modulus", reals([row.modulus for row in rows]), "modulus", [
            f"{row.modulus:.6f}" for row in rows]),
        Field("half_life", reals(lives), "half-life", [
            "lasts" if math.isinf(life) else f"{life:.3g}" for life in lives]),
        Field("period", reals(swings), "swing", [
            "-" if math.isnan(swing) else f"{swing:.3g}" for swing in swings]),
        Field("weight", reals(weights), "of the start", [
            "-" if math.isnan(weight) else small(weight) if weight < 1e-4 else number(weight)
            for weight in weights]),
    ]  # fmt: skip
    heading = "modes of the chain: each fades by its modulus a step (half-life and swing in steps)"
    return Sheet("modes", fields, heading)


def _value(row: object) -> str:
    real, imaginary = getattr(row, "real", 0.0), getattr(row, "imaginary", 0.0)
    if abs(imaginary) < 1e-12:
        return f"{real:.6f}"
    return f"{real:.4f}{imaginary:+.4f}i"
