"""Loops that turn numbered edge rows into compressed adjacency: counting sorts, stable throughout.

Every loop works on a range of rows or nodes, so that the caller can look up between calls
whether it should go on.  Codes are uint32, positions int64.  Indices are unsigned inside the
loops: a signed one costs a test for a wrap-around every time.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from kingpost.core.kernels._compile import kernel

SUM, MEAN, MIN, MAX, FIRST, COUNT = range(6)
ASIS, LOG1P, INVERSE = range(3)
_ONE = np.uint64(1)


@kernel()
def order_ends(source: Any, target: Any, first: int, last: int) -> None:
    """Let the smaller end come first: an undirected edge has one form."""
    for i in range(np.uint64(first), np.uint64(last)):
        if source[i] > target[i]:
            source[i], target[i] = target[i], source[i]


@kernel()
def drop_loops(source: Any, target: Any, weights: Any) -> int:
    """Close the gaps that self-loops leave; returns the number of rows that stay."""
    kept = np.uint64(0)
    weighted = len(weights) > 0
    for i in range(np.uint64(len(source))):
        if source[i] != target[i]:
            source[kept] = source[i]
            target[kept] = target[i]
            if weighted:
                weights[kept] = weights[i]
            kept += _ONE
    return np.int64(kept)  # type: ignore[return-value]


@kernel()
def count_loops(source: Any, target: Any, first: int, last: int) -> int:
    """Rows that lead from a node to itself."""
    found = 0
    for i in range(np.uint64(first), np.uint64(last)):
        found += source[i] == target[i]
    return found


@kernel()
def count_buckets(keys: Any, first: int, last: int, shift: int, counts: Any) -> None:
    """``counts[b] += 1`` for every key of bucket b, which holds the keys k with k >> shift = b."""
    down = np.uint64(shift)
    for i in range(np.uint64(first), np.uint64(last)):
        counts[np.uint64(keys[i]) >> down] += 1


@kernel()
def to_buckets(
    keys: Any,
    others: Any,
    weights: Any,
    first: int,
    last: int,
    shift: int,
    place: Any,
    out_keys: Any,
    out_others: Any,
    out_weights: Any,
) -> None:
    """Move rows to the next free place of their bucket; ``place`` holds the next places."""
    weighted = len(weights) > 0
    down = np.uint64(shift)
    for i in range(np.uint64(first), np.uint64(last)):
        key = np.uint64(keys[i])
        bucket = key >> down
        at = np.uint64(place[bucket])
        place[bucket] = at + _ONE
        out_keys[at] = key
        out_others[at] = others[i]
        if weighted:
            out_weights[at] = weights[i]


@kernel()
def rows_to_buckets(
    offsets: Any,
    near: Any,
    weights: Any,
    first: int,
    last: int,
    shift: int,
    place: Any,
    out_keys: Any,
    out_others: Any,
    out_weights: Any,
) -> None:
    """Like :func:`to_buckets` for an adjacency: the key is the neighbour, the other the node."""
    weighted = len(weights) > 0
    down = np.uint64(shift)
    for node in range(np.uint64(first), np.uint64(last)):
        for k in range(np.uint64(offsets[node]), np.uint64(offsets[node + _ONE])):
            key = np.uint64(near[k])
            bucket = key >> down
            at = np.uint64(place[bucket])
            place[bucket] = at + _ONE
            out_keys[at] = key
            out_others[at] = node
            if weighted:
                out_weights[at] = weights[k]


@kernel()
def settle(
    keys: Any,
    others: Any,
    weights: Any,
    starts: Any,
    bucket: int,
    shift: int,
    offsets: Any,
    near: Any,
    heavy: Any,
) -> None:
    """Sort one bucket by key, stably, into its part of the adjacency; fills its offsets.

    ``starts[bucket]`` to ``starts[bucket + 1]`` are the bucket's rows.  Its keys and rows are few
    enough to stay in cache, which is what the buckets are for.
    """
    n = len(offsets) - 1
    low = bucket << shift
    high = min(low + (1 << shift), n)
    begin, end = np.uint64(starts[bucket]), np.uint64(starts[bucket + 1])
    base = np.uint64(low)
    place = np.zeros(high - low + 1, dtype=np.uint64)
    for i in range(begin, end):
        place[np.uint64(keys[i]) - base + _ONE] += _ONE
    place[0] = begin
    for slot in range(high - low):
        place[slot + 1] += place[slot]
        offsets[low + slot] = place[slot]
    weighted = len(weights) > 0
    for i in range(begin, end):
        key = np.uint64(keys[i]) - base
        at = place[key]
        place[key] = at + _ONE
        near[at] = others[i]
        if weighted:
            heavy[at] = weights[i]


@kernel()
def mirror(
    offsets: Any, near: Any, weights: Any, first: int, last: int, place: Any, out: Any, heavy: Any
) -> None:
    """Complete an upper triangle (neighbours not below the node) to a symmetric adjacency.

    A row's lower neighbours have been written by the rows above it when its turn comes, so every
    row ends up ascending.
    """
    weighted = len(weights) > 0
    for node in range(np.uint64(first), np.uint64(last)):
        for k in range(np.uint64(offsets[node]), np.uint64(offsets[node + _ONE])):
            to = np.uint64(near[k])
            at = np.uint64(place[node])
            place[node] = at + _ONE
            out[at] = to
            if weighted:
                heavy[at] = weights[k]
            if to != node:
                at = np.uint64(place[to])
                place[to] = at + _ONE
                out[at] = node
                if weighted:
                    heavy[at] = weights[k]


@kernel()
def mirror_counts(offsets: Any, near: Any, first: int, last: int, counts: Any) -> None:
    """Row lengths of the symmetric adjacency that :func:`mirror` fills."""
    for node in range(np.uint64(first), np.uint64(last)):
        for k in range(np.uint64(offsets[node]), np.uint64(offsets[node + _ONE])):
            to = np.uint64(near[k])
            counts[node] += 1
            if to != node:
                counts[to] += 1


@kernel()
def count_repeats(offsets: Any, near: Any, first: int, last: int) -> int:
    """Entries that repeat their left neighbour in an ascending row."""
    found = 0
    for node in range(np.uint64(first), np.uint64(last)):
        for k in range(np.uint64(offsets[node]) + _ONE, np.uint64(offsets[node + _ONE])):
            found += near[k] == near[k - _ONE]
    return found


@kernel()
def count_distinct(offsets: Any, near: Any, first: int, last: int, lengths: Any) -> None:
    """``lengths[node]`` = different neighbours of each of the ascending rows."""
    for node in range(np.uint64(first), np.uint64(last)):
        start, end = np.uint64(offsets[node]), np.uint64(offsets[node + _ONE])
        found = 1 if end > start else 0
        for k in range(start + _ONE, end):
            found += near[k] != near[k - _ONE]
        lengths[node] = found


@kernel()
def fold(offsets: Any, near: Any, first: int, last: int, into_offsets: Any, rows: Any) -> None:
    """Leave every neighbour of rows ``first`` to ``last`` once, at the beginning of the range.

    ``rows``, if not empty, gets how many there were of each, at the places of ``into_offsets``,
    which have been counted.
    """
    write = np.uint64(offsets[first])
    place = np.uint64(into_offsets[first])
    counted = len(rows) > 0
    k: Any = write
    for node in range(np.uint64(first), np.uint64(last)):
        end = np.uint64(offsets[node + _ONE])
        while k < end:
            to = near[k]
            begin = k
            k += _ONE
            while k < end and near[k] == to:
                k += _ONE
            near[write] = to
            write += _ONE
            if counted:
                rows[place] = k - begin
                place += _ONE


@kernel()
def merge(
    offsets: Any,
    near: Any,
    weights: Any,
    heavy: Any,
    first: int,
    last: int,
    policy: int,
    change: int,
    lengths: Any,
    state: Any,
) -> None:
    """Fold equal neighbours of rows ``first`` to ``last`` and apply the weight change.

    In place: the results stand at the beginning of the range, and ``lengths`` gets the new
    lengths of its rows.  ``weights`` may be empty (every entry counts 1); ``heavy`` may be
    ``weights`` itself, or empty where results are not wanted.  ``state`` gets [entries left,
    edges of weight zero, entries whose weight is no finite number, row and neighbour of the
    first such entry, entries that weigh other than 1].
    """
    write = begin = np.uint64(offsets[first])
    weighted = len(weights) > 0
    kept = len(heavy) > 0
    for node in range(np.uint64(first), np.uint64(last)):
        row = write
        k, end = np.uint64(offsets[node]), np.uint64(offsets[node + _ONE])
        while k < end:
            to = near[k]
            value = weights[k] if weighted else 1.0
            rows = 1
            k += _ONE
            while k < end and near[k] == to:
                more = weights[k] if weighted else 1.0
                if policy <= MEAN:  # or SUM
                    value += more
                elif policy == MIN:
                    value = min(value, more)
                elif policy == MAX:
                    value = max(value, more)
                rows += 1
                k += _ONE
            if policy == MEAN:
                value /= rows
            elif policy == COUNT:
                value = float(rows)
            if value == 0.0:
                state[1] += 1
                continue
            fine = value < np.inf
            if change == LOG1P:
                value = math.log1p(value)
            elif change == INVERSE:
                value = 1.0 / value
            if not (fine and value < np.inf):
                if state[2] == 0:
                    state[3] = node
                    state[4] = to
                state[2] += 1
            if value != 1.0:
                state[5] += 1
            near[write] = to
            if kept:
                heavy[write] = value
            write += _ONE
        lengths[node] = write - row
    state[0] = write - begin


@kernel()
def move_left(values: Any, start: int, size: int, to: int) -> None:
    """``values[to : to + size] = values[start : start + size]`` where ``to <= start``."""
    come, go = np.uint64(start), np.uint64(to)
    for i in range(np.uint64(size)):
        values[go + i] = values[come + i]
