"""Rows as JSON objects, column by column: several times faster than through dictionaries."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from typing import Any

import pyarrow as pa

from kingpost.core.export.jsonable import tamed
from kingpost.core.export.rows import as_plain


def row_texts(batch: pa.RecordBatch, ascii_only: bool = False) -> Iterator[str]:
    """A JSON object for each row of a batch, keys in the order of its columns."""
    names = [json.dumps(name, ensure_ascii=ascii_only) for name in batch.schema.names]
    row = "{" + ", ".join(tamed(name).replace("%", "%%") + ": %s" for name in names) + "}"
    columns = [_column(as_plain(column), ascii_only) for column in batch.columns]
    return (row % values for values in zip(*columns, strict=True))


def _column(column: pa.Array, ascii_only: bool) -> list[Any]:
    kind, is_ = column.type, pa.types
    numeric = is_.is_integer(kind) or is_.is_floating(kind)
    if numeric and column.null_count == 0:
        values = column.to_numpy(zero_copy_only=False).tolist()
    else:
        values = column.to_pylist()
    if is_.is_integer(kind) and column.null_count == 0:
        return list(values)
    if is_.is_floating(kind):
        return ["null" if v is None or not math.isfinite(v) else repr(float(v)) for v in values]
    encode = json.JSONEncoder(ensure_ascii=ascii_only).encode
    return [tamed(encode(value)) for value in values]
