"""Loops that number ids: direct look-up for narrow integer ranges, hash tables for the rest.

The tables use open addressing with linear probing and give ids numbers in the order of first
sight.  Rows are taken in blocks: a first loop computes the hashes of a block and touches the
places it will need, so that the waits for memory overlap; a second loop does the work.
Equality is always decided on the ids themselves, never on hashes.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from kingpost.core.kernels._compile import kernel

BLOCK = 256
_MIX = np.uint64(0x9E3779B97F4A7C15)  # 2^64 / golden ratio, odd
_LOW = np.uint64(0xFFFFFFFF)
_HALF = np.uint64(32)
_ONE = np.uint64(1)
_EIGHT = np.uint64(8)


@kernel()
def mark(values: Any, low: Any, first: int, last: int, present: Any) -> None:
    """Set ``present[v - low]`` to 1 for every value; wraps correctly for any integer width."""
    for i in range(np.uint64(first), np.uint64(last)):
        present[np.uint64(values[i]) - low] = 1


@kernel()
def number(present: Any, ranks: Any) -> int:
    """Ranks of the marked slots in ascending order; returns how many there are."""
    found = 0
    for i in range(np.uint64(len(present))):
        ranks[i] = found
        found += present[i]
    return found


@kernel()
def look_up(values: Any, low: Any, first: int, last: int, ranks: Any, codes: Any, at: int) -> None:
    """``codes[at + i] = ranks[values[i] - low]``."""
    start = np.uint64(at)
    for i in range(np.uint64(first), np.uint64(last)):
        codes[start + i] = ranks[np.uint64(values[i]) - low]


@kernel()
def renumber(indices: Any, ranks: Any, first: int, last: int, codes: Any, at: int) -> None:
    """``codes[at + i] = ranks[indices[i]]``; codes may be the indices."""
    start = np.uint64(at)
    for i in range(np.uint64(first), np.uint64(last)):
        codes[start + i] = ranks[np.uint64(indices[i])]


@kernel()
def collect(indices: Any, seen: Any, found: Any) -> int:
    """The indices whose ``seen`` is still 0, once each in order; it becomes 1."""
    many = 0
    for i in range(len(indices)):
        at = np.uint64(indices[i])
        if seen[at] == 0:
            seen[at] = 1
            found[many] = at
            many += 1
    return many


@kernel()
def _scramble(key: Any) -> Any:
    key = (key ^ (key >> _HALF)) * _MIX
    key = (key ^ (key >> np.uint64(29))) * _MIX
    return key ^ (key >> _HALF)


@kernel()
def encode_whole(values: Any, codes: Any, at: int, table: Any, keys: Any, state: Any) -> bool:
    """Number 64-bit values from ``values[state[0]]`` on; ``state`` is [next row, ids known].

    ``table`` has two words a slot, id and number + 1, and a power of two of slots; ``keys`` gets
    the ids by number.  Returns False where it stops because either is about to be full.
    """
    rows = len(values)
    mask = np.uint64(len(table) // 2 - 1)
    limit = min(len(keys), len(table) // 4) - BLOCK
    slots = np.empty(BLOCK, dtype=np.uint64)
    touched = np.uint64(0)
    row, known = state[0], state[1]
    while row < rows and known <= limit:
        size = min(BLOCK, rows - row)
        for j in range(size):
            slot = _scramble(np.uint64(values[row + j])) & mask
            slots[j] = slot
            touched ^= table[slot << _ONE]
        for j in range(size):
            key = np.uint64(values[row + j])
            slot = slots[j]
            while True:
                number = table[(slot << _ONE) | _ONE]
                if number == 0:
                    table[slot << _ONE] = key
                    known += 1
                    number = np.uint64(known)
                    table[(slot << _ONE) | _ONE] = number
                    keys[known - 1] = key
                    break
                if table[slot << _ONE] == key:
                    break
                slot = (slot + _ONE) & mask
            codes[at + row + j] = number - _ONE
        row += size
    state[0], state[1] = row, known
    state[2] = np.int64(touched & _LOW)  # so that the touching is not optimised away
    return row == rows  # type: ignore[no-any-return]


@kernel()
def rebuild_whole(keys: Any, known: int, table: Any) -> None:
    """Fill an empty, larger table with the ids known."""
    mask = np.uint64(len(table) // 2 - 1)
    for i in range(known):
        slot = _scramble(keys[i]) & mask
        while table[(slot << _ONE) | _ONE] != 0:
            slot = (slot + _ONE) & mask
        table[slot << _ONE] = keys[i]
        table[(slot << _ONE) | _ONE] = i + 1


@kernel()
def _word(data: Any, at: Any) -> Any:
    # Eight single bytes, which the compiler turns into one load that need not be aligned.
    return (
        np.uint64(data[at])
        | np.uint64(data[at + np.uint64(1)]) << np.uint64(8)
        | np.uint64(data[at + np.uint64(2)]) << np.uint64(16)
        | np.uint64(data[at + np.uint64(3)]) << np.uint64(24)
        | np.uint64(data[at + np.uint64(4)]) << np.uint64(32)
        | np.uint64(data[at + np.uint64(5)]) << np.uint64(40)
        | np.uint64(data[at + np.uint64(6)]) << np.uint64(48)
        | np.uint64(data[at + np.uint64(7)]) << np.uint64(56)
    )


@kernel()
def _tail(data: Any, at: Any, end: Any) -> Any:
    word = np.uint64(0)
    while at < end:
        word = (word << _EIGHT) | np.uint64(data[at])
        at += _ONE
    return word


@kernel()
def _hash_text(data: Any, begin: Any, end: Any) -> Any:
    size = end - begin
    key = size * _MIX
    at = begin
    while at + _EIGHT <= end:
        key = (key ^ _word(data, at)) * _MIX
        key ^= key >> _HALF
        at += _EIGHT
    if at < end:
        # The last eight bytes once more are quicker than the rest one by one.
        rest = _word(data, end - _EIGHT) if size >= _EIGHT else _tail(data, at, end)
        key = (key ^ rest) * _MIX
        key ^= key >> _HALF
    return _scramble(key)


@kernel()
def _same_text(left: Any, at: Any, right: Any, to: Any, size: Any) -> bool:
    done = np.uint64(0)
    while done + _EIGHT <= size:
        if _word(left, at + done) != _word(right, to + done):
            return False
        done += _EIGHT
    if done < size:
        if size >= _EIGHT:
            return _word(left, at + size - _EIGHT) == _word(right, to + size - _EIGHT)  # type: ignore[no-any-return]
        return _tail(left, at, at + size) == _tail(right, to, to + size)  # type: ignore[no-any-return]
    return True


@kernel()
def encode_text(
    offsets: Any,
    data: Any,
    codes: Any,
    at: int,
    table: Any,
    hashes: Any,
    ends: Any,
    store: Any,
    state: Any,
) -> bool:
    """Number byte strings from row ``state[0]`` on; ``state`` is [next row, ids known].

    Row i is ``data[offsets[i] : offsets[i + 1]]``.  A slot of ``table`` holds the upper half of
    the hash and the number + 1; ``hashes`` the hash of every id, ``store`` their bytes one after
    another, ending at ``ends[number + 1]``.  Returns False where it stops because one of these
    is about to be full.
    """
    rows = len(offsets) - 1
    mask = np.uint64(len(table) - 1)
    limit = min(len(hashes), len(table) // 2) - BLOCK
    block = np.empty(BLOCK, dtype=np.uint64)
    near = np.empty(BLOCK, dtype=np.uint64)
    first = np.empty(BLOCK, dtype=np.uint64)
    touched = np.uint64(0)
    row, known = state[0], state[1]
    while row < rows and known <= limit:
        size = min(BLOCK, rows - row)
        if ends[known] + np.int64(offsets[row + size] - offsets[row]) > len(store):
            break
        for j in range(size):
            block[j] = _hash_text(
                data, np.uint64(offsets[row + j]), np.uint64(offsets[row + j + 1])
            )
        # Short loops without branches, so that many of their waits for memory go on at once.
        for j in range(size):
            near[j] = table[block[j] & mask] & _LOW
        for j in range(size):
            number = near[j]
            near[j] = np.uint64(ends[number])
            first[j] = np.uint64(ends[number - np.uint64(number != 0)])
        for j in range(size):  # a text may begin on one line of the cache and end on the next
            touched ^= np.uint64(store[first[j]])
            touched ^= np.uint64(store[near[j] - np.uint64(near[j] != 0)])
        for j in range(size):
            key = block[j]
            begin = np.uint64(offsets[row + j])
            length = np.uint64(offsets[row + j + 1]) - begin
            slot = key & mask
            while True:
                entry = table[slot]
                if entry == 0:
                    table[slot] = (key & ~_LOW) | np.uint64(known + 1)
                    hashes[known] = key
                    to = np.uint64(ends[known])
                    for k in range(length):
                        store[to + np.uint64(k)] = data[begin + np.uint64(k)]
                    ends[known + 1] = ends[known] + np.int64(length)
                    codes[at + row + j] = known
                    known += 1
                    break
                if (entry ^ key) >> _HALF == 0:
                    number = (entry & _LOW) - _ONE
                    to = np.uint64(ends[number])
                    if np.uint64(ends[number + _ONE]) - to == length and _same_text(
                        data, begin, store, to, length
                    ):
                        codes[at + row + j] = number
                        break
                slot = (slot + _ONE) & mask
        row += size
    state[0], state[1] = row, known
    state[2] = np.int64(touched & _LOW)  # so that the touching is not optimised away
    return row == rows  # type: ignore[no-any-return]


@kernel()
def rebuild_text(hashes: Any, known: int, table: Any) -> None:
    """Fill an empty, larger table with the ids known."""
    mask = np.uint64(len(table) - 1)
    for i in range(known):
        slot = hashes[i] & mask
        while table[slot] != 0:
            slot = (slot + _ONE) & mask
        table[slot] = (hashes[i] & ~_LOW) | np.uint64(i + 1)


@kernel()
def common_start(ends: Any, known: int, store: Any) -> int:
    """How many bytes all the texts of a store begin with alike."""
    alike = ends[1] - ends[0] if known else 0
    for i in range(1, known):
        alike = min(alike, ends[i + 1] - ends[i])
        k = 0
        while k < alike and store[ends[0] + k] == store[ends[i] + k]:
            k += 1
        alike = k
    return alike


@kernel()
def words_at(ends: Any, store: Any, items: Any, depth: int, words: Any, sizes: Any) -> None:
    """Eight bytes from ``depth`` on, as numbers that order as the bytes do; missing ones are 0.

    ``sizes`` gets how many of the eight there are.
    """
    for i in range(len(items)):
        at = ends[items[i]] + depth
        size = max(0, min(8, ends[items[i] + 1] - at))
        word = np.uint64(0)
        for k in range(size):
            word |= np.uint64(store[at + k]) << np.uint64(56 - 8 * k)
        words[i] = word
        sizes[i] = size
