"""What the loss of a node would do, before and after; and that of each of the first nodes."""

from __future__ import annotations

from collections.abc import Callable

from kingpost.core.export.answer import CAUTION
from kingpost.core.export.trial_answer import STRUCTURE, loss_words, moved_words
from kingpost.core.graph import Graph
from kingpost.core.insight.drift import FALLEN, RISEN, SAME
from kingpost.core.insight.edit import Ints, edit_of
from kingpost.core.insight.loss import Loss, Ways, losses, ways
from kingpost.core.insight.trial import Trial, trial
from kingpost.core.result import Result
from kingpost.core.text import count
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import Answer, Listing, Page, names_width, said
from kingpost.tui.models.columns import Column
from kingpost.tui.models.numbers import percent, rank_range, score_format, small

SHOWN = 200
FIRST = 10  # losses tried one by one
CAREFUL = (
    "Structure, not traffic engineering: nothing here of capacity or fallbacks. "
    "Before switching anything off follow the local change procedure."
)
_SAMPLE = 200


def loss_answer(graph: Graph, result: Result, node: int, watch: Watch | None = None) -> Answer:
    """Pages: the first nodes without it, the risen, the fallen, all in words; run it in a job.

    Raises:
        SettingsError: if the trial cannot be made, as of the only node there is.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    found = trial(graph, result, edit_of(graph, [node]), watch)
    watch.report("searching who is cut off")
    cut = ways(graph, node, watch)
    name = graph.name(node, 60)
    head = f"{result.measure} without {name}"
    words = said("in words", "what its loss would do", _sentences(graph, result, found, cut, name))
    if found.result.refusal is not None:
        return Answer(head, (words,), CAREFUL)
    about = f"{cut_words(cut, name)}. {_upper(moved_words(found))}"
    pages = [
        _moves(graph, found, found.first(SHOWN), "standings", "first without it", about),
        *(
            _moves(graph, found, found.ordered(kind, SHOWN), title, _counted(found, kind), about)
            for kind, title in ((RISEN, "risen"), (FALLEN, "fallen"))
        ),
        words,
    ]
    return Answer(head, tuple(pages), CAREFUL)


def _upper(sentence: str) -> str:
    return sentence[:1].upper() + sentence[1:]


def _counted(found: Trial, kind: int) -> str:
    many = int((found.kind == kind).sum())
    told = {RISEN: "rise", FALLEN: "fall"}[kind] + ("s" if many == 1 else "")
    shown = f"; the first {SHOWN} of them" if many > SHOWN else ""
    return f"{count(many, 'node')} {told} beyond the uncertainty{shown}"


def cut_words(cut: Ways, name: str) -> str:
    """What becomes unreachable, in a sentence."""
    words = f"{count(cut.upstream, 'node')} that reach {name} lose it"
    if cut.cut_upstream:
        words += f", {cut.cut_upstream:,} of them every way to what it leads to"
    words += f"; of {count(cut.downstream, 'node')} it leads to, "
    if cut.cut_downstream:
        return words + f"{cut.cut_downstream:,} can no longer be reached by any that reached it"
    return words + "none is cut off from those that reached it"


def _sentences(
    graph: Graph, result: Result, found: Trial, cut: Ways, name: str
) -> list[tuple[str, str]]:
    after = found.result
    rows = [("reachability", f"{cut_words(cut, name)} (by the edges of this table, exactly)")]
    if after.refusal is not None:
        rows.append(("no answer", f"{result.measure} has none then: {after.refusal.sentence}"))
    else:
        same = int((found.kind == SAME).sum())
        rows += [
            ("rank mass", moved_words(found)),
            ("risen", _counted(found, RISEN)),
            ("fallen", _counted(found, FALLEN)),
            ("the same", f"{same:,} where the ranks possible before and after overlap"),
            (
                "ranks",
                f"count the {count(len(found.nodes), 'node')} that stay: a gap that closes is no "
                "rise",
            ),
            (
                "how",
                f"{found.method}; {after.bound.kind.value} error of at most "
                f"{small(float(after.bound.value))} of the scores",
            ),
        ]
        if result.measure == "katz":
            rows.append(("alpha", "is held at what it is on the whole graph"))
    return [*rows, ("caution", STRUCTURE), ("", CAUTION.removeprefix("caution: "))]


def _moves(graph: Graph, found: Trial, places: Ints, name: str, title: str, about: str) -> Page:
    nodes = found.nodes[places]
    before, after, scores = found.before[places], found.after[places], found.scores[places]
    kinds, factor = found.kind[places], found.factor[places]
    form = score_format(found.scores[:, 1], found.result.bound)
    width = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)
    names = [graph.name(int(node), 96) for node in nodes]

    def ranks(side: Ints) -> Callable[[int], str]:
        return lambda at: rank_range(int(side[at, 0]), int(side[at, 1]), width)

    def change(at: int) -> str:
        told = {RISEN: "risen", FALLEN: "fallen"}.get(int(kinds[at]))
        return "" if told is None else f"{told} {times(float(factor[at]))}"

    def score(key: str, side: int) -> Column:
        title = key + form.unit
        return Column(
            key, title, max(form.width, len(title)),
            lambda at: form.text(float(scores[at, side])), right=True,
        )  # fmt: skip

    head = [
        Column(
            "node", "node", names_width(names[:_SAMPLE], 10, 20), lambda at: names[at],
            frozen=True, stretch=names_width(names[:_SAMPLE], 10, 48),
        ),
        Column("before", "before", max(width, 6), ranks(before), right=True),
        Column("after", "after", max(width, 6), ranks(after), right=True),
        Column("change", "change", 13, change),
        score("score was", 0),
        score("is now", 1),
    ]  # fmt: skip
    listing = Listing(head, len(places), lambda at: int(nodes[at]))
    return Page(name, title, listing, words=lambda row: about, empty="none")


def times(factor: float) -> str:
    """How many times a rank changed at least."""
    return f"{factor:,.0f}x" if factor >= 10 else f"{factor:.2f}x"


# ---- one by one ----------------------------------------------------------------------------------


def losses_answer(
    graph: Graph, result: Result, k: int = FIRST, watch: Watch | None = None
) -> Answer:
    """One page, a row for each of the first ``k`` nodes; run it in a job.

    Raises:
        SettingsError: if ``result`` is refused.
        Interrupted: if ``watch`` was cancelled.
    """
    rows = losses(graph, result, k, watch=watch)
    head = f"loss of each of the first {count(len(rows), 'node')}, one at a time, {result.measure}"
    names = [graph.name(row.node, 96) for row in rows]
    width = min(2 * len(f"{max(graph.n, 1):,}") + 1, 11)

    def counts(key: str, title: str, value: Callable[[Loss], int]) -> Column:
        texts = [f"{value(row):,}" for row in rows]
        return Column(
            key, title, max(len(title), *map(len, texts), 1), lambda at: texts[at], right=True
        )

    columns = [
        Column(
            "node", "without", names_width(names, 10, 20), lambda at: names[at],
            frozen=True, stretch=names_width(names, 10, 48),
        ),
        Column("rank", "rank", max(width, 4), lambda at: rank_range(*rows[at].rank, width),
               right=True),
        Column("share", "held", 5, lambda at: percent(rows[at].share), right=True),
        counts("upstream", "reach it", lambda row: row.ways.upstream),
        counts("cut_upstream", "cut off", lambda row: row.ways.cut_upstream),
        counts("downstream", "leads to", lambda row: row.ways.downstream),
        counts("cut_downstream", "cut off", lambda row: row.ways.cut_downstream),
        Column("moved", "moved", 5, lambda at: percent(rows[at].moved), right=True),
        counts("risen", "risen", lambda row: row.risen),
        counts("fallen", "fallen", lambda row: row.fallen),
    ]  # fmt: skip
    page = Page(
        "losses",
        "cut off: those that lose every way through it",
        Listing(columns, len(rows), lambda at: rows[at].node),
        words=lambda row: _upper(loss_words(graph, rows[row])),
        empty="a graph of fewer than two nodes has none to lose",
    )
    return Answer(head, (page,), CAREFUL)
