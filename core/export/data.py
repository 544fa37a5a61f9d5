"""A ranking as data: csv, tsv, json and parquet, exact to the last bit and written in batches."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Iterator
from typing import Any, BinaryIO

import pyarrow as pa

from kingpost.core.export.formulas import Plain
from kingpost.core.export.json_rows import row_texts
from kingpost.core.export.jsonable import dumps, jsonable
from kingpost.core.export.rows import Ranking, as_plain, batches, schema, shown
from kingpost.core.watch import Watch


def facts(ranking: Ranking) -> dict[str, Any]:
    """Everything about a ranking but its rows, ready for JSON.

    Keys: ``input, graph, account, measure, settings, conventions, solve``.  ``error_bound`` is
    null where no bound is known.
    """
    graph, result = ranking.graph, ranking.result
    return {
        "input": jsonable(dataclasses.asdict(graph.origin)),
        "graph": {
            "name": graph.origin.name,
            "nodes": graph.n,
            "edges": graph.m,
            "directed": graph.directed,
            "weighted": graph.weighted,
            "self_loops": graph.loop_count,
        },
        "account": jsonable(dataclasses.asdict(graph.account)),
        "measure": result.measure,
        "settings": settings(result.settings),
        "conventions": jsonable(ranking.conventions),
        "solve": {
            "stop": result.stop.value,
            "sweeps": result.sweeps,
            "edge_visits": result.edge_visits,
            "error_bound": jsonable(float(result.bound.value)),
            "bound_kind": result.bound.kind.value,
            "proven_order": ranking.standing.proven,
            "seconds": jsonable(dataclasses.asdict(result.seconds)),
            "from_store_solved_on": result.solved_on,
        },
    }


def settings(chosen: Any) -> dict[str, Any]:
    """A measure's settings by name, ready for JSON; long vectors by their length."""
    return {item.name: jsonable(getattr(chosen, item.name)) for item in dataclasses.fields(chosen)}


def write_json(
    ranking: Ranking, sink: BinaryIO, watch: Watch | None = None, *, ascii_only: bool = False
) -> None:
    """One object with the keys of :func:`facts` and ``rows``, one row a line."""
    head = dumps(facts(ranking), indent=2, ascii_only=ascii_only)
    sink.write((head.removesuffix("\n}") + ',\n  "rows": [').encode())
    between = "\n    "
    for batch in _watched(ranking, watch):
        sink.write((between + ",\n    ".join(row_texts(batch, ascii_only))).encode())
        between = ",\n    "
    sink.write(b"\n  ]\n}\n" if ranking.count else b"]\n}\n")


def write_delimited(
    ranking: Ranking,
    sink: BinaryIO,
    watch: Watch | None = None,
    *,
    delimiter: str = ",",
    safe: bool = False,
    formulas: Plain | None = None,
) -> None:
    """RFC 4180 text in UTF-8: a line of names, then the rows; lines end in a line feed.

    Text is always quoted, numbers and nulls never, so that an empty text and a null differ.
    ``safe`` writes control characters out, for a terminal; ``formulas`` makes text plain that a
    spreadsheet would run; without them text is exact.
    """
    from pyarrow import csv

    fields = list(schema(ranking.graph, ranking.within is not None))
    names = [field.name for field in fields]
    plain = pa.schema(
        [
            (name, as_plain(pa.array([], field.type)).type)
            for name, field in zip(
                names if formulas is None else formulas.names(names), fields, strict=True
            )
        ]
    )
    sink.write(csv_bytes(plain.empty_table(), csv.WriteOptions(delimiter=delimiter)))
    body = csv.WriteOptions(delimiter=delimiter, include_header=False)
    for batch in _watched(ranking, watch):
        batch = _plain(batch)
        if safe:
            batch = each_column(batch, shown)
        if formulas is not None:
            batch = each_column(batch, formulas)
        sink.write(csv_bytes(pa.Table.from_batches([batch]), body))


def csv_bytes(table: pa.Table, options: Any) -> memoryview:
    """A table as delimited text."""
    from pyarrow import csv

    # Through memory: Arrow would hide a broken pipe or a full disk behind errors of its own.
    buffer = pa.BufferOutputStream()
    csv.write_csv(table, buffer, options)
    return memoryview(buffer.getvalue())


def write_parquet(ranking: Ranking, sink: BinaryIO, watch: Watch | None = None) -> None:
    """The rows as Parquet; the file's metadata holds :func:`facts` as JSON under ``kingpost``."""
    import pyarrow.parquet as pq

    columns = schema(ranking.graph, ranking.within is not None)
    columns = columns.with_metadata({"kingpost": dumps(facts(ranking))})
    with pq.ParquetWriter(ForwardOnly(sink), columns, compression="zstd") as writer:
        for batch in _watched(ranking, watch):
            writer.write_batch(batch.replace_schema_metadata(columns.metadata))


class ForwardOnly:
    """A binary file for Arrow that is only ever written forwards, so that a pipe will do."""

    closed = False

    def __init__(self, sink: BinaryIO) -> None:
        self._sink, self._at = sink, 0

    def write(self, data: Any) -> int:
        view = memoryview(data)
        self._sink.write(view)
        self._at += view.nbytes
        return view.nbytes

    def tell(self) -> int:
        return self._at

    def flush(self) -> None:
        self._sink.flush()

    def close(self) -> None:
        self._sink.flush()

    def readable(self) -> bool:
        return False

    def writable(self) -> bool:
        return True

    def seekable(self) -> bool:
        return False


def _watched(ranking: Ranking, watch: Watch | None) -> Iterator[pa.RecordBatch]:
    done = 0
    for batch in batches(ranking):
        if watch is not None:
            watch.report("writing", done, ranking.count, "rows")
        yield batch
        done += len(batch)


def _plain(batch: pa.RecordBatch) -> pa.RecordBatch:
    return each_column(batch, as_plain)


def each_column(batch: pa.RecordBatch, change: Callable[[pa.Array], pa.Array]) -> pa.RecordBatch:
    """A batch with ``change`` applied to every column."""
    return pa.RecordBatch.from_arrays(list(map(change, batch.columns)), names=batch.schema.names)
