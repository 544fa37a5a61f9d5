"""The subgraph that an SQL expression over node attributes induces, before it is assembled.

Nodes for which the expression is true stay, also those that lose all their edges; an edge stays
if both its ends do.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import RowsError, SettingsError
from kingpost.core.ingest.assemble import Ends
from kingpost.core.ingest.nodes import Joined
from kingpost.core.ingest.spread import spans
from kingpost.core.ingest.sql import Expression
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch

_PIECE = 1 << 17


@dataclass(frozen=True)
class Induced:
    """What stays, and what was left out: nodes, those of unknown value, rows."""

    labels: pa.Array
    joined: Joined
    nodes: int
    unknown: int
    rows: int


def induce(text: str, labels: pa.Array, ends: Ends, joined: Joined, watch: Watch) -> Induced:
    """Cut ``ends`` down to the induced subgraph, renumbered; ``labels`` and ``joined`` too.

    The expression may name the columns of the nodes table, its id column included.

    Raises:
        SettingsError: without node attributes, or for anything but one SQL expression.
        InputError: if the expression does not go with the columns.
        RowsError: if no node is left.
    """
    if joined.attributes is None or joined.column is None:
        raise SettingsError(
            "--node-where asks for node attributes, and there are none; name a table of them "
            "with --nodes FILE"
        )
    where = joined.file or "the nodes table"
    table = joined.attributes.add_column(0, joined.column, labels)
    expression = Expression(text, "--node-where")
    table = table.select(expression.columns(table.schema, where))
    expression.bind(table.schema, where)
    keep = np.zeros(len(labels), dtype=bool)
    unknown = 0
    for start in range(0, len(labels), _PIECE):
        watch.report("filtering nodes", start, len(labels), "nodes")
        size = min(_PIECE, len(labels) - start)
        piece = _batch(table.slice(start, size), size)
        keep[start : start + size], nulls = expression.evaluate(piece, where, watch)
        unknown += nulls
    left = int(np.count_nonzero(keep))
    if left == 0:
        null = f" (for {unknown:,} of them it is neither true nor false)" if unknown else ""
        raise RowsError(
            f"--node-where {visible(text, 80)!r} is true for none of "
            f"{count(len(labels), 'node')}{null}; a graph needs at least one"
        )
    lost = _cut(ends, keep, watch)
    mask = pa.array(keep)
    return Induced(
        labels.filter(mask),
        replace(joined, attributes=joined.attributes.filter(mask).combine_chunks()),
        len(keep) - left,
        unknown,
        lost,
    )


def _batch(table: pa.Table, rows: int) -> pa.RecordBatch:
    """A slice as one batch; one without columns still has its rows."""
    if not table.num_columns:
        return pa.RecordBatch.from_struct_array(pa.array([{}] * rows, pa.struct([])))
    return table.combine_chunks().to_batches()[0]


def _cut(ends: Ends, keep: NDArray[np.bool_], watch: Watch) -> int:
    """Drop rows with an end that goes, renumber the others in place; how many were dropped."""
    numbers = (np.cumsum(keep, dtype=np.int64) - 1).astype(np.uint32)
    rows, to = len(ends.source), 0
    for a, b in spans(rows):
        watch.check()
        watch.report("keeping edges among the nodes left", a, rows, "rows")
        source, target = ends.source[a:b], ends.target[a:b]
        good = keep[source] & keep[target]
        size = int(np.count_nonzero(good))
        ends.source[to : to + size] = numbers[source[good]]
        ends.target[to : to + size] = numbers[target[good]]
        if len(ends.weights):
            ends.weights[to : to + size] = ends.weights[a:b][good]
        to += size
    ends.source, ends.target = ends.source[:to], ends.target[:to]
    ends.weights = ends.weights[:to]
    return rows - to
