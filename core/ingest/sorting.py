"""Stable sorts of numbered rows by one end, in two steps of which each stays in the cache.

Rows are dealt out to buckets of neighbouring keys, then every bucket is settled by counting.
Pieces and buckets are independent of each other, so that threads change the speed and never a
bit.  An array that is done with is written again by a later step: new memory costs the system as
much time to clear as a sort takes to fill it.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np

from kingpost.core.graph import Adjacency, Floats, Offsets
from kingpost.core.ingest.dictionaries import Codes
from kingpost.core.ingest.spread import Span, each, spans
from kingpost.core.watch import Watch


@dataclass
class Rows:
    """An adjacency under way; ``weights`` is empty where every entry counts 1."""

    offsets: Offsets
    near: Codes
    weights: Floats

    def frozen(self) -> Adjacency:
        """The finished adjacency."""
        return Adjacency(self.offsets, self.near, self.weights if len(self.weights) else None)


@dataclass
class Buckets:
    """Rows dealt out by key: bucket b is ``starts[b]`` to ``starts[b + 1]``."""

    starts: Offsets
    shift: int
    keys: Codes
    others: Codes
    weights: Floats


class Spare:
    """Arrays of ``size`` entries that are done with, to be written again."""

    def __init__(self, size: int) -> None:
        self.size = size
        # Two halves of one array, which may become the weights of a whole direction.
        self.whole: Floats = np.empty(size)
        halves = self.whole.view(np.uint32)
        self._codes: list[Codes] = [halves[:size], halves[size:]]
        self._weights: list[Floats] = []

    def codes(self, size: int) -> Codes:
        """An array for node numbers; what is in it has no meaning."""
        return self._codes.pop()[:size] if self._codes else np.empty(size, dtype=np.uint32)

    def weights(self, size: int) -> Floats:
        """An array for weights; empty if ``size`` is 0."""
        return self._weights.pop()[:size] if size and self._weights else np.empty(size)

    def give(self, *arrays: Any) -> None:
        """Take back arrays nobody looks at any more."""
        for array in arrays:
            if len(array) == self.size > 0:
                mine: list[Any] = self._codes if array.dtype == np.uint32 else self._weights
                mine.append(array)


def dealt(
    n: int,
    pieces: list[Span],
    keys: Codes,
    weights: Floats,
    deal: Any,
    spare: Spare,
    watch: Watch,
    stage: str,
    offsets: Offsets | None = None,
) -> Buckets:
    """Stable: within a bucket come the pieces in order, and within a piece its rows."""
    from kingpost.core.kernels import build

    bits = max(n - 1, 0).bit_length()
    # Few enough buckets to write to side by side, few enough keys in each to sort in cache.
    shift = max(bits - 10, min(12, max(0, bits - 6)))
    counts = np.zeros((len(pieces), (max(n - 1, 0) >> shift) + 1), dtype=np.int64)
    number = {piece: at for at, piece in enumerate(pieces)}

    def count(a: int, b: int) -> None:
        first, last = (a, b) if offsets is None else (int(offsets[a]), int(offsets[b]))
        build.count_buckets(keys, first, last, shift, counts[number[a, b]])

    each(pieces, count, watch, stage)
    starts = np.zeros(counts.shape[1] + 1, dtype=np.int64)
    np.cumsum(counts.sum(axis=0), out=starts[1:])
    place = starts[:-1] + np.cumsum(counts, axis=0) - counts
    out = Buckets(
        starts,
        shift,
        spare.codes(len(keys)),
        spare.codes(len(keys)),
        spare.weights(len(weights)),
    )
    each(
        pieces,
        lambda a, b: deal(a, b, shift, place[number[a, b]], out.keys, out.others, out.weights),
        watch,
        stage,
    )
    return out


def dealt_rows(rows: Rows, spare: Spare, watch: Watch, stage: str) -> Buckets:
    """Deal an adjacency out by neighbour, in order of the nodes."""
    from kingpost.core.kernels import build

    return dealt(
        len(rows.offsets) - 1,
        node_spans(rows.offsets),
        rows.near,
        rows.weights,
        lambda a, b, *into: build.rows_to_buckets(
            rows.offsets, rows.near, rows.weights, a, b, *into
        ),
        spare,
        watch,
        stage,
        rows.offsets,
    )


def settled(buckets: Buckets, n: int, spare: Spare, watch: Watch, stage: str) -> Rows:
    """The adjacency of dealt rows; the buckets are spare afterwards."""
    from kingpost.core.kernels import build

    m = len(buckets.keys)
    rows = Rows(
        np.zeros(n + 1, dtype=np.int64),
        spare.codes(m),
        spare.weights(len(buckets.weights)),
    )

    def settle(bucket: int, _: int) -> None:
        build.settle(
            buckets.keys,
            buckets.others,
            buckets.weights,
            buckets.starts,
            bucket,
            buckets.shift,
            rows.offsets,
            rows.near,
            rows.weights,
        )

    each([(b, b + 1) for b in range(len(buckets.starts) - 1)], settle, watch, stage)
    rows.offsets[-1] = m
    spare.give(buckets.keys, buckets.others, buckets.weights)
    return rows


def trimmed(array: Any, size: int) -> Any:
    """Shorten an array whose memory nobody else looks at, in place where the allocator can."""
    if len(array) > size and array.flags.owndata:
        array.resize(size, refcheck=False)
    array = array[:size]
    # A part of something much longer would hold on to all of it.
    whole = array if array.base is None else array.base
    return array.copy() if array.nbytes < 0.9 * whole.nbytes else array


def node_spans(offsets: Offsets) -> list[Span]:
    """Ranges of nodes that hold some two million entries each; at least one."""
    cuts = [int(np.searchsorted(offsets[1:], b)) for _, b in spans(int(offsets[-1]))[:-1]]
    edges = sorted({0, *cuts, len(offsets) - 1})
    return list(pairwise(edges)) or [(0, 0)]
