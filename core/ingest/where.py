"""Which rows of an edge table an SQL expression keeps, and which need not be read for it.

Columns that only the expression names are read for it alone.  Of a Parquet file, row groups are
passed over whose statistics show that the expression is false for every row: one of the
conditions joined by AND compares a column with a constant that all values miss.  A column with
nulls in a group proves nothing there, so that rows for which the expression is neither true nor
false are counted exactly.
"""

from __future__ import annotations

import contextlib
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray
from pyarrow import types as pt

from kingpost.core.errors import InputError
from kingpost.core.ingest.parts import Part
from kingpost.core.ingest.sql import Expression
from kingpost.core.text import listed
from kingpost.core.watch import Watch

# Which end of a range decides whether any value can meet a condition (column on the left).
_ENDS = {
    "COMPARE_LESSTHAN": (("COMPARE_LESSTHAN", "low"),),
    "COMPARE_LESSTHANOREQUALTO": (("COMPARE_LESSTHANOREQUALTO", "low"),),
    "COMPARE_GREATERTHAN": (("COMPARE_GREATERTHAN", "high"),),
    "COMPARE_GREATERTHANOREQUALTO": (("COMPARE_GREATERTHANOREQUALTO", "high"),),
    "COMPARE_EQUAL": (
        ("COMPARE_LESSTHANOREQUALTO", "low"),
        ("COMPARE_GREATERTHANOREQUALTO", "high"),
    ),
}
_MIRRORED = {
    "COMPARE_LESSTHAN": "COMPARE_GREATERTHAN",
    "COMPARE_GREATERTHAN": "COMPARE_LESSTHAN",
    "COMPARE_LESSTHANOREQUALTO": "COMPARE_GREATERTHANOREQUALTO",
    "COMPARE_GREATERTHANOREQUALTO": "COMPARE_LESSTHANOREQUALTO",
    "COMPARE_EQUAL": "COMPARE_EQUAL",
}
_CONSTANTS = ("CONSTANT", "CAST", "TYPE")


@dataclass(frozen=True)
class Kept:
    """Rows of a part in one piece: where it begins, its columns, and which rows stay.

    ``at`` lists the rows of the piece that stay, None for all of them; ``batch`` is already cut
    down to these.
    """

    start: int
    rows: int
    batch: pa.RecordBatch | None
    at: NDArray[np.int64] | None
    unknown: int = 0


class Filter:
    """The rows that an expression keeps, part by part."""

    def __init__(self, text: str, parts: list[Part]) -> None:
        self.expression = Expression(text, "--where")
        self.columns = self._columns(parts)
        self.passed_over = 0  # rows in row groups that were not read

    def _columns(self, parts: list[Part]) -> dict[str, list[str]]:
        found = {}
        first: list[str] | None = None
        for part in parts:
            if first is not None:
                lost = [name for name in first if name not in part.schema.names]
                if lost:
                    raise InputError(
                        f"column {lost[0]!r} of {parts[0].name}, which --where names, is missing "
                        f"from {part.name}, whose columns are {listed(part.schema.names, 12)}; "
                        "load files of one kind together"
                    )
            names = self.expression.columns(part.schema, part.name)
            first = first if first is not None else names
            self.expression.bind(_chosen(part.schema, names), part.name)
            found[part.name] = names
        return found

    def read(self, part: Part, columns: list[str], watch: Watch) -> Iterator[Kept]:
        """The chosen columns of the rows that stay, in order.

        Raises:
            InputError: if the expression fails on a row, or the file is damaged.
            Interrupted: if the watch is cancelled.
        """
        only_here = [name for name in self.columns[part.name] if name not in columns]
        start = 0
        for groups, rows in self._runs(part):
            if groups is None and rows:
                self.passed_over += rows
                yield Kept(start, rows, None, None)
                start += rows
                continue
            for batch in part.read([*columns, *only_here], True, groups):
                asked = batch.select(self.columns[part.name])
                keep, unknown = self.expression.evaluate(asked, part.name, watch)
                batch = batch.select(columns)
                at = None
                if not keep.all():
                    at = np.flatnonzero(keep)
                    batch = batch.filter(pa.array(keep))
                yield Kept(start, len(keep), batch, at, unknown)
                start += len(keep)

    def _runs(self, part: Part) -> Iterator[tuple[list[int] | None, int]]:
        """Row groups to read together, and (None, rows) for those to pass over."""
        if not part.groups:
            yield None, 0
            return
        idle = self._idle(part)
        run: list[int] = []
        for group, rows in enumerate(part.groups):
            if not idle[group]:
                run.append(group)
                continue
            if run:
                yield run, sum(part.groups[at] for at in run)
                run = []
            yield None, rows
        if run:
            yield run, sum(part.groups[at] for at in run)

    def _idle(self, part: Part) -> NDArray[np.bool_]:
        """Row groups for all of whose rows the expression is false, as far as can be told."""
        idle = np.zeros(len(part.groups), dtype=bool)
        for condition in _joined(self.expression.tree):
            # Whatever cannot be told from statistics is read.
            with contextlib.suppress(Exception):
                idle |= self._missed(condition, part)
        return idle

    def _missed(self, condition: dict[str, Any], part: Part) -> NDArray[np.bool_]:
        none = np.zeros(len(part.groups), dtype=bool)
        turned = _with_column_left(condition)
        if turned is None:
            return none
        (name,) = {*self.expression.columns_of(turned["left"], part.schema, part.name)}
        kind = part.schema.field(name).type
        if not _sure(kind):
            return none
        limits = [part.limits(group, name) for group in range(len(part.groups))]
        # Some writers took a number that is no number for the least value.
        known = [
            at for at, limit in enumerate(limits) if limit is not None and limit[0] == limit[0]
        ]
        missed = none.copy()
        for comparison, end in _ENDS[turned["type"]]:
            # A number that is no number is greater than all others in SQL, and no statistics
            # tell of it.
            if not known or (pt.is_floating(kind) and end == "high"):
                continue
            values = [limits[at][end == "high"] for at in known]  # type: ignore[index]
            rows = pa.RecordBatch.from_arrays([pa.array(values, kind)], names=[name])
            asked = {**turned, "type": comparison}
            missed[known] |= self.expression.is_false(asked, rows)
        return missed


def _sure(kind: pa.DataType) -> bool:
    """Whether statistics of this type come through Python without loss and order as SQL does."""
    if pt.is_timestamp(kind):
        return bool(kind.unit != "ns")
    return bool(
        pt.is_integer(kind)
        or pt.is_float32(kind)
        or pt.is_float64(kind)
        or pt.is_string(kind)
        or pt.is_large_string(kind)
        or pt.is_date32(kind)
    )


def _chosen(schema: pa.Schema, names: list[str]) -> pa.Schema:
    return pa.schema([schema.field(name) for name in names])


def _joined(tree: dict[str, Any]) -> Iterator[dict[str, Any]]:
    """The conditions that AND joins at the top, with BETWEEN as two of them."""
    if tree.get("type") == "CONJUNCTION_AND":
        for child in tree["children"]:
            yield from _joined(child)
    elif tree.get("type") == "COMPARE_BETWEEN" and "input" in tree:
        about = {"class": "COMPARISON", "alias": "", "left": tree["input"]}
        yield {**about, "type": "COMPARE_GREATERTHANOREQUALTO", "right": tree["lower"]}
        yield {**about, "type": "COMPARE_LESSTHANOREQUALTO", "right": tree["upper"]}
    else:
        yield tree


def _with_column_left(condition: dict[str, Any]) -> dict[str, Any] | None:
    """A comparison of a plain column with a constant, the column on the left; else None."""
    if condition.get("class") != "COMPARISON" or condition.get("type") not in _ENDS:
        return None
    left, right = condition["left"], condition["right"]
    if _constant(left) and right.get("class") == "COLUMN_REF":
        left, right = right, left
        condition = {**condition, "type": _MIRRORED[condition["type"]]}
    if left.get("class") != "COLUMN_REF" or not _constant(right):
        return None
    return {**condition, "left": left, "right": right}


def _constant(tree: Any) -> bool:
    if isinstance(tree, list):
        return all(map(_constant, tree))
    if isinstance(tree, dict):
        if "class" in tree and tree["class"] not in _CONSTANTS:
            return False
        return all(map(_constant, tree.values()))
    return True
