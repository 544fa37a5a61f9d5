"""A part of an edge table: one file, or one table in memory, whatever its format."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import pyarrow as pa

from kingpost.core.text import listed

BATCH_ROWS = 131_072


@dataclass(frozen=True)
class Part:
    """One file or table: its columns, its number of rows, and a reader of chosen columns.

    ``read(columns, encoded, groups)`` may hand out text columns as Arrow dictionaries if
    ``encoded``; with ``groups`` it reads these row groups only, whose numbers of rows the field
    ``groups`` holds where the file has any.  ``limits(group, column)`` are the least and greatest
    value of a column without nulls, as far as the file says so.

    ``width(column)`` is the bytes a row that a column takes in memory, None where it is that of
    the type or unknown.  ``textual`` columns hold whole numbers that were written as text, each
    in its plainest spelling, so that they can be read as text again; ``negative`` are those of
    them with a number below 0.  ``spoiled`` tells of numeric columns that
    hold cells which are no numbers (null here): a sentence for each.  ``unreadable`` counts rows
    that have no place in a table, with examples.  ``attributes`` are the nodes of a file that
    holds them beside its edges, with their ids in the column ``id``.
    """

    name: str
    schema: pa.Schema
    rows: int
    read: Callable[..., Iterator[pa.RecordBatch]]
    partitions: frozenset[str] = field(default_factory=frozenset)
    nulls: dict[str, int] = field(default_factory=dict)  # where known without reading
    groups: tuple[int, ...] = ()
    limits: Callable[[int, str], tuple[Any, Any] | None] = lambda group, column: None
    width: Callable[[str], float | None] = lambda column: None
    textual: frozenset[str] = field(default_factory=frozenset)
    negative: frozenset[str] = field(default_factory=frozenset)
    spoiled: dict[str, str] = field(default_factory=dict)
    unreadable: int = 0
    unreadable_examples: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    attributes: pa.Table | None = None


def parts_of_table(table: pa.Table, name: str) -> list[Part]:
    """A table in memory as a single part."""

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        yield from table.select(columns).to_batches(max_chunksize=BATCH_ROWS)

    nulls = {item: table.column(at).null_count for at, item in enumerate(table.schema.names)}
    # What is in memory already takes no more.
    width = dict.fromkeys(table.schema.names, 0.0).get
    return [Part(name, table.schema, table.num_rows, read, nulls=nulls, width=width)]


def partitioned(part: Part, values: dict[str, pa.Array]) -> Part:
    """A part with further columns of one value each; a column of its own comes first."""
    extra = {name: value for name, value in values.items() if name not in part.schema.names}
    if not extra:
        return part
    schema = part.schema
    for name, value in extra.items():
        schema = schema.append(pa.field(name, value.type))

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        inside = [name for name in columns if name not in extra]
        for batch in part.read(inside, encoded, groups):
            arrays = [
                pa.repeat(extra[name][0], batch.num_rows)
                if name in extra
                else batch.column(inside.index(name))
                for name in columns
            ]
            yield pa.RecordBatch.from_arrays(arrays, names=columns)

    def limits(group: int, column: str) -> tuple[Any, Any] | None:
        if column not in extra:
            return part.limits(group, column)
        value = extra[column][0]
        return (value.as_py(), value.as_py()) if value.is_valid else None

    nulls = part.nulls | {name: part.rows * value.null_count for name, value in extra.items()}
    return replace(
        part,
        schema=schema,
        read=read,
        limits=limits,
        width=lambda column: None if column in extra else part.width(column),
        nulls=nulls,
        partitions=part.partitions | frozenset(extra),
    )


def columns_listed(schema: pa.Schema) -> str:
    """The columns of a table with their types, for a sentence."""
    return listed([f"{item.name} ({item.type})" for item in schema], 12)
