"""Text that a spreadsheet would take for a formula, made plain text for it.

A cell that begins with one of ``= + - @``, their full-width forms, a tab or a carriage return is
run as a formula by programs that open csv (the CSV injection of OWASP's guides; from memory).
Such text gets an apostrophe in front, which those programs read as "this is text".  The file no
longer holds the exact ids, so this is done on request only.
"""

from __future__ import annotations

import pyarrow as pa
import pyarrow.compute as pc

_BEGINS = "^[=+@\\-\t\r\uff1d\uff0b\uff0d\uff20]"


class Plain:
    """Changes columns of text and counts the cells it changed."""

    def __init__(self) -> None:
        self.changed = 0

    def __call__(self, column: pa.Array) -> pa.Array:
        """A column with an apostrophe before what would be run; others as they are."""
        if not (pa.types.is_string(column.type) or pa.types.is_large_string(column.type)):
            return column
        runs = pc.fill_null(pc.match_substring_regex(column, _BEGINS), False)
        found = pc.sum(runs).as_py() or 0
        if not found:
            return column
        self.changed += found
        mark = pa.scalar("'", column.type)
        none = pa.scalar("", column.type)
        return pc.if_else(runs, pc.binary_join_element_wise(mark, column, none), column)

    def names(self, names: list[str]) -> list[str]:
        """Names of columns, changed likewise."""
        column = self(pa.array(names, pa.string()))
        return [str(name) for name in column.to_pylist()]

    @property
    def sentence(self) -> str:
        """What was done."""
        many = f"{self.changed:,} cells begin" if self.changed != 1 else "1 cell begins"
        return (
            f"{many} with an apostrophe that the data does not have, so that a spreadsheet takes "
            "them for text; read the file without --spreadsheet-safe for exact ids"
        )
