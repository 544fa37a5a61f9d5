"""Scores that somebody else computed: a table of ids and numbers, matched to a graph."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.graph import Floats, Graph
from kingpost.core.ingest import nodes
from kingpost.core.ingest.columns import is_numeric, require_column
from kingpost.core.ingest.parts import columns_listed
from kingpost.core.ingest.rows import to_floats
from kingpost.core.text import count, id_text, visible

_RANK_WORDS = ("rank", "position", "place", "order", "percentile", "quantile")
_NOT_SCORES = ("in_degree", "out_degree", "index", "unnamed: 0", "bound", "error")
_SCORE_WORDS = ("score", "scores", "value", "centrality", "pagerank", "rating", "weight")
_SAMPLE = 100_000


@dataclass(frozen=True)
class Rounding:
    """How the numbers were rounded: to ``decimals`` places, to ``digits`` significant digits or
    as ``single`` precision floats; nothing of it where they are full doubles."""

    decimals: int | None = None
    digits: int | None = None
    single: bool = False

    def reach(self, values: Floats) -> Floats:
        """The most each number may differ from the one that was rounded, shape of ``values``."""
        size = np.abs(values)
        reach = size * 2.0**-52
        if self.decimals is not None:
            reach = reach + 0.5 * 10.0**-self.decimals
        elif self.digits is not None:
            with np.errstate(divide="ignore"):
                magnitude = np.floor(np.log10(np.where(size > 0, size, 1.0)))
            reach = reach + np.where(size > 0, 0.5 * 10.0 ** (magnitude - self.digits + 1), 0.0)
        elif self.single:
            reach = reach + size * 2.0**-24 + 2.0**-150
        return reach

    @property
    def words(self) -> str:
        """In a few words."""
        if self.decimals is not None:
            return f"rounded to {count(self.decimals, 'decimal')}"
        if self.digits is not None:
            return f"rounded to {count(self.digits, 'significant digit')}"
        return "single precision" if self.single else "double precision"


@dataclass(frozen=True)
class Foreign:
    """Scores from elsewhere, in a graph's numbering.

    Attributes:
        scores: shape (n,), NaN for a node without one.
        whole: every score of the file, nodes the graph does not hold included.
        name, column: where they come from.
        rows, missing, extra, repeated, empty: rows of the file; nodes of the graph without a
            score; rows of ids the graph does not hold; further rows that repeat an id with
            the same score; rows whose score is null or NaN.
        examples: a few ids of ``missing`` and of ``extra``, safe to show.
        rounding: what the digits say.
    """

    scores: Floats
    whole: Floats
    name: str
    column: str
    rows: int
    missing: int
    extra: int
    repeated: int
    empty: int
    examples: dict[str, tuple[str, ...]]
    rounding: Rounding

    @property
    def known(self) -> NDArray[np.bool_]:
        """Which nodes have a score, shape (n,)."""
        return np.isfinite(self.scores)


def read_scores(
    path: str | os.PathLike[str],
    graph: Graph,
    node_column: str | None = None,
    score_column: str | None = None,
) -> Foreign:
    """Scores from a Parquet, CSV or TSV file with one row a node.

    Raises:
        InputError: for an unusable file or column, ranks instead of scores, an infinite score,
            one id with two scores, or a file that names no node of the graph.
    """
    name = os.fspath(path)
    schema = nodes._schema(name)
    for column in (node_column, score_column):
        if column is not None:
            require_column(schema, column, name)
    if score_column is not None and not is_numeric(schema.field(score_column).type):
        kind = schema.field(score_column).type
        raise InputError(f"column {score_column!r} of {name} is of type {kind}; scores are numbers")
    ids = node_column or nodes.guess_id(name, schema, graph.labels, exclude=score_column)
    column = score_column or _guess_score(name, schema, ids)
    table = nodes._read(name, schema, ids, graph.labels.type).select([ids, column])
    numbers, nulls = to_floats(nodes._single(table.column(column)))
    numbers = numbers.copy()
    if nulls is not None:
        numbers[nulls] = np.nan
    if np.isinf(numbers).any():
        row = int(np.flatnonzero(np.isinf(numbers))[0])
        raise InputError(f"column {column!r} of {name} holds an infinite score in row {row + 1:,}")
    at = nodes._positions(table.column(ids), graph.labels, ids, name)
    return _matched(graph, name, column, table.column(ids), at, numbers, schema.field(column).type)


def of_values(graph: Graph, values: Floats, name: str = "scores") -> Foreign:
    """Scores in the graph's own numbering, shape (n,); NaN where there is none.

    Raises:
        InputError: for another shape, infinite scores, or ranks.
    """
    numbers = np.array(values, dtype=np.float64)
    if numbers.shape != (graph.n,):
        raise InputError(
            f"{name} has shape {numbers.shape}; it takes one number for each node ({graph.n:,})"
        )
    if np.isinf(numbers).any():
        raise InputError(f"{name} holds an infinite score")
    kind = pa.float32() if np.asarray(values).dtype == np.float32 else pa.float64()
    at = np.arange(graph.n)
    return _matched(graph, name, "score", graph.labels, at, numbers, kind)


def _matched(
    graph: Graph,
    name: str,
    column: str,
    ids: pa.Array | pa.ChunkedArray,
    at: NDArray[np.int64],
    numbers: Floats,
    kind: pa.DataType,
) -> Foreign:
    given = np.isfinite(numbers)
    unknown = np.flatnonzero(at < 0)
    hit = np.flatnonzero((at >= 0) & given)
    if len(hit) == 0:
        raise InputError(
            f"{name} holds a score for none of the {graph.n:,} nodes: its ids are called like "
            f"{_names(ids, unknown)}, those of the table like {_names(graph.labels, range(3))}"
        )
    scores = np.full(graph.n, np.nan)
    scores[at[hit[::-1]]] = numbers[hit[::-1]]  # the first row of an id is written last
    differs = np.flatnonzero(scores[at[hit]] != numbers[hit])
    if len(differs):
        who = _names(ids, hit[differs[:1]])
        raise InputError(f"{name} gives {who} two different scores; keep one row a node")
    _refuse_ranks(numbers[given], name, column)
    missing = np.flatnonzero(~np.isfinite(scores))
    return Foreign(
        scores,
        numbers[given],
        name,
        column,
        rows=len(numbers),
        missing=len(missing),
        extra=len(unknown),
        repeated=len(hit) - int(np.isfinite(scores).sum()),
        empty=int(np.count_nonzero(~given)),
        examples={
            "missing": tuple(graph.name(int(node), 40) for node in missing[:3]),
            "extra": tuple(_names(ids, [row]) for row in unknown[:3]),
        },
        rounding=rounding_of(numbers[given], kind),
    )


def _names(ids: pa.Array | pa.ChunkedArray, rows: object) -> str:
    picked = [int(row) for row in rows if int(row) < len(ids)][:3]  # type: ignore[attr-defined]
    texts = [visible(id_text(ids[row].as_py()), 40) for row in picked if ids[row].is_valid]
    return ", ".join(texts) or "null"


def _guess_score(name: str, schema: pa.Schema, ids: str) -> str:
    numeric = [item.name for item in schema if item.name != ids and is_numeric(item.type)]
    ranks = [n for n in numeric if set(re.split(r"[^a-z]+", n.lower())) & set(_RANK_WORDS)]
    scores = [n for n in numeric if n not in ranks and n.lower() not in _NOT_SCORES]
    if ranks and not scores:
        raise InputError(
            f"{name} holds ranks ({', '.join(map(visible, ranks))}) and no scores; an order alone "
            "does not tell which equation it solves: export the scores too"
        )
    named = [n for word in _SCORE_WORDS for n in scores if n.lower() == word]
    if named or len(scores) == 1:
        return str(named[0] if named else scores[0])
    raise InputError(
        f"it is not clear which column of {name} holds the scores; name it with --score-column; "
        f"its columns are {columns_listed(schema)}"
    )


def _refuse_ranks(values: Floats, name: str, column: str) -> None:
    """An order is no score: 1, 2, 3, ... with ties sharing the first of their ranks."""
    if len(values) < 4 or values.min() != 1 or (values != np.rint(values)).any():
        return
    ordered = np.sort(values)
    if np.array_equal(ordered, 1.0 + np.searchsorted(ordered, ordered)):
        raise InputError(
            f"column {column!r} of {name} holds the ranks 1 to {ordered[-1]:,.0f} and no scores; "
            "an order alone does not tell which equation it solves: export the scores too"
        )


def rounding_of(values: Floats, kind: pa.DataType | None = None) -> Rounding:
    """What the digits of some numbers say about how they were rounded."""
    some = values[values != 0][:_SAMPLE]
    if len(some) == 0 or (some == np.rint(some)).all():
        return Rounding()  # whole numbers: counts, or nothing to be told
    for decimals in range(1, 13):
        if (np.round(some, decimals) == some).all():
            return Rounding(decimals=decimals)
    small = some[:2000]
    for digits in range(2, 13):
        if all(float(f"{value:.{digits - 1}e}") == value for value in small.tolist()):
            return Rounding(digits=digits)
    single = kind is not None and pa.types.is_float32(kind)
    single = single or bool((some.astype(np.float32).astype(np.float64) == some).all())
    return Rounding(single=single)
