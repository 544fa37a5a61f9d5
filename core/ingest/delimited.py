"""CSV, TSV and other delimited text, opened as parts.

A text says nothing of types, so the file is read through once before it is used: which columns
hold whole numbers and nothing else, which numbers, how many rows there are, and which rows have
no place in the table.  Names are kept as they stand: a column of ids is read as whole numbers
only if every cell is one in its plainest spelling ("007" is text), and only an empty cell that
is not quoted is null ("NA" is a name like others).
"""

from __future__ import annotations

import functools
import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from kingpost.core.errors import InputError, KingpostError
from kingpost.core.ingest.columns import PAIRS, weight_word, word_of
from kingpost.core.ingest.formats import Source
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.layout import (
    Layout,
    damaged,
    lay_out,
    line_of_row,
    line_of_text,
    misencoded,
)
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch

_BLOCK = 1 << 22
_EXAMPLES = 3
_LINES_COUNTED = 2_000_000  # rows up to which a line is looked for; beyond, the row is named
_NUMBER = r"^[ \t]*[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?[ \t]*$|^(nan|[+-]?inf)$"
_ENDS = frozenset(word for pair in PAIRS for word in pair)


@dataclass(frozen=True)
class Scan:
    """What one reading of a text found."""

    layout: Layout
    types: tuple[pa.DataType, ...]
    nulls: tuple[int, ...]
    rows: int
    ragged: int
    ragged_examples: tuple[str, ...]
    spoiled: dict[str, str]
    negative: frozenset[str]
    widths: dict[str, float]


def open_delimited(source: Source, options: LoadOptions, watch: Watch) -> Part:
    """Open a delimited text.

    Raises:
        InputError: if it cannot be read as one; the sentence names the line.
        Interrupted: if the watch is cancelled.
    """
    about = os.stat(source.path)
    key = (source, about.st_size, about.st_mtime_ns, about.st_ino)
    asked = (options.delimiter, options.encoding, options.header)
    roles = (options.source, options.target, options.weight)
    found = _scanned(key, asked, roles, _Free(watch))
    layout = found.layout
    types = dict(zip(layout.names, found.types, strict=True))

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        # Rows cannot be counted without a column.
        wanted = columns or [layout.names[0]]
        texts = {name for name in wanted if name in found.spoiled}
        kinds = {name: pa.string() if name in texts else types[name] for name in wanted}
        rows = 0
        with _reader(source, options.encoding, layout, kinds, wanted) as batches:
            for batch in batches:
                rows += batch.num_rows
                arrays = [
                    _numbers(batch.column(at)) if name in texts else batch.column(at)
                    for at, name in enumerate(columns)
                ]
                yield (
                    pa.RecordBatch.from_arrays(arrays, names=columns)
                    if columns
                    else batch.select([])
                )
        if rows != found.rows:
            raise InputError(f"{source.name} changed while it was read; read it again")

    whole = [name for name, kind in types.items() if pa.types.is_integer(kind)]
    return Part(
        source.name,
        pa.schema(list(zip(layout.names, found.types, strict=True))),
        found.rows,
        read,
        nulls=dict(zip(layout.names, found.nulls, strict=True)),
        textual=frozenset(whole),
        negative=found.negative,
        width=found.widths.get,
        spoiled=found.spoiled,
        unreadable=found.ragged,
        unreadable_examples=found.ragged_examples,
        notes=layout.notes,
    )


class _Free:
    """A watch that plays no part in what is remembered."""

    def __init__(self, watch: Watch) -> None:
        self.watch = watch

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Free)

    def __hash__(self) -> int:
        return 0


@functools.lru_cache(maxsize=256)
def _scanned(key: tuple[Any, ...], asked: Any, roles: Any, free: _Free) -> Scan:
    source: Source = key[0]
    delimiter, encoding, header = asked
    options = LoadOptions(delimiter=delimiter, encoding=encoding, header=header)
    return _scan(source, options, roles, free.watch)


@dataclass
class _Column:
    """What the cells of a column have been so far."""

    name: str
    end: bool
    strength: bool
    kind: str = "whole"
    flags: int = 0
    nulls: int = 0
    letters: int = 0
    numbers: int = 0
    others: int = 0
    first_other: tuple[int, str] | None = None

    def take(self, cells: pa.Array, row: int) -> None:
        """Look at the cells of a batch that begins at ``row``."""
        self.nulls += cells.null_count
        self.letters += cells.nbytes - 4 * len(cells)
        if self.strength:
            self._count(cells, row)
        elif self.kind == "whole":
            from kingpost.core.kernels import words

            self.flags |= words.whole(*_flat(cells))
            if (
                self.flags & words.OTHER
                or self.flags & words.BEYOND_UNSIGNED
                or (self.flags & words.NEGATIVE and self.flags & words.BEYOND_SIGNED)
            ):
                self.kind = "text" if self.end else "real"
        if self.kind == "real" and not self.strength and not _plain_reals(cells):
            self.kind = "text"

    def _count(self, cells: pa.Array, row: int) -> None:
        try:
            cells.cast(pa.float64())
            self.numbers += len(cells) - cells.null_count
            return
        except pa.ArrowInvalid:
            pass
        fine = pc.fill_null(pc.match_substring_regex(cells, _NUMBER, ignore_case=True), True)
        odd = np.flatnonzero(~fine.to_numpy(zero_copy_only=False))
        self.others += len(odd)
        self.numbers += len(cells) - cells.null_count - len(odd)
        if len(odd) and self.first_other is None:
            self.first_other = row + int(odd[0]), cells[int(odd[0])].as_py()

    @property
    def negative(self) -> bool:
        """Whether there are negative numbers among whole ones."""
        from kingpost.core.kernels import words

        return self.kind == "whole" and bool(self.flags & words.NEGATIVE)

    @property
    def type(self) -> pa.DataType:
        """The type to read it as."""
        from kingpost.core.kernels import words

        if self.strength:
            fine = self.numbers > self.others or not self.others
            return pa.float64() if fine else pa.string()
        if self.kind == "whole":
            return pa.uint64() if self.flags & words.BEYOND_SIGNED else pa.int64()
        return pa.float64() if self.kind == "real" else pa.string()


def _flat(cells: pa.Array) -> tuple[Any, Any, Any]:
    valid, ends, letters = cells.buffers()
    offsets = np.frombuffer(ends, dtype=np.int32)[cells.offset : cells.offset + len(cells) + 1]
    data = np.frombuffer(letters if letters is not None and letters.size else b"\0", dtype=np.uint8)
    mask = np.empty(0, dtype=bool)
    if valid is not None and cells.null_count:
        mask = cells.is_valid().to_numpy(zero_copy_only=False)
    return offsets, data, mask


def _plain_reals(cells: pa.Array) -> bool:
    """Whether all cells are numbers, none of which has zeros in front as codes have."""
    try:
        cells.cast(pa.float64())
    except pa.ArrowInvalid:
        return False
    codes = pc.match_substring_regex(cells, r"^[+-]?0[0-9]|^\+")
    return not pc.any(codes).as_py()


def _scan(source: Source, options: LoadOptions, roles: Any, watch: Watch) -> Scan:
    layout = lay_out(source, options)
    ends, weight = roles[:2], roles[2]
    columns = []
    for name in layout.names:
        end = name in ends or (None in ends and word_of(name) in _ENDS)
        strength = name == weight or (weight_word(name) is not None and name not in ends)
        columns.append(_Column(name, end and not strength, strength))
    kinds = dict.fromkeys(layout.names, pa.string())
    ragged = _Ragged()
    rows, last = 0, ""
    with _reader(source, options.encoding, layout, kinds, None, ragged) as batches:
        for batch in batches:
            watch.check()
            for at, column in enumerate(columns):
                column.take(batch.column(at), rows)
            rows += batch.num_rows
            watch.report(f"looking through {os.path.basename(source.name)}", rows, unit="rows")
            if batch.num_rows:
                last = str(batch.column(batch.num_columns - 1)[batch.num_rows - 1])
    if "\n" in last and not _ends_in_quote(source, options.encoding):
        at = line_of_row(source, options.encoding, layout, rows - 1)
        where = f"line {at:,}" if at else f"row {rows:,}"
        raise InputError(
            f"{source.name} {where}: a quoted value is not closed before the end of the file; "
            "close it, or write the quote twice"
        )
    examples = [
        _ragged_words(source, options.encoding, layout, *example) for example in ragged.examples
    ]
    spoiled = {
        column.name: _spoiled_words(source, options.encoding, layout, column, rows)
        for column in columns
        if column.first_other is not None and pa.types.is_floating(column.type)
    }
    return Scan(
        layout,
        tuple(column.type for column in columns),
        tuple(
            column.nulls + (column.others if column.name in spoiled else 0) for column in columns
        ),
        rows,
        ragged.count,
        tuple(examples),
        spoiled,
        frozenset(column.name for column in columns if column.negative),
        {
            column.name: 4 + column.letters / max(rows, 1)
            for column in columns
            if pa.types.is_string(column.type)
        },
    )


@dataclass
class _Ragged:
    """Rows with too many or too few fields."""

    count: int = 0
    examples: list[tuple[int, str]] = field(default_factory=list)

    def __call__(self, row: Any) -> str:
        self.count += 1
        if len(self.examples) < _EXAMPLES:
            self.examples.append((row.actual_columns, row.text))
        return "skip"


class _reader:
    """Batches of a text; every trouble of Arrow's becomes one sentence."""

    def __init__(
        self,
        source: Source,
        encoding: str | None,
        layout: Layout,
        kinds: dict[str, pa.DataType],
        wanted: list[str] | None,
        ragged: _Ragged | None = None,
    ) -> None:
        self.source, self.encoding, self.layout = source, encoding, layout
        self.kinds, self.wanted = kinds, wanted
        self.ragged = ragged or _Ragged()

    def __enter__(self) -> Iterator[pa.RecordBatch]:
        self.stream = self.source.text(self.encoding)
        return self._batches()

    def _batches(self) -> Iterator[pa.RecordBatch]:
        from pyarrow import csv

        layout = self.layout
        try:
            reader = csv.open_csv(
                self.stream,
                csv.ReadOptions(
                    block_size=_BLOCK,
                    column_names=list(layout.names),
                    skip_rows=layout.lines_before,
                ),
                csv.ParseOptions(
                    delimiter=layout.delimiter,
                    newlines_in_values=True,
                    invalid_row_handler=self.ragged,
                ),
                csv.ConvertOptions(
                    column_types=self.kinds,
                    include_columns=self.wanted,
                    null_values=[""],
                    strings_can_be_null=True,
                    quoted_strings_can_be_null=False,
                ),
            )
            yield from reader
        except pa.ArrowMemoryError:
            raise  # no fault of the file's
        except (pa.ArrowException, OSError, UnicodeError) as error:
            raise self._told(error) from None

    def _told(self, error: BaseException) -> KingpostError:
        words = str(error)
        if "UTF8" in words or isinstance(error, UnicodeError):
            options = LoadOptions(encoding=self.encoding)
            return InputError(misencoded(self.source, options))
        if "straddling" in words:
            return InputError(
                f"{self.source.name} holds a row of more than {_BLOCK:,} bytes; a quote that is "
                "not closed can be the cause"
            )
        if isinstance(error, OSError):
            return InputError(damaged(self.source, error))
        return InputError(f"{self.source.name} cannot be read as a table: {first_line(error)}")

    def __exit__(self, *_: object) -> None:
        self.stream.close()


def _numbers(cells: pa.Array) -> pa.Array:
    """Text as numbers; what is none becomes null."""
    fine = pc.match_substring_regex(cells, _NUMBER, ignore_case=True)
    kept = pc.if_else(fine, cells, pa.scalar(None, pa.string()))
    return pc.utf8_trim_whitespace(kept).cast(pa.float64())


def _ends_in_quote(source: Source, encoding: str | None) -> bool:
    end = b""
    with source.text(encoding) as stream:
        while block := bytes(stream.read(_BLOCK)):
            end = (end + block)[-64:]
    return end.rstrip().endswith(b'"')


def _ragged_words(
    source: Source, encoding: str | None, layout: Layout, fields: int, text: str
) -> str:
    line = line_of_text(source, encoding, text)
    where = f"{source.name} line {line:,}" if line else source.name
    return f"{where}: {visible(text, 40)!r} has {count(fields, 'field')}, not {len(layout.names)}"


def _spoiled_words(
    source: Source, encoding: str | None, layout: Layout, column: _Column, rows: int
) -> str:
    row, text = column.first_other or (0, "")
    line = line_of_row(source, encoding, layout, row) if row < _LINES_COUNTED else 0
    where = f"line {line:,}" if line else f"row {row + 1:,}"
    return (
        f"{source.name} {where}: column {column.name!r} holds {visible(text, 40)!r}, which is no "
        f"number ({column.others:,} of {count(rows, 'row')})"
    )
