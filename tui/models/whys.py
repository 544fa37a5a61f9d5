"""Why a node scores what it scores, and why one stands above another: terms to read."""

from __future__ import annotations

import numpy as np

from kingpost.core.export.digits import score_texts
from kingpost.core.export.why_answer import PARTS, than_sentence
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.terms import interval_reach
from kingpost.core.insight.why import Difference, Term, Why, than, why
from kingpost.core.result import Bound, BoundKind, Result
from kingpost.core.text import count
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import Answer, Listing, Page, names_width, said
from kingpost.tui.models.columns import Column
from kingpost.tui.models.drawing import bar
from kingpost.tui.models.node import weight_format
from kingpost.tui.models.numbers import ScoreFormat, percent, rank_range, score_format, small
from kingpost.tui.terminal import UNICODE, Glyphs

_BAR = 10
_SAMPLE = 300
_NAME = 96


def why_answer(
    graph: Graph, result: Result, node: int, glyphs: Glyphs = UNICODE, watch: Watch | None = None
) -> Answer:
    """Pages: the terms that sum to the score, the supply paths; run it in a job.

    Raises:
        SettingsError: for a measure whose scores are no sums of known terms.
        Interrupted: if ``watch`` was cancelled.
    """
    found = why(graph, result, node, watch=watch)
    head = f"why {graph.name(node, 60)} has its {result.measure} score"
    return Answer(head, (_terms_page(graph, result, found, glyphs), _paths_page(graph, found)))


def _terms_page(graph: Graph, result: Result, found: Why, glyphs: Glyphs) -> Page:
    own = [(name, part) for name, part in found.parts.items() if part]
    k = len(found.neighbours)
    amount = np.concatenate((found.amount, [part for _, part in own]))
    order = np.argsort(-amount, kind="stable")
    share = amount / found.score if found.score > 0 else np.zeros(len(amount))
    running = np.cumsum(share[order])
    width = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)

    def name(at: int) -> str:
        term = int(order[at])
        return graph.name(int(found.neighbours[term]), _NAME) if term < k else own[term - k][0]

    def means(at: int) -> str:
        term = int(order[at])
        return name(at) if term < k else PARTS[own[term - k][0]]

    def feeder(at: int) -> int:
        term = int(order[at])
        return int(found.neighbours[term]) if term < k else -1

    def rank(at: int) -> str:
        node = feeder(at)
        return "" if node < 0 else rank_range(*result.standing.range_of(node), width)

    form, weights = amount_format(amount), weight_format(found.weights)
    heavy = max((len(weights(float(w))) for w in found.weights[:_SAMPLE]), default=6)
    names = [name(at) for at in range(min(len(order), _SAMPLE))]
    head = [
        Column(
            "name", "what gives", names_width(names, 10, 20),
            lambda at: f"({means(at)})" if feeder(at) < 0 else name(at),
            frozen=True, stretch=names_width(names, 10, 48),
        ),
        Column("bar", "", _BAR, lambda at: bar(float(share[order[at]]), _BAR, glyphs), style="bar"),
        Column("share", "share", 5, lambda at: percent(float(share[order[at]])), right=True),
        Column("cum", "cum", 4, lambda at: percent(float(running[at])), right=True),
        Column(
            "amount", f"gives{form.unit}", max(form.width, 5 + len(form.unit)),
            lambda at: form.text(float(amount[order[at]])), right=True,
        ),
        Column("rank", "rank", max(width, 4), rank, right=True),
        Column(
            "weight", "weight", max(heavy, 6),
            lambda at: "" if feeder(at) < 0 else weights(float(found.weights[order[at]])),
            right=True,
        ),
    ]  # fmt: skip
    about = f"{place_words(graph, result, found)}. {sum_words(found)}"
    return Page(
        "terms",
        f"{count(k, 'feeder')} and what it has of itself sum to the score",
        Listing(head, len(order), feeder),
        words=lambda row: about,
        empty="nothing gives score to it, and it has none of itself",
    )


def amount_format(values: Floats) -> ScoreFormat:
    """Digits for a column of amounts, which have no bound of their own."""
    sized = np.abs(values)
    form = score_format(sized, Bound(BoundKind.NONE, float("nan")))
    if bool((values < 0).any()):
        form = ScoreFormat(form.exponent, form.decimals, form.whole, form.width + 1, form.steep)
    return form


def score_text(result: Result, node: int) -> str:
    """A score with the digits its own error justifies."""
    value, reach = np.array([result.scores[node]]), interval_reach(result)[node]
    return score_texts(value, value - reach, value + reach)[0]


def place_words(graph: Graph, result: Result, found: Why) -> str:
    """Rank and score of the node, and what part of it comes from where."""
    rank = rank_range(*result.standing.range_of(found.node))
    words = f"rank {rank} of {graph.n:,}, score {score_text(result, found.node)}"
    if found.score > 0:
        parts = [("feeders", float(found.amount.sum())), *found.parts.items()]
        told = [f"{name} {part / found.score:.1%}" for name, part in parts if part]
        words += f": {', '.join(told)}"
    return words


def sum_words(found: Why) -> str:
    """How nearly the terms sum to the score, and how nearly they must."""
    if not np.isfinite(found.allowed):
        return f"The terms sum to the score but for {found.gap:.1e}; the scores have no bound"
    return (
        f"The terms sum to the score but for {found.gap:.1e}; the error bound allows "
        f"{small(found.allowed)}"
    )


def _paths_page(graph: Graph, found: Why) -> Page:
    paths = found.paths or ()
    ways = [" > ".join(graph.name(node, 60) for node in path.nodes) for path in paths]
    head = [
        Column("share", "share", 6, lambda at: f"{paths[at].share:.1%}", right=True, frozen=True),
        Column("steps", "steps", 5, lambda at: str(len(paths[at].nodes) - 1), right=True),
        Column("path", "from the far end", max(map(len, ways), default=20), lambda at: ways[at]),
    ]
    empty = "no path of two steps or more carries enough"
    if found.paths is None:
        empty = "negative terms leave shares of a path without meaning"
    return Page(
        "supply paths",
        "how supply comes to it; share of its score that flows all along",
        Listing(head, len(paths), lambda at: paths[at].nodes[0]),
        words=lambda row: f"{paths[row].share:.1%} of its score comes by {ways[row]}",
        empty=empty,
    )


# ---- against another ---------------------------------------------------------------------------


def than_answer(
    graph: Graph, result: Result, first: int, second: int, watch: Watch | None = None
) -> Answer:
    """Pages: the difference of two nodes term by term, and in words; run it in a job.

    Raises:
        SettingsError: for a measure whose scores are no sums of known terms.
        Interrupted: if ``watch`` was cancelled.
    """
    found = than(graph, result, first, second, watch)
    sentence = than_sentence(graph, result, found)
    a, b = (graph.name(node, 40) for node in (first, second))
    places = [(graph.name(one.node, 40), place_words(graph, result, one)) for one in _both(found)]
    sums = [("", f"{sum_words(one)}") for one in _both(found)]
    words = [("in a sentence", sentence), *places, *sums]
    page = _difference_page(graph, found, a, b, sentence)
    return Answer(f"{a} against {b}, {result.measure}", (page, said("in words", "in words", words)))


def _both(found: Difference) -> tuple[Why, Why]:
    return found.first, found.second


def _difference_page(graph: Graph, found: Difference, a: str, b: str, sentence: str) -> Page:
    terms = found.terms
    values = np.array([[t.first, t.second, t.difference] for t in terms]).reshape(-1, 3)
    form = amount_format(values.ravel())

    def name(term: Term) -> str:
        return graph.name(term.node, _NAME) if term.node >= 0 else f"({PARTS[term.name]})"

    def amount(key: str, title: str, side: int) -> Column:
        width = max(form.width, min(len(title), 14), 8)
        return Column(key, title, width, lambda at: form.text(float(values[at, side])), right=True)

    names = [name(term) for term in terms[:_SAMPLE]]
    lead = f"more for {a if found.lead >= 0 else b}"
    sign = 1.0 if found.lead >= 0 else -1.0
    head = [
        Column(
            "name", "what gives", names_width(names, 10, 20), lambda at: name(terms[at]),
            frozen=True, stretch=names_width(names, 10, 48),
        ),
        amount("first", f"to {a}", 0),
        amount("second", f"to {b}", 1),
        Column(
            "difference", "difference", max(form.width + 1, 10),
            lambda at: form.text(float(sign * values[at, 2])), right=True,
        ),
        Column(
            "lead", "of lead", 7,
            lambda at: f"{values[at, 2] / found.lead:.0%}" if found.lead else "-", right=True,
        ),
    ]  # fmt: skip
    unit = f", amounts in{form.unit}" if form.exponent else ""
    return Page(
        "term by term",
        f"difference: {lead}{unit}",
        Listing(head, len(terms), lambda at: terms[at].node),
        words=lambda row: sentence,
        empty="neither has any term",
    )
