"""Which equation foreign scores solve, for every format."""

from __future__ import annotations

import shlex

from kingpost.core.export.answer import (
    Answer,
    Field,
    Sheet,
    graph_facts,
    reals,
    texts,
    whole,
)
from kingpost.core.export.digits import small
from kingpost.core.export.heading import graph_line
from kingpost.core.graph import Graph
from kingpost.core.insight.variants import LOOP_WORDS, WEIGHT_WORDS, Choice
from kingpost.core.insight.verify import CLOSE, EXACT, NONE, Match, Verdict
from kingpost.core.text import count, listed, visible

_NAMES = {
    "degree": "strengths (weighted degrees)",
    "total degree": "strengths of both sides together",
    "eigenvector": "eigenvector scores",
    "authorities": "authority scores (hits)",
    "surfer": "random-surfer (PageRank) scores",
    "surfer, dangling stay": "random-surfer scores in which dangling nodes keep their walkers",
    "surfer, landing on dangling": "random-surfer scores in which jumps favour dangling nodes",
    "katz": "Katz scores, beta included",
    "katz without beta": "Katz scores, beta left out",
    "katz shifted": "Katz scores less a constant",
    "katz in steps": "Katz sums cut off, beta included",
    "katz without beta in steps": "Katz sums cut off, beta left out",
}


def verify_answer(graph: Graph, found: Verdict) -> Answer:
    """Sheets: ``equations`` (the best and those that come next), ``differences`` to the usual."""
    best = found.best
    head = [graph_line(graph), _scores_line(found), sentence(graph, found)]
    differences = _differences(graph, found)
    tail = [*_account(found)]
    if best.worst is not None:
        node, theirs, ours = best.worst
        name = graph.name(node, 60)
        where = f"furthest from the solution is {name}: {theirs:.8g}, solution {ours:.8g}"
        tail.append(where)
    if found.negated:
        tail.append("all scores are negative; they were turned round, as signs of a vector may be")
    again = command(best)
    if found.verdict != NONE and again:
        tail.append(f"the same with proof: kingpost rank EDGES {again}")
    facts = {
        **graph_facts(graph),
        "scores": {
            "file": found.foreign.name,
            "column": found.foreign.column,
            "rows": found.foreign.rows,
            "missing": found.foreign.missing,
            "extra": found.foreign.extra,
            "repeated": found.foreign.repeated,
            "empty": found.foreign.empty,
            "precision": found.foreign.rounding.words,
        },
        "verdict": found.verdict,
        "sentence": sentence(graph, found),
        "equation": _equation(best),
        "parameters": {name: one.value for name, one in best.parameters.items()},
        "fitted": {name: one.fitted for name, one in best.parameters.items()},
        "normalisation": found.scale,
        "libraries": list(found.libraries),
        "error_bound": best.error,
        "residual": best.fit.residual,
        "alike": [_equation(match) for match in found.alike],
        "equations_tried": found.tried,
        "command": again,
    }
    return Answer(head, [_sheet(found), _difference_sheet(differences)], facts, tail)


def _scores_line(found: Verdict) -> str:
    foreign = found.foreign
    return (
        f"scores {visible(foreign.column, 40)} of {visible(foreign.name, 80)}: "
        f"{count(foreign.rows, 'row')}, {foreign.rounding.words}"
    )


def sentence(graph: Graph, found: Verdict) -> str:
    """The verdict in one sentence."""
    best, fit = found.best, found.best.fit
    what = f"{_title(best)}{_with(best)}, {_graph_words(graph, best)}"
    if found.verdict == NONE:
        words = (
            f"none of the {found.tried:,} equations tried fits; the nearest is {what}: it leaves "
            f"{fit.unexplained:.2g} of the scores' spread unexplained, row by row "
            f"{fit.residual:.2g} of the scores"
        )
        if fit.unexplained <= 1e-2:
            words += ", and others come as near"
        return words
    words = f"these are {what}; {found.scale}"
    if found.libraries:
        words += f"; so computes {' or '.join(found.libraries)} by default"
    if found.verdict == EXACT and fit.within_rounding:
        rounding = found.foreign.rounding.words
        words += f"; what is left in every row is explained by {_explained(rounding)}"
    elif found.verdict == CLOSE:
        words += "; solved loosely, as by an iteration that stopped early"
    if best.error is None:
        return f"{words}; {best.no_error}"
    return f"{words}; the error is at most {small(best.error)} of their sum"


def _explained(rounding: str) -> str:
    return "rounding in double precision" if rounding == "double precision" else rounding


def _title(match: Match) -> str:
    if match.fit.form == "authorities" and match.flow == "against":
        return "hub scores (hits)"
    if match.fit.steps:
        return f"{_NAMES[match.fit.form]} after {count(match.fit.steps, 'step')}"
    return _NAMES[match.fit.form]


def _with(match: Match) -> str:
    words = []
    for name, one in match.parameters.items():
        told = f" = {one.words}" if one.words else ""
        text = f"{name} {one.value:.6g}{told}"
        if not one.words and one.value != one.fitted and f"{one.fitted:.6g}" != f"{one.value:.6g}":
            text += f" (fitted {one.fitted:.6g})"
        words.append(text)
    return f" with {', '.join(words)}" if words else ""


def _graph_words(graph: Graph, match: Match) -> str:
    choice = match.choice
    if choice.undirected or not graph.directed:
        words = ["edges read both ways" if graph.directed else "undirected"]
    elif match.fit.form == "total degree":
        words = ["both sides"]
    elif match.fit.form == "authorities":
        words = ["as the edges point"]
    else:
        words = [f"score flowing {match.flow} the edges"]
    if choice.weights != "asis":
        words.append(f"weights {WEIGHT_WORDS[choice.weights]}")
    elif graph.weighted and graph.origin.weight is None:
        words.append("every row counting 1")
    elif graph.weighted:
        words.append(f"weighted by {visible(graph.origin.weight_words, 40)}")
    if choice.loops != "keep":
        words.append(f"self-loops {LOOP_WORDS[choice.loops]}")
    return ", ".join(words)


def _equation(match: Match) -> dict[str, object]:
    choice: Choice = match.choice
    return {
        "form": match.fit.form,
        "steps": match.fit.steps or None,
        "flow": match.flow,
        "weights": choice.weights,
        "self_loops": choice.loops,
        "undirected": choice.undirected,
        "coefficients": list(match.fit.theta),
    }


def _sheet(found: Verdict) -> Sheet:
    rows = [found.best, *found.alike, *found.runners_up]
    marks = ["best"] + ["fits alike"] * len(found.alike) + ["next"] * len(found.runners_up)
    left = [match.fit.unexplained for match in rows]
    fields = [
        Field("place", texts(marks), ""),
        Field("equation", texts([_title(match) for match in rows]), "equation", least=16),
        Field("parameter", texts([_with(match).removeprefix(" with ") for match in rows]), "with"),
        Field("flow", texts([match.flow for match in rows]), "flow"),
        Field("weights", texts([WEIGHT_WORDS[m.choice.weights] for m in rows]), "weights", least=8),
        Field("self_loops", texts([LOOP_WORDS[m.choice.loops] for m in rows])),
        Field("undirected", texts(["yes" if m.choice.undirected else "no" for m in rows])),
        Field("unexplained", reals(left), "left", [f"{value:.1e}" for value in left]),
        Field("residual", reals([match.fit.residual for match in rows])),
        Field("rows", whole([match.fit.rows for match in rows]), "rows used"),
    ]
    heading = "left: share of the scores' spread (standard deviation) that the equation misses"
    return Sheet("equations", fields, heading)


def _differences(graph: Graph, found: Verdict) -> list[tuple[str, str, str]]:
    """What differs from how this table is ranked here without further options."""
    if found.verdict == NONE:
        return []
    best, choice = found.best, found.best.choice
    rows = []
    if choice.weights != "asis":
        rows.append(("weights", WEIGHT_WORDS[choice.weights], graph.origin.weight_words))
    if choice.loops != "keep":
        rows.append(("self-loops", LOOP_WORDS[choice.loops], graph.origin.loops))
    if choice.undirected:
        rows.append(("direction", "both ways", "as the table says"))
    elif best.flow == "against" and best.fit.form != "authorities":
        rows.append(("flow", "against the edges", "along the edges"))
    if "damping" in best.parameters and best.parameters["damping"].value != 0.85:
        rows.append(("damping", f"{best.parameters['damping'].value:.6g}", "0.85"))
    if "alpha" in best.parameters and best.parameters["alpha"].words != "0.85/rho":
        rows.append(("alpha", f"{best.parameters['alpha'].value:.6g}", "0.85/rho"))
    if best.fit.form == "surfer, landing on dangling":
        there = "land on dangling nodes 1 / (1 - d) times as often as on others"
        rows.append(("jumps", there, "land by the teleport vector"))
    if best.fit.form == "surfer, dangling stay":
        rows.append(("dangling nodes", "keep their walkers", "jump by the teleport vector"))
    if "without beta" in best.fit.form or best.fit.form == "katz shifted":
        rows.append(("beta", "left out or shifted", "included"))
    if best.fit.steps:
        rows.append(("walks", f"of at most {count(best.fit.steps, 'step')}", "of any length"))
    usual = {"surfer": "sum 1", "eigen": "Euclidean length 1", "autho": "Euclidean length 1"}
    ours = usual.get(best.fit.form[:6].rstrip(","), usual.get(best.fit.form[:5], "not normalised"))
    theirs = "not normalised" if found.scale.endswith("not normalised") else found.scale
    if theirs != ours:
        rows.append(("normalisation", found.scale, ours))
    return rows


def _difference_sheet(rows: list[tuple[str, str, str]]) -> Sheet:
    fields = [
        Field("choice", texts([row[0] for row in rows]), "what differs"),
        Field("theirs", texts([row[1] for row in rows]), "in these scores"),
        Field("ours", texts([row[2] for row in rows]), "here unless told"),
    ]
    return Sheet("differences", fields, read=bool(rows))


def _account(found: Verdict) -> list[str]:
    foreign, lines = found.foreign, []
    if foreign.missing:
        few = listed(list(foreign.examples["missing"]), 3)
        lines.append(
            f"{count(foreign.missing, 'node')} of the table have no score (such as {few}); rows "
            f"that need them were set aside: {found.best.fit.rows:,} were checked"
        )
        if found.verdict == NONE:
            lines.append("with the scores of all nodes every equation could be checked in full")
    if foreign.extra:
        few = listed(list(foreign.examples["extra"]), 3)
        lines.append(
            f"{count(foreign.extra, 'row')} of the scores name nodes that no edge names (such as "
            f"{few}); they were set aside"
        )
    if foreign.repeated:
        lines.append(f"{count(foreign.repeated, 'row')} repeat a node with the same score")
    if foreign.empty:
        lines.append(f"{count(foreign.empty, 'row')} hold no score (null or NaN)")
    if found.alike:
        names = listed([f"{_title(m)}{_with(m)} ({m.flow})" for m in found.alike], 3)
        lines.append(f"on this table these fit as well and cannot be told apart: {names}")
    return lines


def command(match: Match) -> str:
    """Options of ``kingpost rank`` that ask for the same equation; empty where there are none."""
    form, choice = match.fit.form, match.choice
    words: list[str] = []
    if form in ("surfer", "eigenvector", "degree"):
        words += ["--measure", form]
    elif form in ("katz", "katz without beta", "katz shifted"):
        words += ["--measure", "katz", "--alpha", f"{match.parameters['alpha'].value:.10g}"]
    elif form == "authorities":
        role = "hub" if match.flow == "against" else "authority"
        words += ["--measure", "hits", "--role", role]
    if not words or choice.weights == "last" or choice.loops == "twice":
        return ""
    if "damping" in match.parameters:
        words += ["--damping", f"{match.parameters['damping'].value:.10g}"]
    if choice.undirected:
        words.append("--undirected")
    elif match.flow == "against" and form != "authorities":
        words += ["--flow", "against"]
    weights = {
        "none": ["--parallel", "first", "--weight-as", "none"],
        "inverse": ["--weight-as", "inverse"],
        "count": ["--parallel", "count"],
        "first": ["--parallel", "first"],
    }
    words += weights.get(choice.weights, [])
    if choice.loops == "drop":
        words += ["--loops", "drop"]
    return shlex.join(words)
