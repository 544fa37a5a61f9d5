"""A ranking as Arrow columns, in batches, so that five million rows need no loop in Python."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from kingpost.core.export.jsonable import dumps
from kingpost.core.graph import Graph
from kingpost.core.result import Result
from kingpost.core.standing import Standing
from kingpost.core.text import id_text, visible

if TYPE_CHECKING:
    from kingpost.core.insight.cohorts import Cohorts

FIXED = ("rank", "rank_low", "rank_high", "node", "score", "in_degree", "out_degree")
# Further columns where scores are rescaled among peers.
WITHIN = (
    "peers",
    "rank_within_low",
    "rank_within_high",
    "rescaled",
    "rescaled_low",
    "rescaled_high",
)
BATCH = 65_536


@dataclass(frozen=True)
class Ranking:
    """What an export is made from: a graph, a result, how many rows, remarks for the header.

    ``top`` is a number of rows or None for all; ``remarks`` adds to the result's conventions
    what only the caller knows, such as which file a vector came from.  With ``within`` the rows
    stand in the order of the scores rescaled among peers, and the ranks are those.
    """

    graph: Graph
    result: Result
    top: int | None = None
    remarks: dict[str, str] = field(default_factory=dict)
    within: Cohorts | None = None

    @property
    def standing(self) -> Standing:
        """The order of the rows."""
        return self.result.standing if self.within is None else self.within.standing

    @property
    def count(self) -> int:
        """Number of rows."""
        return self.graph.n if self.top is None else min(self.top, self.graph.n)

    @property
    def conventions(self) -> dict[str, str]:
        """The result's conventions and the caller's remarks."""
        within = {} if self.within is None else {"cohorts": self.within.words}
        return {**self.result.conventions, **within, **self.remarks}


def attribute_names(graph: Graph) -> list[str]:
    """Output names of the node attributes; one that meets a fixed column gets ``_attribute``."""
    taken = {*FIXED, *WITHIN}
    names = []
    for name in [] if graph.attributes is None else graph.attributes.column_names:
        while name in taken:
            name += "_attribute"
        taken.add(name)
        names.append(name)
    return names


def attributes(graph: Graph) -> pa.Table | None:
    """The node attributes under their output names, in common types; None without any."""
    if graph.attributes is None or graph.attributes.num_columns == 0:
        return None
    columns = [_common(column) for column in graph.attributes.columns]
    return pa.table(columns, names=attribute_names(graph)).combine_chunks()


def _common(column: pa.ChunkedArray) -> pa.ChunkedArray:
    """A column without dictionaries and views, which not every reader and kernel takes."""
    kind = column.type
    if pa.types.is_dictionary(kind):
        return _common(pc.cast(column, kind.value_type))
    if pa.types.is_string_view(kind):
        return pc.cast(column, pa.large_string())
    if pa.types.is_binary_view(kind):
        return pc.cast(column, pa.large_binary())
    return column


def schema(graph: Graph, within: bool = False) -> pa.Schema:
    """Columns of an export; the node keeps the type its ids had in the edge table."""
    types = [pa.int64(), pa.int64(), pa.int64(), graph.labels.type, pa.float64()]
    fields = list(zip(FIXED, [*types, pa.int64(), pa.int64()], strict=True))
    if within:
        whole, real = pa.int64(), pa.float64()
        fields += list(zip(WITHIN, [whole, whole, whole, real, real, real], strict=True))
    extra = attributes(graph)
    return pa.schema(fields + ([] if extra is None else list(extra.schema)))


def batches(ranking: Ranking, size: int = BATCH) -> Iterator[pa.RecordBatch]:
    """The rows of a ranking from the highest, ``size`` at a time, with :func:`schema`.

    ``rank`` is the position 1..n, equal scores in the order of their ids; ``rank_low`` and
    ``rank_high`` are the ranks the node may truly have.
    """
    graph, result = ranking.graph, ranking.result
    standing, within = ranking.standing, ranking.within
    columns, extra = schema(graph, within is not None), attributes(graph)
    for start in range(0, ranking.count, size):
        part = slice(start, min(start + size, ranking.count))
        nodes = standing.order[part]
        arrays = [
            pa.array(np.arange(part.start + 1, part.stop + 1)),
            pa.array(standing.first[part]),
            pa.array(standing.last[part]),
            graph.labels.take(pa.array(nodes)),
            pa.array(result.scores[nodes]),
            pa.array(degrees(graph.inward.offsets, nodes)),
            pa.array(degrees(graph.outward.offsets, nodes)),
        ]
        if within is not None:
            arrays += _among_peers(within, nodes)
        if extra is not None:
            picked = extra.take(pa.array(nodes)).combine_chunks()
            arrays += [single(column) for column in picked.columns]
        yield pa.RecordBatch.from_arrays(arrays, schema=columns)


def _among_peers(within: Cohorts, nodes: Any) -> list[pa.Array]:
    lost = np.isnan(within.scores[nodes])
    found = [pa.array(within.peers[nodes])]
    for ranks in (within.first, within.last):
        found.append(pa.array(ranks[nodes], mask=ranks[nodes] < 0))
    for values in (within.scores, within.low, within.high):
        found.append(pa.array(values[nodes], mask=lost | ~np.isfinite(values[nodes])))
    return found


def degrees(offsets: Any, nodes: Any) -> Any:
    """Number of neighbours of some nodes, from the offsets of an adjacency."""
    return offsets[nodes + 1] - offsets[nodes]


def single(column: Any) -> pa.Array:
    """A chunked column of few rows as one array."""
    chunks = column.chunks
    if len(chunks) == 1:
        return chunks[0]
    return pa.concat_arrays(chunks) if chunks else pa.array([], column.type)


def as_plain(column: pa.Array) -> pa.Array:
    """A column in types that text formats can hold.

    Numbers, booleans and text stay; instants become ISO 8601 text, spans of time seconds,
    decimals and dates text, bytes what :func:`id_text` makes of them, nested values JSON.
    """
    kind = column.type
    is_ = pa.types
    if is_.is_dictionary(kind):
        return as_plain(pc.cast(column, kind.value_type))
    if is_.is_timestamp(kind):
        return pc.replace_substring(pc.cast(column, pa.string()), " ", "T", max_replacements=1)
    if is_.is_date(kind) or is_.is_time(kind):
        return pc.cast(column, pa.large_string())
    if is_.is_duration(kind):
        ticks = pc.cast(pc.cast(column, pa.int64()), pa.float64(), safe=False)
        return pc.divide(ticks, {"s": 1.0, "ms": 1e3, "us": 1e6, "ns": 1e9}[kind.unit])
    if is_.is_float16(kind):
        return pc.cast(column, pa.float32())
    if (
        is_.is_integer(kind)
        or is_.is_floating(kind)
        or is_.is_boolean(kind)
        or is_.is_string(kind)
        or is_.is_large_string(kind)
        or is_.is_null(kind)
    ):
        return column
    if is_.is_nested(kind):
        texts = [None if value is None else dumps(value) for value in column.to_pylist()]
    else:
        texts = [None if value is None else id_text(value) for value in column.to_pylist()]
    return pa.array(texts, pa.large_string())


def shown(column: pa.Array) -> pa.Array:
    """A plain column with its text made safe for a terminal."""
    if not (pa.types.is_string(column.type) or pa.types.is_large_string(column.type)):
        return column
    texts = [None if value is None else visible(value) for value in column.to_pylist()]
    return pa.array(texts, pa.large_string())
