"""Dictionaries that give ids numbers in the order of first sight and grow as they fill."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import InputError

Codes = NDArray[np.uint32]
Order = NDArray[np.int64]
MOST_NODES = 2**32 - 1
_SLOTS = 1 << 12


class WholeDictionary:
    """Numbers for integers of up to 64 bits, kept as unsigned 64-bit words."""

    def __init__(self) -> None:
        self.table = np.zeros(2 * _SLOTS, dtype=np.uint64)
        self.keys = np.empty(_SLOTS // 2, dtype=np.uint64)
        self.known = 0

    def encode(self, chunk: pa.Array, codes: Codes, at: int) -> None:
        """Write the numbers of a chunk without nulls to ``codes`` from ``at`` on."""
        self.encode_values(chunk.to_numpy(zero_copy_only=True), codes, at)

    def encode_values(self, values: NDArray[Any], codes: Codes, at: int) -> None:
        """Like :meth:`encode`, for a numpy array."""
        from kingpost.core.kernels import ids

        state = np.array([0, self.known, 0], dtype=np.int64)
        while not ids.encode_whole(values, codes, at, self.table, self.keys, state):
            self.known = int(state[1])
            size = _grown(self.known, len(self.keys))
            self.keys = np.concatenate([self.keys, np.empty(size - len(self.keys), np.uint64)])
            self.table = np.zeros(4 * size, dtype=np.uint64)
            ids.rebuild_whole(self.keys, self.known, self.table)
        self.known = int(state[1])

    def absorb(self, other: WholeDictionary) -> Codes:
        """Numbers here of everything the other one knows, by its numbers."""
        codes = np.empty(other.known, dtype=np.uint32)
        self.encode_values(other.keys[: other.known], codes, 0)
        return codes

    def ids(self, kind: pa.DataType) -> pa.Array:
        """What it knows, by number, as an array of the integer type ``kind``."""
        words = self.keys[: self.known]
        return pa.array(words.view(np.int64) if pa.types.is_signed_integer(kind) else words).cast(
            kind
        )

    def order(self) -> Order | None:
        """No order quicker than Arrow's."""
        return None


@dataclass
class _Words:
    """The dictionary met last, which of its words were seen, and their numbers."""

    words: pa.Array
    seen: NDArray[np.uint8]
    numbers: Codes


def _shared(left: pa.Array, right: pa.Array) -> bool:
    """Whether two arrays are the same memory."""

    def place(array: pa.Array) -> list[object]:
        return [len(array), array.offset, *(part and part.address for part in array.buffers())]

    return place(left) == place(right)


class TextDictionary:
    """Numbers for byte strings, of which it keeps one copy each."""

    def __init__(self) -> None:
        self.table = np.zeros(_SLOTS, dtype=np.uint64)
        self.hashes = np.empty(_SLOTS // 2, dtype=np.uint64)
        self.ends = np.zeros(_SLOTS // 2 + 1, dtype=np.int64)
        self.store = np.empty(1 << 16, dtype=np.uint8)
        self.known = 0
        self._words: _Words | None = None

    def encode(self, chunk: pa.Array, codes: Codes, at: int) -> None:
        """Write the numbers of a chunk without nulls to ``codes`` from ``at`` on."""
        if pa.types.is_dictionary(chunk.type):
            self._encode_dictionary(chunk, codes, at)
            return
        _, ends, data = chunk.buffers()
        large = pa.types.is_large_string(chunk.type) or pa.types.is_large_binary(chunk.type)
        offsets = np.frombuffer(ends, dtype=np.int64 if large else np.int32)
        offsets = offsets[chunk.offset : chunk.offset + len(chunk) + 1]
        # An array of empty texts only may come without a buffer.
        letters = np.frombuffer(data if data is not None and data.size else b"\0", dtype=np.uint8)
        self._encode(offsets, letters, codes, at)

    def _encode_dictionary(self, chunk: pa.DictionaryArray, codes: Codes, at: int) -> None:
        """Only words that rows use get numbers; batches mostly share one dictionary."""
        from kingpost.core.kernels import ids

        words = chunk.dictionary
        if self._words is None or not _shared(self._words.words, words):
            size = len(words)
            self._words = _Words(words, np.zeros(size, np.uint8), np.empty(size, np.uint32))
        indices = chunk.indices.to_numpy(zero_copy_only=True)
        found = np.empty(min(len(indices), len(words)), dtype=np.int64)
        found = found[: ids.collect(indices, self._words.seen, found)]
        if len(found):
            numbers = np.empty(len(found), dtype=np.uint32)
            self.encode(words.take(pa.array(found)), numbers, 0)
            self._words.numbers[found] = numbers
        ids.renumber(indices, self._words.numbers, 0, len(indices), codes, at)

    def _encode(
        self, offsets: NDArray[Any], letters: NDArray[np.uint8], codes: Codes, at: int
    ) -> None:
        from kingpost.core.kernels import ids

        state = np.array([0, self.known, 0], dtype=np.int64)
        while not ids.encode_text(
            offsets, letters, codes, at, self.table, self.hashes, self.ends, self.store, state
        ):
            self.known = int(state[1])
            if self.known > len(self.hashes) - ids.BLOCK:
                size = _grown(self.known, len(self.hashes))
                more = size - len(self.hashes)
                self.hashes = np.concatenate([self.hashes, np.empty(more, np.uint64)])
                self.ends = np.concatenate([self.ends, np.empty(more, np.int64)])
                self.table = np.zeros(2 * size, dtype=np.uint64)
                ids.rebuild_text(self.hashes, self.known, self.table)
            else:  # the texts need room: twice as much, and for the next block at least
                row = int(state[0])
                last = min(row + ids.BLOCK, len(offsets) - 1)
                need = int(self.ends[self.known]) + int(offsets[last]) - int(offsets[row])
                # Not resized in place: a new array gets large pages, which halve the time.
                room = np.empty(max(2 * len(self.store), need), dtype=np.uint8)
                room[: int(self.ends[self.known])] = self.store[: int(self.ends[self.known])]
                self.store = room
        self.known = int(state[1])

    def absorb(self, other: TextDictionary) -> Codes:
        """Numbers here of everything the other one knows, by its numbers."""
        codes = np.empty(other.known, dtype=np.uint32)
        self._encode(other.ends[: other.known + 1], other.store, codes, 0)
        return codes

    def order(self) -> Order | None:
        """Numbers in ascending order of the bytes; None where that takes a full comparison.

        Two words of eight bytes after what all texts begin with tell most names apart.
        """
        from kingpost.core.kernels import ids

        everyone = np.arange(self.known)
        depth = ids.common_start(self.ends, self.known, self.store)

        def look(items: Order, depth: int) -> tuple[NDArray[np.uint64], NDArray[np.uint8]]:
            words = np.empty(len(items), dtype=np.uint64)
            sizes = np.empty(len(items), dtype=np.uint8)
            ids.words_at(self.ends, self.store, items, depth, words, sizes)
            return words, sizes

        words, _ = look(everyone, depth)
        order = np.argsort(words)
        words = words[order]
        again = np.concatenate(([False], words[1:] == words[:-1]))
        if not again.any():
            return order
        tied = again.copy()
        tied[:-1] |= again[1:]
        items = order[tied]
        _, sizes = look(items, depth)
        more, left = look(items, depth + 8)
        keys = (left, more, sizes, np.cumsum(~again)[tied])
        inner = np.lexsort(keys)
        if np.all([key[inner][1:] == key[inner][:-1] for key in keys], axis=0).any():
            return None
        order[tied] = items[inner]
        return order

    def ids(self, kind: pa.DataType) -> pa.Array:
        """What it knows, by number, as an array of the large type that goes with ``kind``."""
        text = pa.types.is_string(kind) or pa.types.is_large_string(kind)
        ends = self.ends[: self.known + 1].copy()
        letters = self.store[: int(ends[-1])]
        return pa.Array.from_buffers(
            pa.large_string() if text else pa.large_binary(),
            self.known,
            [None, pa.py_buffer(ends), pa.py_buffer(letters)],
        )


def _grown(known: int, size: int) -> int:
    if known > MOST_NODES - 1024:
        raise InputError(f"the table names more nodes than can be numbered ({MOST_NODES:,})")
    return 2 * size
