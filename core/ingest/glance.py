"""A first look at a table: its columns and a few rows, for choosing which column is what."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import closing
from dataclasses import dataclass
from typing import Any, cast

import pyarrow as pa

from kingpost.core.ingest.about import TableAbout, about
from kingpost.core.ingest.files import Paths, open_parts
from kingpost.core.ingest.idtypes import common, family
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part
from kingpost.core.text import id_text, visible

_CELL = 60  # characters of a value that are worth a look


@dataclass(frozen=True)
class Peek:
    """What a table holds, and for every column the values of its first rows, safe to show."""

    about: TableAbout
    values: tuple[tuple[str, ...], ...]
    schema: pa.Schema
    textual: frozenset[str] = frozenset()  # whole numbers that were written as text

    def apart(self, source: str, target: str) -> str:
        """Why two columns cannot be the two ends of an edge; empty if they can."""
        kinds = [self.schema.field(name).type for name in (source, target)]
        if common(*kinds) is not None:
            return ""
        whole = [
            name
            for name, kind in zip((source, target), kinds, strict=True)
            if family(kind) == "integer"
        ]
        if "text" in map(family, kinds) and whole and whole[0] in self.textual:
            return ""
        return (
            f"{visible(source, 40)} is of type {kinds[0]} and {visible(target, 40)} of type "
            f"{kinds[1]}, which do not go together"
        )


def peek(paths: Paths, rows: int = 5, options: LoadOptions | None = None) -> Peek:
    """Columns, number of rows, and the first ``rows`` values of every column.

    Raises:
        InputError: for files that cannot be used.
    """
    described = about(paths, options)
    first = open_parts(paths, options)[0]
    names = [column.name for column in described.columns]
    values = tuple(_values(first, name, names, rows) for name in names)
    return Peek(described, values, first.schema, first.textual)


def _values(part: Part, name: str, names: Sequence[str], rows: int) -> tuple[str, ...]:
    if names.count(name) > 1:
        return ()  # a column called like another cannot be asked for
    with closing(cast(Any, part.read([name], False))) as batches:
        for batch in batches:
            some = batch.column(0).slice(0, rows).to_pylist()
            return tuple(map(_cell, some))
    return ()


def _cell(value: Any) -> str:
    if value is None:
        return ""
    return visible(f"{value:.6g}" if isinstance(value, float) else id_text(value), _CELL)
