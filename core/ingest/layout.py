"""How a delimited text is laid out: separator, names of the columns, lines before the rows."""

from __future__ import annotations

import contextlib
import csv
import io
from dataclasses import dataclass
from typing import Any

import pyarrow as pa

from kingpost.core.errors import InputError
from kingpost.core.ingest.formats import Source
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.text import count, visible

_HEAD = 1 << 20
_COMMENTS = ("#", "%")
_CANDIDATES = (",", "\t", ";", "|", " ")
_LOOKED_AT = 20  # lines to guess the separator by


@dataclass(frozen=True)
class Layout:
    """The columns' names, what separates fields, and how many lines come before the rows."""

    names: tuple[str, ...]
    delimiter: str
    lines_before: int
    notes: tuple[str, ...] = ()


def lay_out(source: Source, options: LoadOptions) -> Layout:
    """Read the head of a text.

    Raises:
        InputError: if it is not in the encoding it should be in, or holds no line.
    """
    with source.text(options.encoding) as stream:
        try:
            head = bytes(stream.read(_HEAD))
        except UnicodeError:
            raise InputError(misencoded(source, options)) from None
        except (pa.ArrowException, OSError) as error:
            raise InputError(damaged(source, error)) from None
    whole = len(head) < _HEAD
    if not whole:
        head = head[: head.rfind(b"\n") + 1] or head
    try:
        text = head.decode("utf-8")
    except UnicodeDecodeError as error:
        if not whole and error.start > len(head) - 8:
            text = head[: error.start].decode("utf-8")
        else:
            raise InputError(misencoded(source, options)) from None
    lines = text.splitlines()
    before = 0
    while before < len(lines) and (
        not lines[before].strip() or lines[before].startswith(_COMMENTS)
    ):
        before += 1
    if before == len(lines):
        raise InputError(f"{source.name} holds no rows; an edge table needs at least one")
    skipped = [line for line in lines[:before] if line.strip()]
    delimiter = options.delimiter or _delimiter(source, lines[before:])
    notes = []
    if skipped:
        notes.append(
            f"{source.name}: took {count(len(skipped), 'line')} at its head that begin with "
            f"{skipped[0][0]} as remarks"
        )
    if options.delimiter is None and delimiter not in ",\t":
        shown = "blanks" if delimiter == " " else delimiter
        notes.append(f"{source.name}: fields are separated by {shown} (say so with --delimiter)")
    first = _fields(lines[before], delimiter)
    if first is None:
        raise InputError(
            f"{source.name} line {before + 1}: a quoted value is not closed on the line of the "
            "column names"
        )
    named = options.header == "yes" or (options.header == "guess" and not _all_numbers(first))
    if named:
        return Layout(tuple(first), delimiter, before + 1, tuple(notes))
    names = tuple(f"column{at}" for at in range(1, len(first) + 1))
    if options.header == "guess":
        notes.append(
            f"{source.name}: the first line holds numbers, so it is a row and no names; the "
            f"columns are called {names[0]} to {names[-1]} (say so with --header no)"
        )
    return Layout(names, delimiter, before, tuple(notes))


def _delimiter(source: Source, lines: list[str]) -> str:
    if source.format == "tsv":
        return "\t"
    lines = [line for line in lines if line.strip()][:_LOOKED_AT]
    if source.format == "csv" and "," in lines[0]:
        return ","
    for candidate in _CANDIDATES:
        counts = {len(_fields(line, candidate) or ()) for line in lines}
        if len(counts) == 1 and counts.pop() > 1:
            return candidate
    return next((mark for mark in _CANDIDATES if mark in lines[0]), ",")


def _fields(line: str, delimiter: str) -> list[str] | None:
    """The fields of a line; None if a quoted value is still open at its end."""
    try:
        rows = list(csv.reader([line], delimiter=delimiter, strict=True))
    except csv.Error:
        return None
    return rows[0] if rows else []


def _all_numbers(fields: list[str]) -> bool:
    found = False
    for field in fields:
        if field == "":
            continue
        try:
            float(field)
        except ValueError:
            return False
        found = True
    return found


def damaged(source: Source, error: BaseException) -> str:
    """That a file cannot be read to its end."""
    what = "cannot be unpacked" if source.packer else "cannot be read"
    return f"{source.name} is damaged: it {what} ({first_line(error)})"


def misencoded(source: Source, options: LoadOptions) -> str:
    """Where a text is not in the encoding it should be in."""
    asked = options.encoding or source.encoding or "UTF-8"
    line, example = 0, b""
    if asked == "UTF-8":
        line, example = _first_bad_line(source)
    shown = visible(example.decode("latin-1"), 40)
    where = f"{source.name} line {line:,}" if line else source.name
    what = f" ({shown!r})" if shown else ""
    return (
        f"{where} is not valid {asked.upper()} text{what}; write it as UTF-8, or name its encoding "
        "with --encoding, such as latin-1"
    )


def _first_bad_line(source: Source) -> tuple[int, bytes]:
    line, rest = 0, b""
    with source.text(None) as stream:
        while True:
            block = bytes(stream.read(_HEAD))
            pieces = (rest + block).split(b"\n")
            rest = pieces.pop() if block else b""
            for piece in pieces:
                line += 1
                try:
                    piece.decode("utf-8")
                except UnicodeDecodeError as error:
                    return line, piece[max(0, error.start - 20) : error.start + 20].strip()
            if not block:
                return 0, b""


def line_of_text(source: Source, encoding: str | None, text: str) -> int:
    """The number of the first line that reads ``text``, from 1; 0 if there is none."""
    wanted = b"\n" + text.encode() + b"\n"
    line, rest = 0, b"\n"
    with source.text(encoding) as stream:
        while True:
            block = bytes(stream.read(_HEAD)).replace(b"\r\n", b"\n").replace(b"\r", b"\n")
            window = rest + (block or b"\n")
            at = window.find(wanted)
            if at >= 0:
                return line + window.count(b"\n", 0, at) + 1
            if not block:
                return 0
            kept = min(len(window), len(wanted))
            line += window.count(b"\n", 0, len(window) - kept)
            rest = window[len(window) - kept :]


def line_of_row(source: Source, encoding: str | None, layout: Layout, row: int) -> int:
    """The line that a row (from 0) begins on, from 1; rows of a wrong length are none.

    0 where it cannot be told.
    """
    with source.text(encoding) as stream:
        raw: Any = io.BufferedReader(_Raw(stream))
        lines = io.TextIOWrapper(raw, "utf-8", "replace", newline="")
        for _ in range(layout.lines_before):
            lines.readline()
        reader = csv.reader(lines, delimiter=layout.delimiter)
        before = 0
        # What this reader does not take (a field of 128 kB, say) leaves the row without a line.
        with contextlib.suppress(csv.Error):
            for fields in reader:
                if len(fields) == len(layout.names):
                    if row == 0:
                        return layout.lines_before + before + 1
                    row -= 1
                before = reader.line_num
    return 0


class _Raw:
    """An Arrow stream as Python's io wants it."""

    closed = False

    def __init__(self, stream: Any) -> None:
        self._stream = stream

    def readable(self) -> bool:
        return True

    def writable(self) -> bool:
        return False

    def seekable(self) -> bool:
        return False

    def readinto(self, into: Any) -> int:
        block = self._stream.read(len(into))
        into[: len(block)] = block
        return len(block)

    def close(self) -> None:
        """The stream is closed by whoever opened it."""

    def flush(self) -> None:
        """Nothing is ever written."""
