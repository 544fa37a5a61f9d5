"""Where tables come from: files, folders, globs and hive partitions, opened as parts.

A part is one file (or one table in memory) that can tell its columns and hand out batches of a
few of them.  Every way in which a file can be missing or broken ends in one sentence here.
"""

from __future__ import annotations

import glob
import os
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any
from urllib.parse import unquote

import pyarrow as pa
import pyarrow.dataset as ds
from pyarrow import fs

from kingpost.core.errors import InputError
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.text import listed

ENDINGS = (".parquet", ".parq", ".pq")
_NULL_PARTITION = "__HIVE_DEFAULT_PARTITION__"
BATCH_ROWS = 131_072
_DICTIONARY_BYTES = 1_100_000  # what writers let a dictionary grow to, and a little

Paths = str | os.PathLike[str] | Sequence[str | os.PathLike[str]]


@dataclass(frozen=True)
class Part:
    """One file or table: its columns, its number of rows, and a reader of chosen columns.

    ``read(columns, encoded, groups)`` may hand out text columns as Arrow dictionaries if
    ``encoded``; with ``groups`` it reads these row groups only, whose numbers of rows the field
    ``groups`` holds where the file has any.  ``limits(group, column)`` are the least and greatest
    value of a column without nulls, as far as the file says so.
    """

    name: str
    schema: pa.Schema
    rows: int
    read: Callable[..., Iterator[pa.RecordBatch]]
    partitions: frozenset[str] = field(default_factory=frozenset)
    nulls: dict[str, int] = field(default_factory=dict)  # where known without reading
    groups: tuple[int, ...] = ()
    limits: Callable[[int, str], tuple[Any, Any] | None] = lambda group, column: None


def parts_of_table(table: pa.Table, name: str) -> list[Part]:
    """A table in memory as a single part."""

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        yield from table.select(columns).to_batches(max_chunksize=BATCH_ROWS)

    nulls = {item: table.column(at).null_count for at, item in enumerate(table.schema.names)}
    return [Part(name, table.schema, table.num_rows, read, nulls=nulls)]


def open_parts(paths: Paths) -> list[Part]:
    """Open every Parquet file that ``paths`` names, in a fixed order: as given, then by name.

    Raises:
        InputError: for a path that names nothing, or a file that cannot be read as Parquet.
    """
    files = find_files(paths)
    keys = [_partition_keys(file) for file in files]
    # A partition column exists where every file's path has it.
    shared = [name for name in keys[0] if all(name in key for key in keys)]
    columns = {name: _partition_column([key[name] for key in keys]) for name in shared}
    return [
        _open(file, {name: columns[name].slice(at, 1) for name in shared})
        for at, file in enumerate(files)
    ]


def find_files(paths: Paths) -> list[str]:
    """The files that paths, folders and globs name; never empty."""
    given = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    if not given:
        raise InputError("no edge table was named; name a Parquet file, a folder or a glob")
    found: list[str] = []
    for path in given:
        found.extend(_expand(os.fspath(path)))
    return list(dict.fromkeys(found))


def _expand(path: str) -> list[str]:
    if os.path.isdir(path):
        files = sorted(_walk(path))
        if not files:
            raise InputError(f"folder {path} holds no Parquet file (names ending in .parquet)")
        return files
    if os.path.lexists(path):
        return [path]
    if glob.has_magic(path):
        hits = sorted(glob.glob(path, recursive=True))
        if not hits:
            raise InputError(f"no file matches {path}")
        return [file for hit in hits for file in _expand(hit)]
    raise InputError(f"there is no file {path}")


def _walk(folder: str) -> Iterator[str]:
    def refuse(error: OSError) -> None:
        raise InputError(f"folder {error.filename} cannot be read: {error.strerror}")

    for root, folders, files in os.walk(folder, onerror=refuse, followlinks=True):
        # Names with a leading dot or underscore are other programs' temporary files and markers.
        folders[:] = sorted(name for name in folders if not name.startswith((".", "_")))
        for name in files:
            if name.lower().endswith(ENDINGS) and not name.startswith((".", "_")):
                yield os.path.join(root, name)


def _partition_keys(file: str) -> dict[str, str]:
    pairs = [step.split("=", 1) for step in Path(file).parts[:-1] if "=" in step]
    return {unquote(name): unquote(value) for name, value in pairs if name}


def _partition_column(values: list[str]) -> pa.Array:
    """Whole numbers where every value is one in its plainest spelling ("007" is text)."""
    known = [None if value == _NULL_PARTITION else value for value in values]
    if all(value is None or _whole(value) for value in known):
        return pa.array([None if value is None else int(value) for value in known], pa.int64())
    return pa.array(known, pa.string())


def _whole(text: str) -> bool:
    digits = text.removeprefix("-")
    return digits.isascii() and digits.isdigit() and len(digits) <= 18 and str(int(text)) == text


def _open(file: str, partitions: dict[str, pa.Array]) -> Part:
    fragment, schema, rows = _footer(file)
    nulls = _null_counts(fragment)
    repetitive = _repetitive(fragment, schema)
    extra = {name: value for name, value in partitions.items() if name not in schema.names}
    for name, value in extra.items():
        nulls[name] = rows * value.null_count
        schema = schema.append(pa.field(name, value.type))

    sizes = tuple(
        fragment.metadata.row_group(group).num_rows
        for group in range(fragment.metadata.num_row_groups)
    )

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        inside = [name for name in columns if name not in extra]
        read = 0
        held = [name for name in inside if encoded and name in repetitive]
        expected = rows if groups is None else sum(sizes[group] for group in groups)
        try:
            source = _fragment(file, held) if held else fragment
            if groups is not None:
                source = source.subset(row_group_ids=list(groups))
            for batch in _scan(source, inside):
                arrays = [
                    pa.repeat(extra[name][0], batch.num_rows)
                    if name in extra
                    else batch.column(inside.index(name))
                    for name in columns
                ]
                read += batch.num_rows
                yield pa.RecordBatch.from_arrays(arrays, names=columns)
        except (pa.ArrowException, OSError) as error:
            raise InputError(
                f"{file} is damaged: its rows cannot be read ({first_line(error)})"
            ) from None
        if read != expected:
            raise InputError(
                f"{file} is damaged: it holds {read:,} rows, its footer says {expected:,}"
            )

    def limits(group: int, column: str) -> tuple[Any, Any] | None:
        if column in extra:
            value = extra[column][0]
            return (value.as_py(), value.as_py()) if value.is_valid else None
        return _limits(fragment.metadata, group, column)

    return Part(file, schema, rows, read, frozenset(extra), nulls, sizes, limits)


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


def _footer(file: str) -> tuple[Any, pa.Schema, int]:
    try:
        with open(file, "rb") as stream:
            head = stream.read(4)
            size = stream.seek(0, os.SEEK_END)
    except OSError as error:
        raise InputError(f"{file} cannot be read: {error.strerror or error}") from None
    if size == 0:
        raise InputError(f"{file} is empty (0 bytes); it should be a Parquet file")
    if head == b"PARE":
        raise InputError(f"{file} is an encrypted Parquet file; decrypt it first")
    if head != b"PAR1":
        raise InputError(f"{file} is no Parquet file (it does not begin as one)")
    try:
        fragment = _fragment(file, [])
        schema = fragment.physical_schema
        return fragment, schema, fragment.metadata.num_rows
    except (pa.ArrowException, OSError, ValueError) as error:
        raise InputError(
            f"{file} is a truncated or damaged Parquet file ({first_line(error)})"
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


def columns_listed(schema: pa.Schema) -> str:
    """The columns of a table with their types, for a sentence."""
    return listed([f"{item.name} ({item.type})" for item in schema], 12)
