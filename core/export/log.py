"""The iterations of a solve, as a file whose kind its name tells."""

from __future__ import annotations

from pathlib import PurePath
from typing import Any, BinaryIO

from kingpost.core.errors import OutputError
from kingpost.core.export.jsonable import dumps
from kingpost.core.result import Iteration, Result

KINDS = (".csv", ".json", ".parquet")


def kind_of(path: str) -> str:
    """The ending of a log's name.

    Raises:
        OutputError: if it is none of :data:`KINDS`.
    """
    ending = PurePath(path).suffix.lower()
    if ending not in KINDS:
        raise OutputError(f"the log {path} must be called *.csv, *.json or *.parquet")
    return ending


def lines(result: Result) -> list[dict[str, Any]]:
    """One mapping an iteration; the bracket of the spectral radius as two numbers or None."""
    return [_line(item) for item in result.log]


def _line(item: Iteration) -> dict[str, Any]:
    low, high = item.eigenvalue or (None, None)
    return {
        "part": item.part,
        "index": item.index,
        "residual": item.residual,
        "bound": item.bound,
        "proven": item.proven,
        "eigenvalue_low": low,
        "eigenvalue_high": high,
        "edge_visits": item.edge_visits,
        "seconds": item.seconds,
    }


def write_log(result: Result, sink: BinaryIO, kind: str) -> None:
    """Write the iterations as ``.csv``, ``.json`` (a list of objects) or ``.parquet``."""
    rows = lines(result)
    if kind == ".json":
        sink.write(("[" + ",".join("\n  " + dumps(row) for row in rows) + "\n]\n").encode())
        return
    import pyarrow as pa

    whole, real = pa.int64(), pa.float64()
    types = [pa.string(), whole, real, real, whole, real, real, whole, real]
    names = list(_line(Iteration(0, 0.0, 0.0, 0, 0.0)))
    table = pa.Table.from_pylist(rows, schema=pa.schema(list(zip(names, types, strict=True))))
    buffer = pa.BufferOutputStream()
    if kind == ".csv":
        from pyarrow import csv

        csv.write_csv(table, buffer)
    else:
        import pyarrow.parquet as pq

        pq.write_table(table, buffer)
    sink.write(memoryview(buffer.getvalue()))
