"""Matrix Market coordinate files: entry (i, j) is an edge i -> j.

The format is that of Boisvert, Pozo and Remington, The Matrix Market exchange formats (NIST
report 5935, 1996).  Rows and columns keep their numbers, from 1.  scipy reads the entries; the
header is looked at before, so that a matrix of the wrong shape or size is refused unread.
"""

from __future__ import annotations

import io
from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
import pyarrow as pa

from kingpost.core.errors import InputError
from kingpost.core.ingest.formats import Source
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, parts_of_table
from kingpost.core.text import visible
from kingpost.core.watch import Watch

MOST_ENTRIES = 200_000_000  # the whole matrix is held in memory, some 40 bytes an entry


def open_matrix(source: Source, options: LoadOptions, watch: Watch) -> Part:
    """Read a square coordinate matrix; symmetric ones are read both ways if edges are directed.

    Raises:
        InputError: for anything else, or more than ``MOST_ENTRIES`` entries.
        Interrupted: if the watch is cancelled before the entries are read.
    """
    symmetry, pattern, n, entries = _header(source)
    watch.check()
    watch.report("reading matrix entries", 0, entries, "entries")
    from scipy.io import mmread

    try:
        with _opened(source) as file:
            matrix = mmread(file, spmatrix=False)
    except (ValueError, OverflowError, OSError, EOFError, pa.ArrowException) as error:
        raise InputError(
            f"{source.name} cannot be read as a Matrix Market file: {visible(first_line(error))}"
        ) from None
    watch.check()
    row, column, value = matrix.coords[0], matrix.coords[1], matrix.data
    notes = []
    if symmetry == "symmetric":
        both = len(row)
        mirrored = both - entries
        if options.directed:
            notes.append(
                f"{source.name} is symmetric: {mirrored:,} of its {entries:,} entries lie off the "
                "diagonal and were read both ways"
            )
        else:
            kept = row >= column  # what the file holds; the other half is its mirror
            row, column, value = row[kept], column[kept], value[kept]
    met = np.zeros(n, dtype=bool)
    met[row] = met[column] = True
    silent = n - int(np.count_nonzero(met))
    if silent:
        notes.append(
            f"{source.name}: {silent:,} of {n:,} rows and columns hold no entry; they are no nodes"
        )
    columns: dict[str, Any] = {"row": row.astype(np.int64) + 1, "col": column.astype(np.int64) + 1}
    if not pattern:
        columns["value"] = value
    return replace(parts_of_table(pa.table(columns), source.name)[0], notes=tuple(notes))


def _opened(source: Source) -> Any:
    return io.BytesIO(source.stream().read_buffer()) if source.packer else open(source.path, "rb")


def _header(source: Source) -> tuple[str, bool, int, int]:
    """Symmetry, whether there are no values, rows, entries.

    scipy's own look at the header does not tell which line is wrong.
    """
    number = 0
    with source.stream() as stream:
        for line in _lines(stream):
            number += 1
            if number == 1:
                words = line.lower().split()
                if len(words) != 5 or words[0] != "%%matrixmarket" or words[1] != "matrix":
                    raise InputError(
                        f"{source.name} line 1 is {visible(line, 60)!r}; a Matrix Market file "
                        "begins with %%MatrixMarket matrix coordinate real general, or the like"
                    )
                _refuse_kind(source, words)
                continue
            if not line.strip() or line.startswith("%"):
                continue
            sizes = line.split()
            if len(sizes) != 3 or not all(size.isascii() and size.isdigit() for size in sizes):
                raise InputError(
                    f"{source.name} line {number} is {visible(line, 60)!r}; it should tell the "
                    "numbers of rows, columns and entries"
                )
            rows, columns, entries = map(int, sizes)
            if rows != columns:
                raise InputError(
                    f"{source.name} holds a matrix of {rows:,} rows and {columns:,} columns; edges "
                    "between the same nodes make a square one"
                )
            if entries > MOST_ENTRIES:
                raise InputError(
                    f"{source.name} holds {entries:,} entries; Matrix Market is read whole and up "
                    f"to {MOST_ENTRIES:,} entries only: write it as Parquet"
                )
            if entries == 0:
                raise InputError(f"{source.name} holds no entries; a graph needs at least one")
            return words[4], words[3] == "pattern", rows, entries
    raise InputError(f"{source.name} ends within its header; it tells no numbers of rows")


def _refuse_kind(source: Source, words: Sequence[str]) -> None:
    _, _, form, field, symmetry = words
    if form != "coordinate":
        raise InputError(
            f"{source.name} holds a dense matrix ({visible(form, 20)}); only coordinate matrices "
            "are tables of edges"
        )
    if field not in ("real", "double", "integer", "unsigned-integer", "pattern"):
        raise InputError(
            f"{source.name} holds {visible(field, 20)} values; weights are real numbers"
        )
    if symmetry not in ("general", "symmetric"):
        raise InputError(
            f"{source.name} is {visible(symmetry, 20)}, so that some of its entries are no "
            "weights; write it as general or symmetric"
        )


def _lines(stream: Any) -> Iterator[str]:
    """Lines of the head of a stream, a megabyte at most."""
    head = bytes(stream.read(1 << 20)).decode("latin-1")
    yield from head.splitlines()
