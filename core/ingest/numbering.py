"""Numbering ids: every id gets its place in ascending order, whatever the order of the rows.

Integers (and what is integer beneath: dates, times, bool) whose range is narrow are looked up
directly.  Other integers, text and binary go through hash tables, one for the sources and one
for the targets at the same time, which are then joined; decimals and binary of fixed size
through Arrow's dictionary encoding.  In the end only the distinct ids are sorted.
"""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.ingest.dictionaries import (
    MOST_NODES,
    Codes,
    Order,
    TextDictionary,
    WholeDictionary,
)
from kingpost.core.ingest.idtypes import from_integers, integer_type, to_integers
from kingpost.core.ingest.spread import PIECE, Span, each, spans
from kingpost.core.watch import Watch

_SMALL_RANGE = 1 << 16
_TEXT_LIMIT = 2**31 - 2**20
_STAGE = "numbering ids"
Sides = tuple[list[pa.Array], list[pa.Array]]


def number_ids(sides: Sides, kind: pa.DataType, watch: Watch) -> tuple[pa.Array, Codes, Codes]:
    """Labels in ascending order and the numbers of both ends of every row.

    The lists are emptied: the ids are not needed any more once they have numbers.

    Raises:
        InputError: for more ids than can be numbered, or text that is not UTF-8.
    """
    whole = integer_type(kind)
    if whole is not None:
        for side in sides:
            side[:] = [to_integers(chunk, whole) for chunk in side]
        low, high = _range(sides, watch)
        if high - low < max(_SMALL_RANGE, 2 * sum(map(len, sides[0]))):
            labels, source, target = _direct(sides, low, high, whole, watch)
        else:
            labels, source, target = _hashed(sides, WholeDictionary, whole, watch)
        return from_integers(labels, kind), source, target
    if pa.types.is_decimal(kind) or pa.types.is_fixed_size_binary(kind):
        return _by_arrow(sides, watch)
    labels, source, target = _hashed(sides, TextDictionary, kind, watch)
    if labels.type != kind and labels.nbytes < _TEXT_LIMIT:
        labels = labels.cast(kind)
    return labels, source, target


def _range(sides: Sides, watch: Watch) -> tuple[int, int]:
    chunks = [*sides[0], *sides[1]]

    def ends(a: int, b: int) -> tuple[int, int]:
        found = [pc.min_max(chunk) for chunk in chunks[a:b]]
        return min(end["min"].as_py() for end in found), max(end["max"].as_py() for end in found)

    found = each(_gathered(chunks), ends, watch, _STAGE)
    return min(low for low, _ in found), max(high for _, high in found)


def _gathered(chunks: list[Any]) -> list[Span]:
    """Ranges of chunks that hold about a piece of work each."""
    cuts, rows = [0], 0
    for at, chunk in enumerate(chunks, 1):
        rows += len(chunk)
        if rows >= PIECE // 2 or at == len(chunks):
            cuts.append(at)
            rows = 0
    return list(pairwise(cuts))


def _direct(
    sides: Sides, low: int, high: int, whole: pa.DataType, watch: Watch
) -> tuple[pa.Array, Codes, Codes]:
    from kingpost.core.kernels import ids

    base = np.uint64(low % 2**64)
    present = np.zeros(high - low + 1, dtype=np.uint8)
    chunks = [(flat(chunk), at) for side in sides for chunk, at in _placed(side)]
    half = len(sides[0])
    for side in sides:
        side.clear()
    pieces = _gathered([values for values, _ in chunks])

    def mark(a: int, b: int) -> None:
        for values, _ in chunks[a:b]:
            ids.mark(values, base, 0, len(values), present)

    each(pieces, mark, watch, _STAGE)
    check_size(int(np.count_nonzero(present)))
    ranks = np.empty(len(present), dtype=np.uint32)
    ids.number(present, ranks)
    values = np.flatnonzero(present).astype(np.uint64) + base
    labels = pa.array(values.view(np.int64) if low < 0 else values).cast(whole)
    rows = sum(len(values) for values, _ in chunks[:half])
    codes = [np.empty(rows, dtype=np.uint32) for _ in range(2)]

    def look_up(a: int, b: int) -> None:
        for at in range(a, b):
            values, start = chunks[at]
            ids.look_up(values, base, 0, len(values), ranks, codes[at >= half], start)

    each(pieces, look_up, watch, _STAGE)
    return labels, codes[0], codes[1]


def _placed(side: list[pa.Array]) -> list[tuple[pa.Array, int]]:
    """Chunks with the row each begins at."""
    starts = np.cumsum([0, *map(len, side)])
    return [(chunk, int(start)) for chunk, start in zip(side, starts[:-1], strict=True)]


def _hashed(
    sides: Sides, dictionary: Any, kind: pa.DataType, watch: Watch
) -> tuple[pa.Array, Codes, Codes]:
    rows = sum(map(len, sides[0]))
    codes = [np.empty(rows, dtype=np.uint32) for _ in sides]
    known = [dictionary(), dictionary()]

    def encode(side: int, _: int, known: list[Any] = known) -> None:
        chunks, at = sides[side], 0
        chunks.reverse()
        while chunks and not watch.cancelled:
            chunk = chunks.pop()
            known[side].encode(chunk, codes[side], at)
            at += len(chunk)
            if side == 0:
                watch.report(_STAGE, at, rows, "rows")

    each([(0, 1), (1, 2)], encode, watch, _STAGE)
    watch.check()
    moved = known[0].absorb(known.pop())
    labels = known[0].ids(kind)
    check_size(len(labels))
    watch.check()
    order = known[0].order()
    known.clear()
    labels, ranks = _sorted(labels, watch, order)
    _renumber(codes[0], ranks, watch)
    _renumber(codes[1], ranks[moved], watch)
    return labels, codes[0], codes[1]


def _sorted(labels: pa.Array, watch: Watch, order: Order | None = None) -> tuple[pa.Array, Codes]:
    """Ids in ascending order (given, or found here), and the place there of each."""
    watch.check()
    watch.report("sorting ids", 0, len(labels), "ids")
    if pa.types.is_string(labels.type) or pa.types.is_large_string(labels.type):
        try:
            labels.validate(full=True)
        except pa.ArrowInvalid:
            raise InputError(
                "the ids hold text that is not valid UTF-8; mend it, or cast the id columns to "
                "binary"
            ) from None
    if order is None:
        order = pc.array_sort_indices(labels).to_numpy()
    ranks = np.empty(len(labels), dtype=np.uint32)
    ranks[order] = np.arange(len(labels), dtype=np.uint32)
    watch.check()
    return labels.take(pa.array(order)), ranks


def _renumber(codes: Codes, ranks: Codes, watch: Watch) -> None:
    from kingpost.core.kernels import ids

    each(
        spans(len(codes)),
        lambda a, b: ids.renumber(codes, ranks, a, b, codes, 0),
        watch,
        _STAGE,
    )


def _by_arrow(sides: Sides, watch: Watch) -> tuple[pa.Array, Codes, Codes]:
    rows = sum(map(len, sides[0]))
    watch.check()
    watch.report(_STAGE, 0, rows, "rows")
    encoded = pa.chunked_array([chunk for side in sides for chunk in side]).dictionary_encode()
    for side in sides:
        side.clear()
    # All chunks share the last state of one dictionary.
    labels, ranks = _sorted(encoded.chunk(encoded.num_chunks - 1).dictionary, watch)
    indices = np.concatenate([flat(chunk.indices) for chunk in encoded.chunks])
    codes = indices.astype(np.uint32)
    _renumber(codes, ranks, watch)
    return labels, codes[:rows], codes[rows:]


def flat(chunk: pa.Array) -> NDArray[np.generic]:
    """The values of a chunk without nulls, not copied."""
    return np.asarray(chunk.to_numpy(zero_copy_only=True))


def check_size(n: int) -> None:
    """Refuse more nodes than 32 bits can number."""
    if n > MOST_NODES:
        raise InputError(f"the table names {n:,} nodes; at most {MOST_NODES:,} can be numbered")
