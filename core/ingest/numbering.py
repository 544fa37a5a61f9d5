"""Numbering ids: every id gets its place in ascending order, whatever the order of the rows.

Integers (and what is integer beneath: dates, times, bool) whose range is narrow are looked up
directly; everything else goes through Arrow's dictionary encoding over source and target
together, after which only the distinct ids are sorted.
"""

from __future__ import annotations

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.ingest.idtypes import from_integers, integer_type, to_integers
from kingpost.core.watch import Watch

Codes = NDArray[np.uint32]
MOST_NODES = 2**32 - 1
_SMALL_RANGE = 1 << 16
_TEXT_LIMIT = 2**31 - 2**20


def number_ids(
    source: list[pa.Array], target: list[pa.Array], kind: pa.DataType, watch: Watch
) -> tuple[pa.Array, Codes, Codes]:
    """Labels in ascending order and the numbers of both ends of every row.

    The lists are emptied: the ids are not needed any more once they have numbers.
    """
    whole = integer_type(kind)
    if whole is not None:
        source[:] = [to_integers(chunk, whole) for chunk in source]
        target[:] = [to_integers(chunk, whole) for chunk in target]
        low, high = _range(source + target)
        rows = sum(map(len, source))
        if high - low < max(_SMALL_RANGE, 2 * rows):
            labels, left, right = _direct(source, target, low, high, whole, watch)
            return from_integers(labels, kind), left, right
        labels, left, right = _hashed(source, target, watch)
        return from_integers(labels, kind), left, right
    if _is_small_text(kind) and _bytes(source) + _bytes(target) > _TEXT_LIMIT:
        large = pa.large_string() if pa.types.is_string(kind) else pa.large_binary()
        source[:] = [chunk.cast(large) for chunk in source]
        target[:] = [chunk.cast(large) for chunk in target]
    labels, left, right = _hashed(source, target, watch)
    if labels.type != kind and labels.nbytes < _TEXT_LIMIT:
        labels = labels.cast(kind)
    try:
        labels.validate(full=True)
    except pa.ArrowInvalid:
        raise InputError(
            "the ids hold text that is not valid UTF-8; mend it, or cast the id columns to binary"
        ) from None
    return labels, left, right


def _is_small_text(kind: pa.DataType) -> bool:
    return bool(pa.types.is_string(kind) or pa.types.is_binary(kind))


def _bytes(chunks: list[pa.Array]) -> int:
    return sum(chunk.nbytes for chunk in chunks)


def _range(chunks: list[pa.Array]) -> tuple[int, int]:
    ends = [pc.min_max(chunk) for chunk in chunks]
    return min(end["min"].as_py() for end in ends), max(end["max"].as_py() for end in ends)


def _direct(
    source: list[pa.Array],
    target: list[pa.Array],
    low: int,
    high: int,
    whole: pa.DataType,
    watch: Watch,
) -> tuple[pa.Array, Codes, Codes]:
    from kingpost.core.kernels import build

    base = np.uint64(low % 2**64)
    present = np.zeros(high - low + 1, dtype=np.uint8)
    total = sum(map(len, source))
    done = 0
    for side in (source, target):
        for chunk in side:
            watch.check()
            build.mark(_flat(chunk), base, present)
            done += len(chunk)
            watch.report("numbering ids", done, 4 * total, "ids")
    ranks = np.empty(len(present), dtype=np.uint32)
    n = int(np.count_nonzero(present))
    _check_size(n)
    build.number(present, ranks)
    values = np.flatnonzero(present).astype(np.uint64) + base
    labels = pa.array(values.view(np.int64) if low < 0 else values).cast(whole)
    codes = []
    for side in (source, target):
        numbers = np.empty(total, dtype=np.uint32)
        at = 0
        while side:
            watch.check()
            chunk = side.pop(0)
            build.look_up(_flat(chunk), base, ranks, numbers, at)
            at += len(chunk)
            done += len(chunk)
            watch.report("numbering ids", done, 4 * total, "ids")
        codes.append(numbers)
    return labels, codes[0], codes[1]


def _hashed(
    source: list[pa.Array], target: list[pa.Array], watch: Watch
) -> tuple[pa.Array, Codes, Codes]:
    from kingpost.core.kernels import build

    total = sum(map(len, source))
    watch.check()
    watch.report("numbering ids", 0, 4 * total, "ids")
    try:
        encoded = pa.chunked_array([*source, *target]).dictionary_encode()
    except pa.ArrowException as error:
        raise InputError(f"the ids cannot be numbered: {error}") from None
    pieces = encoded.chunks
    splits = len(source)
    source.clear()
    target.clear()
    del encoded
    # All chunks share the last state of one dictionary.
    distinct = pieces[-1].dictionary
    _check_size(len(distinct))
    watch.check()
    watch.report("sorting ids", 0, len(distinct), "ids")
    order = pc.array_sort_indices(distinct)
    labels = distinct.take(order)
    ranks = np.empty(len(distinct), dtype=np.uint32)
    ranks[order.to_numpy()] = np.arange(len(distinct), dtype=np.uint32)
    codes = []
    done = 2 * total
    for side in (pieces[:splits], pieces[splits:]):
        numbers = np.empty(total, dtype=np.uint32)
        at = 0
        for chunk in side:
            watch.check()
            build.renumber(_flat(chunk.indices), ranks, numbers, at)
            at += len(chunk)
            done += len(chunk)
            watch.report("numbering ids", done, 4 * total, "ids")
        codes.append(numbers)
    return labels, codes[0], codes[1]


def _flat(chunk: pa.Array) -> NDArray[np.generic]:
    return np.asarray(chunk.to_numpy(zero_copy_only=True))


def _check_size(n: int) -> None:
    if n > MOST_NODES:
        raise InputError(f"the table names {n:,} nodes; at most {MOST_NODES:,} can be numbered")
