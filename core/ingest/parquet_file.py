"""Parquet files, opened as parts: columns by name, row groups, and what the footer knows."""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from typing import Any

import pyarrow as pa
import pyarrow.dataset as ds
from pyarrow import fs

from kingpost.core.errors import InputError
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.parts import BATCH_ROWS, Part

_DICTIONARY_BYTES = 1_100_000  # what writers let a dictionary grow to, and a little


def open_parquet(file: str, name: str) -> Part:
    """Open a Parquet file; ``name`` is what messages call it.

    Raises:
        InputError: for anything but a whole Parquet file.
    """
    fragment, schema, rows = _footer(file, name)
    repetitive = _repetitive(fragment, schema)

    sizes = tuple(
        fragment.metadata.row_group(group).num_rows
        for group in range(fragment.metadata.num_row_groups)
    )

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        read = 0
        held = [column for column in columns if encoded and column in repetitive]
        expected = rows if groups is None else sum(sizes[group] for group in groups)
        try:
            source = _fragment(file, held) if held else fragment
            if groups is not None:
                source = source.subset(row_group_ids=list(groups))
            for batch in _scan(source, columns):
                read += batch.num_rows
                yield batch.rename_columns(columns)
        except pa.ArrowMemoryError:
            raise  # no fault of the file's
        except (pa.ArrowException, OSError) as error:
            raise InputError(
                f"{name} is damaged: its rows cannot be read ({first_line(error)})"
            ) from None
        if read != expected:
            raise InputError(
                f"{name} is damaged: it holds {read:,} rows, its footer says {expected:,}"
            )

    def limits(group: int, column: str) -> tuple[Any, Any] | None:
        return _limits(fragment.metadata, group, column)

    return Part(
        name,
        schema,
        rows,
        read,
        nulls=_null_counts(fragment),
        groups=sizes,
        limits=limits,
        width=lambda column: _width(fragment, schema, column, column in repetitive),
    )


def _width(fragment: Any, schema: pa.Schema, column: str, repetitive: bool) -> float | None:
    """Bytes a row that a column of text takes in memory, going by its size in the file."""
    footer = fragment.metadata
    if schema.field(column).type not in (pa.string(), pa.binary()) or not footer.num_rows:
        return None
    for at in range(footer.num_columns):
        if footer.schema.column(at).path == column:
            groups = range(footer.num_row_groups)
            sizes = [footer.row_group(g).column(at).total_uncompressed_size for g in groups]
            stored = sum(map(float, sizes)) / int(footer.num_rows)
            return max(stored, 4.0) if repetitive else stored
    return None


def _limits(footer: Any, group: int, column: str) -> tuple[Any, Any] | None:
    """Least and greatest value in a row group, where the footer knows and nothing is null."""
    for at in range(footer.num_columns):
        if footer.schema.column(at).path != column:
            continue
        about = footer.row_group(group).column(at).statistics
        if about is None or not about.has_min_max or not about.has_null_count or about.null_count:
            return None
        return about.min, about.max
    return None


def _scan(fragment: Any, columns: list[str]) -> Iterator[pa.RecordBatch]:
    # Expressions, because a name with a dot in it is a name here and no path.
    wanted = {str(at): ds.field(name) for at, name in enumerate(columns)}
    # Buffering ahead would hold the whole compressed file in memory until the end.
    checked = ds.ParquetFragmentScanOptions(page_checksum_verification=True, pre_buffer=False)
    yield from fragment.scanner(
        columns=wanted, batch_size=BATCH_ROWS, fragment_scan_options=checked
    ).to_batches()


def _fragment(file: str, dictionaries: list[str]) -> Any:
    form = ds.ParquetFileFormat(dictionary_columns=dictionaries)
    return form.make_fragment(file, fs.LocalFileSystem())


def _footer(file: str, name: str) -> tuple[Any, pa.Schema, int]:
    try:
        with open(file, "rb") as stream:
            head = stream.read(4)
            size = stream.seek(0, os.SEEK_END)
    except OSError as error:
        raise InputError(f"{name} cannot be read: {error.strerror or error}") from None
    if size == 0:
        raise InputError(f"{name} is empty (0 bytes); it should be a Parquet file")
    if head == b"PARE":
        raise InputError(f"{name} is an encrypted Parquet file; decrypt it first")
    if head != b"PAR1":
        raise InputError(f"{name} is no Parquet file (it does not begin as one)")
    try:
        fragment = _fragment(file, [])
        schema = fragment.physical_schema
        return fragment, schema, fragment.metadata.num_rows
    except (pa.ArrowException, OSError, ValueError) as error:
        raise InputError(
            f"{name} is a truncated or damaged Parquet file ({first_line(error)})"
        ) from None


def _repetitive(fragment: Any, schema: pa.Schema) -> frozenset[str]:
    """Text columns that are stored as dictionaries and indices, going by their sizes.

    Reading those as they are stored saves making and hashing every text of every row.
    """
    footer = fragment.metadata
    found = set()
    for at in range(footer.num_columns):
        name = footer.schema.column(at).path
        if name not in schema.names or schema.field(name).type not in (pa.string(), pa.binary()):
            continue
        size = sum(
            footer.row_group(group).column(at).total_uncompressed_size - _DICTIONARY_BYTES
            for group in range(footer.num_row_groups)
        )
        if size < 3 * footer.num_rows:
            found.add(name)
    return frozenset(found)


def _null_counts(fragment: Any) -> dict[str, int]:
    """Nulls of every flat column whose statistics are complete in the footer."""
    footer = fragment.metadata
    nulls: dict[str, int] = {}
    for at in range(footer.num_columns if footer.num_row_groups else 0):
        name = footer.schema.column(at).path
        groups = range(footer.num_row_groups)
        known = [footer.row_group(group).column(at).statistics for group in groups]
        if all(about is not None and about.has_null_count for about in known):
            nulls[name] = sum(about.null_count for about in known)
    return nulls
