"""Loops that turn numbered edge rows into compressed adjacency: counting sorts, stable throughout.

Every loop works on a range of rows or nodes, so that the caller can look up between calls
whether it should go on.  Codes are uint32, positions int64.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from kingpost.core.kernels._compile import kernel

SUM, MEAN, MIN, MAX, FIRST, COUNT = range(6)
ASIS, LOG1P, INVERSE = range(3)


@kernel()
def mark(values: Any, low: Any, present: Any) -> None:
    """Set ``present[v - low]`` to 1 for every value; wraps correctly for any integer width."""
    for i in range(len(values)):
        present[np.uint64(values[i]) - low] = 1


@kernel()
def number(present: Any, ranks: Any) -> int:
    """Ranks of the marked slots in ascending order; returns how many there are."""
    found = 0
    for i in range(len(present)):
        ranks[i] = found
        found += present[i]
    return found


@kernel()
def look_up(values: Any, low: Any, ranks: Any, codes: Any, start: int) -> None:
    """``codes[start + i] = ranks[values[i] - low]``."""
    for i in range(len(values)):
        codes[start + i] = ranks[np.uint64(values[i]) - low]


@kernel()
def renumber(indices: Any, ranks: Any, codes: Any, start: int) -> None:
    """``codes[start + i] = ranks[indices[i]]``."""
    for i in range(len(indices)):
        codes[start + i] = ranks[np.uint64(indices[i])]


@kernel()
def order_ends(source: Any, target: Any, first: int, last: int) -> None:
    """Let the smaller end come first: an undirected edge has one form."""
    for i in range(first, last):
        if source[i] > target[i]:
            source[i], target[i] = target[i], source[i]


@kernel()
def drop_loops(source: Any, target: Any, weights: Any) -> int:
    """Close the gaps that self-loops leave; returns the number of rows that stay."""
    kept = 0
    weighted = len(weights) > 0
    for i in range(len(source)):
        if source[i] != target[i]:
            source[kept] = source[i]
            target[kept] = target[i]
            if weighted:
                weights[kept] = weights[i]
            kept += 1
    return kept


@kernel()
def count_loops(source: Any, target: Any, first: int, last: int) -> int:
    """Rows that lead from a node to itself."""
    found = 0
    for i in range(first, last):
        found += source[i] == target[i]
    return found


@kernel()
def tally(codes: Any, first: int, last: int, counts: Any) -> None:
    """Add to ``counts[c]`` the number of times code c occurs."""
    for i in range(first, last):
        counts[codes[i]] += 1


@kernel()
def scatter_rows(
    key: Any, other: Any, weights: Any, first: int, last: int, place: Any, near: Any, heavy: Any
) -> None:
    """Move row by row to the next free place of its key; ``place`` holds the next places."""
    weighted = len(weights) > 0
    for i in range(first, last):
        at = place[key[i]]
        place[key[i]] = at + 1
        near[np.uint64(at)] = other[i]
        if weighted:
            heavy[np.uint64(at)] = weights[i]


@kernel()
def transpose(
    offsets: Any, near: Any, weights: Any, first: int, last: int, place: Any, out: Any, heavy: Any
) -> None:
    """Turn rows ``first`` to ``last`` of an adjacency round; ``place`` holds the next places."""
    weighted = len(weights) > 0
    for node in range(first, last):
        for k in range(offsets[node], offsets[node + 1]):
            to = near[np.uint64(k)]
            at = place[to]
            place[to] = at + 1
            out[np.uint64(at)] = node
            if weighted:
                heavy[np.uint64(at)] = weights[np.uint64(k)]


@kernel()
def mirror(
    offsets: Any, near: Any, weights: Any, first: int, last: int, place: Any, out: Any, heavy: Any
) -> None:
    """Complete an upper triangle (neighbours not below the node) to a symmetric adjacency.

    A row's lower neighbours have been written by the rows above it when its turn comes, so every
    row ends up ascending.
    """
    weighted = len(weights) > 0
    for node in range(first, last):
        for k in range(offsets[node], offsets[node + 1]):
            to = near[k]
            at = place[node]
            place[node] = at + 1
            out[at] = to
            if weighted:
                heavy[at] = weights[k]
            if to != node:
                at = place[to]
                place[to] = at + 1
                out[at] = node
                if weighted:
                    heavy[at] = weights[k]


@kernel()
def mirror_counts(offsets: Any, near: Any, first: int, last: int, counts: Any) -> None:
    """Row lengths of the symmetric adjacency that :func:`mirror` fills."""
    for node in range(first, last):
        for k in range(offsets[node], offsets[node + 1]):
            counts[node] += 1
            if near[k] != node:
                counts[near[k]] += 1


@kernel()
def count_repeats(offsets: Any, near: Any, first: int, last: int) -> int:
    """Entries that repeat their left neighbour in an ascending row."""
    found = 0
    for node in range(first, last):
        for k in range(offsets[node] + 1, offsets[node + 1]):
            found += near[k] == near[k - 1]
    return found


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
    state: Any,
) -> None:
    """Fold equal neighbours of each row into one entry, in place, and apply the weight change.

    ``weights`` may be empty (every entry counts 1); results go to ``heavy``, which may be
    ``weights`` itself.  ``offsets[first]`` must be the old one; the new start of each row is
    written over it.  ``state`` holds [next free place, old start of row ``first``, zero edges,
    entries whose weight is no finite number, row and neighbour of the first such entry, entries
    that weigh other than 1].
    """
    write = state[0]
    begin = state[1]
    weighted = len(weights) > 0
    for node in range(first, last):
        end = offsets[node + 1]
        offsets[node] = write
        k = begin
        while k < end:
            to = near[k]
            value = weights[k] if weighted else 1.0
            rows = 1
            k += 1
            while k < end and near[k] == to:
                more = weights[k] if weighted else 1.0
                if policy <= MEAN:  # or SUM
                    value += more
                elif policy == MIN:
                    value = min(value, more)
                elif policy == MAX:
                    value = max(value, more)
                rows += 1
                k += 1
            if policy == MEAN:
                value /= rows
            elif policy == COUNT:
                value = float(rows)
            if value == 0.0:
                state[2] += 1
                continue
            fine = value < np.inf
            if change == LOG1P:
                value = math.log1p(value)
            elif change == INVERSE:
                value = 1.0 / value
            if not (fine and value < np.inf):
                if state[3] == 0:
                    state[4] = node
                    state[5] = to
                state[3] += 1
            if value != 1.0:
                state[6] += 1
            near[write] = to
            heavy[write] = value
            write += 1
        begin = end
    state[0] = write
    state[1] = begin


@kernel()
def merge_pattern(offsets: Any, near: Any, first: int, last: int, state: Any) -> None:
    """Fold equal neighbours where every edge weighs 1; ``state`` as in :func:`merge`."""
    write = state[0]
    begin = state[1]
    for node in range(first, last):
        end = offsets[node + 1]
        offsets[node] = write
        for k in range(begin, end):
            if k == begin or near[k] != near[write - 1]:
                near[write] = near[k]
                write += 1
        begin = end
    state[0] = write
    state[1] = begin
