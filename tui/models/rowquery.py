"""The columns a condition over the standings may speak of, and the rows it keeps."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.insight.predicate import matching
from kingpost.core.watch import Watch

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

Make = Callable[[], Any]


def columns(graph: Graph, result: Result, others: Sequence[Result] = ()) -> dict[str, Make]:
    """Name -> maker of an Arrow array with one value a node, in the graph's numbering.

    ``node``; ``rank`` (the best it may have) and ``score`` of the measure shown; the same of
    every answer under its measure's name; degrees; attributes under their own names, with
    ``attribute_`` before those that are taken.
    """
    import pyarrow as pa

    def ranks(of: Result) -> Make:
        standing = of.standing
        return lambda: pa.array(np.take(standing.first, standing.position))

    def scores(of: Result) -> Make:
        return lambda: pa.array(of.scores)

    made: dict[str, Make] = {"node": lambda: graph.labels}
    made["rank"], made["score"] = ranks(result), scores(result)
    for each in (result, *others):
        if each.refusal is None:
            made[f"{each.measure}_rank"] = ranks(each)
            made[f"{each.measure}_score"] = scores(each)
    sides = {"in_degree": graph.inward, "out_degree": graph.outward}
    if not graph.directed:
        sides = {"degree": graph.outward}
    for name, side in sides.items():
        made[name] = lambda side=side: pa.array(side.degrees)  # type: ignore[misc]
    taken = {name.lower() for name in made}
    table = graph.attributes
    for name in table.column_names if table is not None else ():
        free = name
        while free.lower() in taken:
            free = f"attribute_{free}"
        taken.add(free.lower())
        made[free] = lambda name=name: table.column(name)  # type: ignore[misc, union-attr]
    return made


def kept(
    graph: Graph,
    result: Result,
    others: Sequence[Result],
    where: str,
    watch: Watch | None = None,
) -> NDArray[np.bool_]:
    """Which nodes a condition keeps, shape (n,); run it in a job.

    Raises:
        SettingsError: in one sentence, if the condition cannot be used.
        Interrupted: if ``watch`` was cancelled.
    """
    known = columns(graph, result, others)
    try:
        rows = matching(known, graph.n, where, watch)
    except SettingsError as trouble:
        raise SettingsError(trouble.sentence + _advice(trouble.sentence, where)) from trouble
    mask = np.zeros(graph.n, dtype=bool)
    for start in range(0, len(rows), 100_000):
        mask[rows[start : start + 100_000]] = True
    return mask


def _advice(sentence: str, where: str) -> str:
    """A name typed where a condition is wanted; a measure that is not solved."""
    unsolved = re.search(r"names column '(\w+)_(?:rank|score)'", sentence)
    if unsolved:
        from kingpost.core.measures import NAMES

        if unsolved[1] in NAMES:
            return f" ({unsolved[1]} is not solved yet: m solves it)"
    word = where.strip()
    if re.fullmatch(r"[\w-]+", word) and "names column" in sentence:
        return f" (for names: node like '%{word}%')"
    return ""
