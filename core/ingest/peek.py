"""A first look at a table: its columns and a few rows, for choosing which column is what."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import closing
from dataclasses import dataclass
from typing import Any, cast

from kingpost.core.ingest.about import TableAbout, about
from kingpost.core.ingest.files import Part, Paths, open_parts
from kingpost.core.text import id_text, visible

_CELL = 60  # characters of a value that are worth a look


@dataclass(frozen=True)
class Peek:
    """What a table holds, and for every column the values of its first rows, safe to show."""

    about: TableAbout
    values: tuple[tuple[str, ...], ...]


def peek(paths: Paths, rows: int = 5) -> Peek:
    """Columns, number of rows, and the first ``rows`` values of every column.

    Raises:
        InputError: for files that cannot be used.
    """
    described = about(paths)
    first = open_parts(paths)[0]
    names = [column.name for column in described.columns]
    return Peek(described, tuple(_values(first, name, names, rows) for name in names))


def _values(part: Part, name: str, names: Sequence[str], rows: int) -> tuple[str, ...]:
    if names.count(name) > 1:
        return ()  # a column called like another cannot be asked for
    with closing(cast(Any, part.read([name], False))) as batches:
        for batch in batches:
            some = batch.column(0).slice(0, rows).to_pylist()
            return tuple("" if v is None else visible(id_text(v), _CELL) for v in some)
    return ()
