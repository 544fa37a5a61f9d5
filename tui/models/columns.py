"""Columns of the standings: what stands in each, how wide, and what it sorts by."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray
from rich.cells import cell_len

from kingpost.core.text import id_text, visible
from kingpost.tui.models.drawing import tame
from kingpost.tui.models.numbers import rank_range, score_format

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result

_WIDEST_NAME = 48
_WIDEST_ATTRIBUTE = 18
_SAMPLE = 400


@dataclass(frozen=True)
class Column:
    """One column of a row-window table.

    ``text(item)`` gives the cell of a row's item, unpadded and safe to show; ``keys()`` the
    values it sorts by, one per node, or None where it cannot sort.  A ``frozen`` column stays
    when the others scroll sideways; ``stretch`` is the width it may grow to.
    """

    key: str
    title: str
    width: int
    text: Callable[[int], str]
    right: bool = False
    frozen: bool = False
    stretch: int = 0
    style: str = "plain"
    high_first: bool = False
    keys: Callable[[], NDArray[Any]] | None = None
    optional: bool = False  # not shown unless it is chosen


def rank_column(result: Result) -> Column:
    """Rank, as a range where tied or not proven."""
    standing = result.standing
    n = len(standing.order)
    digits = len(f"{max(n, 1):,}")
    width = max(4, min(digits * 2 + 1, 11))
    refused = result.refusal is not None

    def text(node: int) -> str:
        return "-" if refused else rank_range(*standing.range_of(node), width)

    return Column(
        "rank", "rank", width, text, right=True, frozen=True, keys=lambda: standing.position
    )


def name_column(graph: Graph, order: NDArray[np.int64]) -> Column:
    """The node's id, made safe; wide enough for the first few hundred rows and a sample."""
    n = graph.n
    some = np.concatenate((order[:_SAMPLE], np.arange(0, n, max(1, n // _SAMPLE))[:_SAMPLE]))
    longest = max((cell_len(tame(graph.name(int(i), _WIDEST_NAME))) for i in some), default=4)
    width = min(max(longest, 6), 24)
    return Column(
        "node",
        "node",
        width,
        lambda node: graph.name(node, 4 * _WIDEST_NAME),
        frozen=True,
        stretch=min(max(longest, width), _WIDEST_NAME),
        # Nodes are numbered in the order of their ids.
        keys=lambda: np.arange(n),
    )


def score_column(result: Result) -> Column:
    """The score, with as many decimals as the bound justifies."""
    form = score_format(result.scores, result.bound)
    title = result.measure + form.unit
    return Column(
        "score",
        title,
        max(form.width, len(title)),
        lambda node: form.text(float(result.scores[node])),
        right=True,
        high_first=True,
        keys=lambda: result.scores,
    )


def other_rank_column(result: Result) -> Column:
    """The rank a node has in another measure."""
    standing = result.standing
    digits = len(f"{max(len(standing.order), 1):,}")
    width = max(5, min(digits * 2 + 1, 11))
    title = result.measure if len(result.measure) <= max(width, 6) else result.measure[:5]
    return Column(
        f"rank:{result.measure}",
        title,
        max(len(title), width),
        lambda node: rank_range(*standing.range_of(node), width),
        right=True,
        keys=lambda: standing.position,
    )


def other_score_column(result: Result) -> Column:
    """The score a node has in another measure; shown where it is chosen."""
    form = score_format(result.scores, result.bound)
    title = f"{result.measure} score{form.unit}"
    return Column(
        f"score:{result.measure}",
        title,
        max(form.width, len(title)),
        lambda node: form.text(float(result.scores[node])),
        right=True,
        high_first=True,
        keys=lambda: result.scores,
        optional=True,
    )


def degree_columns(graph: Graph) -> list[Column]:
    """Numbers of in- and out-neighbours; one column where the graph is undirected."""
    sides = [("in", graph.inward), ("out", graph.outward)]
    if not graph.directed:
        sides = [("degree", graph.outward)]
    return [_count_column(title, side.degrees) for title, side in sides]


def _count_column(title: str, counts: NDArray[np.int64]) -> Column:
    widest = len(f"{int(counts.max()) if len(counts) else 0:,}")
    return Column(
        title,
        title,
        max(len(title), widest),
        lambda node: f"{int(counts[node]):,}",
        right=True,
        high_first=True,
        keys=lambda: counts,
    )


def attribute_columns(graph: Graph) -> list[Column]:
    """One column per attribute of the nodes table."""
    if graph.attributes is None:
        return []
    return [
        _attribute_column(name, graph.attributes.column(name), graph.n)
        for name in graph.attributes.column_names
    ]


def attribute_text(value: Any, limit: int = 4 * _WIDEST_ATTRIBUTE) -> str:
    """An attribute's value, safe to show; a number with few digits; nothing for null."""
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, int) and not isinstance(value, bool):
        return str(value)  # years and codes are integers too: no thousands separators
    return visible(id_text(value), limit)


def _attribute_column(name: str, values: Any, n: int) -> Column:
    import pyarrow as pa

    title = visible(name, _WIDEST_ATTRIBUTE)
    kind = values.type
    number = pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_decimal(kind)
    some = values.slice(0, _SAMPLE).to_pylist()
    longest = max((cell_len(tame(attribute_text(value))) for value in some), default=1)
    return Column(
        f"attribute:{name}",
        title,
        min(max(longest, cell_len(tame(title)), 1), _WIDEST_ATTRIBUTE),
        lambda node: attribute_text(values[node].as_py()),
        right=number,
        high_first=number,
        keys=lambda: attribute_keys(values),
    )


def attribute_keys(values: Any) -> NDArray[Any]:
    """Numbers that sort as the values do; nulls as NaN, which sorts last either way."""
    import pyarrow as pa
    import pyarrow.compute as pc

    kind = values.type
    if pa.types.is_dictionary(kind):
        values = pc.cast(values, kind.value_type)
        kind = values.type
    if pa.types.is_nested(kind):
        values = pa.chunked_array([pa.array([str(v) for v in values.to_pylist()])])
        kind = values.type
    if pa.types.is_integer(kind) or pa.types.is_boolean(kind):
        if values.null_count == 0:
            return np.asarray(pc.cast(values, pa.int64(), safe=False).to_numpy())
        return np.asarray(pc.cast(values, pa.float64(), safe=False).to_numpy())
    if pa.types.is_floating(kind):
        return np.asarray(pc.cast(values, pa.float64()).to_numpy())
    ranks = pc.rank(values, sort_keys="ascending", tiebreaker="dense")
    keys = np.asarray(ranks.to_numpy()).astype(np.float64)
    if values.null_count:
        keys[np.asarray(pc.is_null(values).to_numpy(), dtype=bool)] = np.nan
    return keys
