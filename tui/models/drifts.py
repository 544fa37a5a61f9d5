"""What has changed between this table and another: who is new, gone, risen, fallen, and why."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from kingpost.core.export.answer import CAUTION
from kingpost.core.export.drift_answer import cause_sentence
from kingpost.core.export.table import name_text
from kingpost.core.graph import Graph
from kingpost.core.insight.drift import FALLEN, GONE, KINDS, NEW, RISEN, Drift, drift
from kingpost.core.measures.base import finish
from kingpost.core.result import Result
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch
from kingpost.tui.models.answers import NOWHERE, Answer, Listing, Page, names_width, said
from kingpost.tui.models.columns import Column
from kingpost.tui.models.folders import PACK, TABLE, listed
from kingpost.tui.models.losses import times
from kingpost.tui.models.numbers import rank_range, score_format

if TYPE_CHECKING:
    from kingpost.core.measures.base import Measure

SHOWN = 500
CAUSES = 10
CHOICES = 200
_SAMPLE = 200


@dataclass(frozen=True)
class Other:
    """The table to compare with: where, how to read it, and whether it comes after this one."""

    path: str
    options: Mapping[str, Any]
    later: bool = True


def beside(paths: list[str], watch: Watch | None = None) -> list[str]:
    """Other tables in the folder of the first one, by name; run it in a job.

    Raises:
        InputError: if the folder cannot be listed.
    """
    mine = {os.path.abspath(path) for path in paths}
    found = listed(os.path.dirname(os.path.abspath(paths[0])), watch)
    tables = [found.path(entry) for entry in found.entries if entry.kind in (TABLE, PACK)
              and not entry.hidden]  # fmt: skip
    return [path for path in tables if path not in mine][:CHOICES]


def drift_answer(
    graph: Graph,
    result: Result,
    other: Other,
    chosen: Measure,
    watch: Watch | None = None,
    store: bool = True,
) -> Answer:
    """Read and solve the other table by the same rules and compare; run it in a job.

    Raises:
        KingpostError: for a table that cannot be read or compared, or has no answer.
        Interrupted: if ``watch`` was cancelled.
    """
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.open import open_graph
    from kingpost.core.store.results import solve

    watch = watch or Watch()
    second = open_graph(
        [other.path], options=LoadOptions(**other.options), watch=watch, store=store
    )
    found = finish(
        solve(chosen, second, result.settings, watch),
        lambda line: watch.report("solving the other table", line.index, None, "sweeps"),
    )
    watch.check()
    graphs, results = (graph, second), (result, found)
    if not other.later:
        graphs, results = graphs[::-1], results[::-1]
    changed = drift(*graphs, *results, causes=CAUSES, watch=watch)
    name = visible(os.path.basename(other.path.rstrip("/")), 60)
    this = visible(graph.origin.name, 60)
    head = f"drift of {result.measure} from " + (
        f"{this} to {name}" if other.later else f"{name} to {this}"
    )
    return _pages(head, changed, results, 0 if other.later else 1)


def _pages(head: str, found: Drift, results: tuple[Result, Result], mine: int) -> Answer:
    counts = found.counts()
    causes = {cause.node: cause_sentence(found, cause) for cause in found.causes}
    total = (
        f"{counts['risen']:,} risen, {counts['fallen']:,} fallen, {counts['new']:,} new, "
        f"{counts['gone']:,} gone; {counts['same']:,} the same: where the ranks possible before "
        "and after overlap there is no change"
    )
    pages = [
        _moves(found, results, kind, mine, causes, total) for kind in (RISEN, FALLEN, NEW, GONE)
    ]
    words = [("in all", total), *(("why it rose", sentence) for sentence in causes.values())]
    words.append(("caution", CAUTION.removeprefix("caution: ")))
    return Answer(head, (*pages, said("in words", "in words", words)))


def _moves(
    found: Drift,
    results: tuple[Result, Result],
    kind: int,
    mine: int,
    causes: Mapping[int, str],
    total: str,
) -> Page:
    places = found.ordered(kind, SHOWN)
    many = int((found.kind == kind).sum())
    names = [visible(name_text(found.ids.labels[int(at)].as_py()), 96) for at in places]
    here = (found.ids.before, found.ids.after)[mine]
    n = max(len(found.ids.labels), 1)
    width = min(2 * len(f"{n:,}") + 1, 11)

    def ranks(side: Any, title: str) -> Column:
        def text(at: int) -> str:
            low, high = (int(end) for end in side[places[at]])
            return "-" if low < 0 else rank_range(low, high, width)

        return Column(title, title, max(width, 6), text, right=True)

    def score(of: int, title: str) -> Column:
        form = score_format(results[of].scores, results[of].bound)
        full = title + form.unit
        return Column(
            title, full, max(form.width, len(full)),
            lambda at: form.text(float(found.scores[places[at], of])), right=True,
        )  # fmt: skip

    head = [
        Column(
            "node", "node", names_width(names[:_SAMPLE], 10, 24), lambda at: names[at],
            frozen=True, stretch=names_width(names[:_SAMPLE], 10, 48),
        ),
    ]  # fmt: skip
    if kind != NEW:
        head.append(ranks(found.before, "before"))
    if kind != GONE:
        head.append(ranks(found.after, "after"))
    if kind in (RISEN, FALLEN):
        head.append(
            Column("times", "times", 7, lambda at: times(float(found.factor[places[at]])),
                   right=True)
        )  # fmt: skip
    head += [score(side, title) for side, title in ((0, "score was"), (1, "is now"))
             if (side, kind) not in ((0, NEW), (1, GONE))]  # fmt: skip
    shown = f", the first {SHOWN:,} listed" if many > SHOWN else ""
    by = ", by how far" if kind in (RISEN, FALLEN) else ", by rank"
    told = KINDS[kind]

    def words(row: int) -> str:
        return causes.get(int(places[row]), total)

    return Page(
        told,
        f"{count(many, 'node')} {told}{by}{shown}",
        Listing(head, len(places), _nodes(here, places)),
        words=words,
        empty=f"no node is {told}",
    )


def _nodes(here: Any, places: Any) -> Callable[[int], int]:
    """The node of this table in a row; a node that is only in the other one is nowhere."""
    return lambda at: int(here[places[at]]) if here[places[at]] >= 0 else NOWHERE
