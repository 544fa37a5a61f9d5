"""Tables with one row a node: attributes joined to a graph by id, and vectors read for it."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.graph import Floats, Graph
from kingpost.core.ingest.columns import is_numeric, require_column
from kingpost.core.ingest.files import open_parts
from kingpost.core.ingest.idtypes import common, convert, family, first_line, plain, require_id
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, columns_listed
from kingpost.core.ingest.rows import to_floats
from kingpost.core.text import count, id_text, listed, visible
from kingpost.core.watch import Watch

_ID_WORDS = ("id", "node_id", "nodeid", "node", "name", "key", "label", "vertex")
_DELIMITERS = {".csv": ",", ".tsv": "\t", ".tab": "\t"}


@dataclass(frozen=True)
class Joined:
    """Attributes in node order, and what became of the rows of the nodes table.

    ``rows = joined + unknown + repeated`` (a null id is unknown); ``missing`` nodes have no row.
    """

    attributes: pa.Table | None = None
    column: str | None = None
    file: str | None = None
    rows: int = 0
    joined: int = 0
    unknown: int = 0
    missing: int = 0
    repeated: int = 0
    notes: tuple[str, ...] = ()


def join_nodes(
    options: LoadOptions, labels: pa.Array, watch: Watch, parts: Sequence[Part] = ()
) -> Joined:
    """Join the nodes table of ``options`` to the labels; the first row of an id counts.

    Without one the nodes that a file of edges holds itself are joined.

    Raises:
        InputError: for an unusable file, or an id column that does not go with the labels.
    """
    held = next((part for part in parts if part.attributes is not None), None)
    if options.nodes is None and held is None:
        return Joined()
    watch.check()
    watch.report("joining node attributes", 0, len(labels), "nodes")
    guessed = False
    if options.nodes is not None:
        path = options.nodes
        schema = _schema(path)
        column = options.node_id or ""
        if options.node_id is not None:
            require_column(schema, column, path)
        else:
            column, guessed = guess_id(path, schema, labels), True
        table = _read(path, schema, column, labels.type)
    else:
        assert held is not None
        path, column, table = held.name, "id", held.attributes
    at = _positions(table.column(column), labels, column, path)
    known = np.flatnonzero(at >= 0)
    first = np.full(len(labels), -1, dtype=np.int64)
    first[at[known[::-1]]] = known[::-1]  # the first row of an id is written last
    joined = int(np.count_nonzero(first >= 0))
    rows = pa.array(first, mask=first < 0)
    notes = (f"took {column} of {path} as the node id (name it with --node-id)",) if guessed else ()
    return Joined(
        attributes=_without_views(table.drop_columns([column])).take(rows).combine_chunks(),
        column=column,
        file=path,
        rows=table.num_rows,
        joined=joined,
        unknown=table.num_rows - len(known),
        missing=len(labels) - joined,
        repeated=len(known) - joined,
        notes=notes,
    )


def _without_views(table: pa.Table) -> pa.Table:
    """Text and binary views as plain columns: Arrow cannot pick rows of views."""
    plain = {pa.string_view(): pa.large_string(), pa.binary_view(): pa.large_binary()}
    kinds = [field.with_type(plain.get(field.type, field.type)) for field in table.schema]
    return table.cast(pa.schema(kinds))


def read_values(path: str | os.PathLike[str], graph: Graph, column: str | None) -> Floats:
    """See :func:`kingpost.core.ingest.read_node_values`."""
    name = os.fspath(path)
    schema = _schema(name)
    if column is not None:
        require_column(schema, column, name)
    ids = guess_id(name, schema, graph.labels, exclude=column)
    if column is None:
        numeric = [f.name for f in schema if f.name != ids and is_numeric(f.type)]
        if len(numeric) != 1:
            raise InputError(
                f"it is not clear which column of {name} holds the values of the nodes; it needs "
                f"one id column and one numeric column; its columns are {columns_listed(schema)}"
            )
        column = numeric[0]
    elif not is_numeric(schema.field(column).type):
        raise InputError(
            f"column {column!r} of {name} is of type {schema.field(column).type}; values of nodes "
            "are numbers"
        )
    table = _read(name, schema, ids, graph.labels.type).select([ids, column])
    at = _positions(table.column(ids), graph.labels, ids, name)
    _refuse_ids(at, table.column(ids), name)
    numbers, nulls = to_floats(_single(table.column(column)))
    bad = ~np.isfinite(numbers) | (numbers < 0)
    if nulls is not None:
        bad |= nulls
    if bad.any():
        row = int(np.flatnonzero(bad)[0])
        shown = "null" if nulls is not None and nulls[row] else f"{numbers[row]:g}"
        who = visible(id_text(table.column(ids)[row].as_py()), 40)
        raise InputError(
            f"column {column!r} of {name} holds {count(int(bad.sum()), 'value')} that "
            f"{'is' if bad.sum() == 1 else 'are'} negative or no number (row {row + 1:,}, {who}: "
            f"{shown}); values of nodes are finite and at least 0"
        )
    values = np.zeros(graph.n)
    values[at] = numbers
    return values


def _refuse_ids(at: NDArray[np.int64], ids: pa.ChunkedArray, name: str) -> None:
    unknown = np.flatnonzero(at < 0)
    if len(unknown):
        shown = [
            visible(id_text(ids[int(row)].as_py()), 40) if ids[int(row)].is_valid else "null"
            for row in unknown[:3]
        ]
        raise InputError(
            f"{name} names {count(len(unknown), 'node')} that the graph does not hold: "
            f"{listed(shown + [''] * (len(unknown) - len(shown)))}"
        )
    order = np.argsort(at, kind="stable")
    again = np.flatnonzero(at[order][1:] == at[order][:-1])
    if len(again):
        who = visible(id_text(ids[int(order[again[0]])].as_py()), 40)
        raise InputError(
            f"{name} gives {count(len(again), 'node')} more than one value, for example {who}"
        )


def guess_id(path: str, schema: pa.Schema, labels: pa.Array, exclude: str | None = None) -> str:
    """The id column of a nodes table: by name, else the one whose values are ids of the graph."""
    names = [f.name for f in schema if f.name != exclude and schema.names.count(f.name) == 1]
    if _delimiter(path) is None or family(labels.type) == "integer":
        kinds = {name: schema.field(name).type for name in names}
        names = [name for name in names if _goes(kinds[name], labels.type)]
    lower = {name.lower(): name for name in reversed(names)}
    named = [lower[word] for word in _ID_WORDS if word in lower]
    if named or len(names) == 1:
        return str(named[0] if named else names[0])
    hits: dict[str, int] = {}
    for name in names:
        try:
            ids = _read(path, schema, name, labels.type).column(name)
            hits[name] = int(np.count_nonzero(_positions(ids, labels, name, path) >= 0))
        except InputError:  # text that does not read as ids
            hits[name] = 0
    best = [name for name in names if hits[name] == max(hits.values())]
    if len(best) == 1:
        return str(best[0])
    raise InputError(
        f"it is not clear which column of {path} holds the node ids (of type {labels.type}); name "
        f"it with --node-id; its columns are {columns_listed(schema)}"
    )


def _goes(kind: pa.DataType, labels: pa.DataType) -> bool:
    return family(kind) is not None and common(kind, labels) is not None


def _positions(
    ids: pa.ChunkedArray, labels: pa.Array, column: str, where: str
) -> NDArray[np.int64]:
    """Node number of every row, -1 where the id is null or not in the graph."""
    require_id(ids.type, column, where)
    kind = common(ids.type, labels.type)
    if kind is None:
        raise InputError(
            f"column {column!r} of {where} is of type {plain(ids.type)}, the ids of the edges are "
            f"of type {labels.type}; cast one of them, or name another column with --node-id"
        )
    among = convert(labels, kind, "ids", "the edge table")
    at = np.empty(len(ids), dtype=np.int64)
    start = 0
    for chunk in ids.chunks:
        values = convert(chunk, kind, column, where)
        found = pc.index_in(values, value_set=among)
        at[start : start + len(chunk)] = pc.fill_null(found, -1).to_numpy(zero_copy_only=False)
        start += len(chunk)
    return at


def _single(values: pa.ChunkedArray) -> pa.Array:
    return values.combine_chunks() if values.num_chunks != 1 else values.chunk(0)


def _delimiter(path: str) -> str | None:
    stem = path.lower()
    for packed in (".gz", ".bz2", ".zst"):
        stem = stem.removesuffix(packed)
    return _DELIMITERS.get(os.path.splitext(stem)[1])


def _schema(path: str) -> pa.Schema:
    if _delimiter(path) is None:
        parts = open_parts(path)
        if len(parts) != 1:
            raise InputError(f"{path} names {count(len(parts), 'file')}; nodes come in one file")
        return parts[0].schema
    return _read_csv(path, {}).schema


def _read(path: str, schema: pa.Schema, column: str, kind: pa.DataType) -> pa.Table:
    """The whole table; in text formats the ids are read as the type they have in the graph."""
    if _delimiter(path) is None:
        part = open_parts(path)[0]
        batches = list(part.read(list(part.schema.names), False))
        return pa.Table.from_batches(batches, part.schema)
    table = _read_csv(path, {column: pa.string()})
    if family(kind) == "text":
        return table
    texts = table.column(column)
    try:
        ids = texts.cast(plain(kind))
    except (pa.ArrowException, NotImplementedError) as error:
        raise InputError(
            f"column {column!r} of {path} does not read as ids of type {kind}: {first_line(error)}"
        ) from None
    return table.set_column(table.schema.get_field_index(column), column, ids)


def _read_csv(path: str, types: dict[str, pa.DataType]) -> pa.Table:
    from pyarrow import csv

    try:
        return csv.read_csv(
            path,
            parse_options=csv.ParseOptions(delimiter=_delimiter(path)),
            convert_options=csv.ConvertOptions(column_types=types, strings_can_be_null=False),
        )
    except FileNotFoundError:
        raise InputError(f"there is no file {path}") from None
    except (pa.ArrowException, OSError, UnicodeDecodeError) as error:
        raise InputError(f"{path} cannot be read as a table: {first_line(error)}") from None
