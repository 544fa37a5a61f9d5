"""Reading rows batch by batch: which are good, what is wrong with the others, and their count."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import InputError, RowsError
from kingpost.core.graph import Floats
from kingpost.core.ingest.columns import Roles
from kingpost.core.ingest.idtypes import convert_ids, unwrap
from kingpost.core.ingest.parts import Part
from kingpost.core.ingest.where import Filter, Kept
from kingpost.core.text import count, id_text, visible
from kingpost.core.watch import Watch

# Why a row cannot be used; a row with several troubles counts under the first.
REASONS = (
    "null source",
    "null target",
    "null weight",
    "NaN weight",
    "infinite weight",
    "negative weight",
    "a wrong number of fields",
)
EXAMPLES = 3


@dataclass
class Rows:
    """What reading leaves: chunks of ids and weights of the good rows, and the counts."""

    source: list[pa.Array] = field(default_factory=list)
    target: list[pa.Array] = field(default_factory=list)
    weights: list[Floats] = field(default_factory=list)
    read: int = 0
    kept: int = 0
    filtered: int = 0
    filtered_null: int = 0
    skipped: dict[str, int] = field(default_factory=dict)
    examples: dict[str, list[str]] = field(default_factory=dict)


def read_rows(
    parts: list[Part], roles: Roles, bad_rows: str, watch: Watch, chosen: Filter | None = None
) -> Rows:
    """Read the columns of all parts that serve, of the rows that ``chosen`` keeps.

    Raises:
        RowsError: if rows are bad and the policy is to refuse, or if no good row is left.
        InputError: if there are no rows at all, or a file turns out to be damaged.
    """
    total = sum(part.rows + part.unreadable for part in parts)
    if total == 0:
        names = parts[0].name if len(parts) == 1 else f"each of {len(parts):,} files"
        raise InputError(f"{names} holds no rows; an edge table needs at least one")
    rows = Rows()
    columns = [roles.source, roles.target, *([roles.weight] if roles.weight else [])]
    for part in parts:
        name = _row_names(part.name if len(parts) > 1 else None)
        _count_unreadable(rows, part)
        pieces = _whole(part, columns) if chosen is None else chosen.read(part, columns, watch)
        for piece in pieces:
            watch.check()
            _take(rows, piece, roles, part.name, name)
            watch.report("reading rows", rows.read, total, "rows")
            if rows.skipped and bad_rows == "refuse":
                # Nothing will be built from them: only the counts go on.
                rows.source, rows.target, rows.weights = [], [], []
    if rows.skipped and (bad_rows == "refuse" or rows.kept == 0):
        raise RowsError(_refusal(rows, bad_rows))
    if rows.kept == 0 and chosen is not None:
        raise RowsError(_nothing_kept(rows, chosen))
    return rows


def _count_unreadable(rows: Rows, part: Part) -> None:
    if not part.unreadable:
        return
    words = REASONS[-1]
    rows.read += part.unreadable
    rows.skipped[words] = rows.skipped.get(words, 0) + part.unreadable
    examples = rows.examples.setdefault(words, [])
    examples.extend(part.unreadable_examples[: EXAMPLES - len(examples)])


def _whole(part: Part, columns: list[str]) -> Iterator[Kept]:
    start = 0
    for batch in part.read(columns, True):
        yield Kept(start, batch.num_rows, batch, None)
        start += batch.num_rows


def _row_names(file: str | None) -> Callable[[int], str]:
    """Names of rows by their place in their file: counted from 1."""
    head = "row" if file is None else f"{file} row"
    return lambda at: f"{head} {at + 1:,}"


def _take(rows: Rows, piece: Kept, roles: Roles, where: str, name: Callable[[int], str]) -> None:
    batch = piece.batch
    rows.read += piece.rows
    rows.filtered += piece.rows - (0 if batch is None else batch.num_rows)
    rows.filtered_null += piece.unknown
    if batch is None:
        return
    source = convert_ids(batch.column(0), roles.id_type, roles.source, where)
    target = convert_ids(batch.column(1), roles.id_type, roles.target, where)
    weights: Floats | None = None
    null_weight: NDArray[np.bool_] | None = None
    if roles.weight is not None:
        weights, null_weight = to_floats(batch.column(2))
    reason = _reasons(source, target, weights, null_weight)
    if reason is not None:
        at = np.arange(batch.num_rows) if piece.at is None else piece.at
        _count_bad(rows, reason, (source, target, weights), at + piece.start, name)
        good = reason == 0
        mask = pa.array(good)
        source, target = source.filter(mask), target.filter(mask)
        weights = None if weights is None else weights[good]
    rows.kept += len(source)
    if len(source):
        rows.source.append(source)
        rows.target.append(target)
        if weights is not None:
            rows.weights.append(weights)


def to_floats(values: pa.Array) -> tuple[Floats, NDArray[np.bool_] | None]:
    """Numbers of any type as float64 (rounded where they are wider), and where they are null."""
    values = unwrap(values)
    nulls = null_mask(values)
    if pa.types.is_boolean(values.type):
        values = values.cast(pa.uint8())
    if values.type != pa.float64():
        values = values.cast(pa.float64(), safe=False)
    return np.asarray(values.to_numpy(zero_copy_only=False), dtype=np.float64), nulls


def null_mask(values: pa.Array) -> NDArray[np.bool_] | None:
    """Where values are null, or None if nowhere."""
    if values.null_count == 0:
        return None
    return np.asarray(values.is_null().to_numpy(zero_copy_only=False), dtype=bool)


def _reasons(
    source: pa.Array,
    target: pa.Array,
    weights: Floats | None,
    null_weight: NDArray[np.bool_] | None,
) -> NDArray[np.uint8] | None:
    """Per row 0, or 1 + the place of its trouble in REASONS; None where every row is good."""
    masks: list[NDArray[np.bool_] | None] = [null_mask(source), null_mask(target), null_weight]
    if weights is not None:
        low = weights.min(initial=0.0)  # NaN if any is
        high = weights.max(initial=0.0)
        fine = low >= 0 and high < np.inf
        masks += [None] * 3 if fine else [np.isnan(weights), np.isinf(weights), weights < 0]
    if all(mask is None for mask in masks):
        return None
    reason = np.zeros(len(source), dtype=np.uint8)
    for code in range(len(masks), 0, -1):  # the first trouble is written last
        mask = masks[code - 1]
        if mask is not None:
            reason[mask] = code
    return reason if reason.any() else None


def _count_bad(
    rows: Rows,
    reason: NDArray[np.uint8],
    columns: tuple[pa.Array, pa.Array, Floats | None],
    places: NDArray[np.int64],
    name: Callable[[int], str],
) -> None:
    source, target, weights = columns
    for code, words in enumerate(REASONS, 1):
        at = np.flatnonzero(reason == code)
        if not len(at):
            continue
        rows.skipped[words] = rows.skipped.get(words, 0) + len(at)
        examples = rows.examples.setdefault(words, [])
        for row in at[: EXAMPLES - len(examples)]:
            ends = f"{_shown(source[int(row)])} -> {_shown(target[int(row)])}"
            if weights is not None and code > 3:
                ends += f" weighs {weights[row]:g}"
            examples.append(f"{name(int(places[row]))}: {ends}")


def _shown(value: pa.Scalar) -> str:
    if not value.is_valid:
        return "null"
    try:
        return visible(id_text(value.as_py()), 40)
    except UnicodeDecodeError:
        return "text that is no UTF-8"


def _refusal(rows: Rows, bad_rows: str) -> str:
    bad = sum(rows.skipped.values())
    parts = [
        f"{rows.skipped[words]:,} with {words} ({rows.examples[words][0]})"
        for words in REASONS
        if words in rows.skipped
    ]
    head = f"{bad:,} of {count(rows.read, 'row')} cannot be used: {'; '.join(parts)}"
    if bad_rows == "refuse":
        return f"{head}; mend them, or leave them out with --bad-rows skip"
    return f"{head}; no row is left"


def _nothing_kept(rows: Rows, chosen: Filter) -> str:
    null = ""
    if rows.filtered_null:
        null = f" (for {rows.filtered_null:,} of them it is neither true nor false)"
    return (
        f"--where {visible(chosen.expression.text, 80)!r} is true for none of "
        f"{count(rows.read, 'row')}{null}; an edge table needs at least one"
    )
