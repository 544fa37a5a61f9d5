"""Numbered rows -> compressed adjacency: merge parallel edges by policy, then both directions.

Rows are sorted by target and then by source, both times by a stable counting sort, so parallel
edges meet in the order of their rows and sums depend on nothing else.  Every sort first deals
the rows out to buckets of neighbouring keys and then settles each bucket within the cache; spans
and buckets are independent of each other, so that threads change the speed and never a bit.
Arrays are let go of as soon as the next one is filled.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import RowsError
from kingpost.core.graph import Adjacency, Floats, Offsets
from kingpost.core.ingest.dictionaries import Codes
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.spread import Span, each, spans
from kingpost.core.text import id_text, visible
from kingpost.core.watch import Watch

_POLICIES = ("sum", "mean", "min", "max", "first", "count")
_CHANGES = {"asis": 0, "log1p": 1, "inverse": 2, "none": 0}
_NONE: Floats = np.empty(0, dtype=np.float64)


@dataclass(frozen=True)
class Assembled:
    """Both directions of the graph, and what became of the rows."""

    outward: Adjacency
    inward: Adjacency
    loops: int
    loops_dropped: int
    merged: int
    zero_weight: int


@dataclass
class Ends:
    """The numbered rows; handed over whole, so that whoever takes them can let them go."""

    source: Codes
    target: Codes
    weights: Floats

    def __init__(self, source: Codes, target: Codes, weights: Floats | None) -> None:
        self.source, self.target = source, target
        self.weights = _NONE if weights is None else weights

    def clear(self) -> None:
        """Let go of the arrays."""
        self.source = self.target = np.empty(0, dtype=np.uint32)
        self.weights = _NONE


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


def assemble(ends: Ends, labels: pa.Array, options: LoadOptions, watch: Watch) -> Assembled:
    """Build the adjacency of ``len(labels)`` nodes from numbered rows; ``ends`` is emptied.

    Raises:
        RowsError: if merged or inverted weights are too great for a number to hold.
        Interrupted: if the watch is cancelled.
    """
    from kingpost.core.kernels import build

    n = len(labels)
    loops = sum(
        each(
            spans(len(ends.source)),
            lambda a, b: build.count_loops(ends.source, ends.target, a, b),
            watch,
            "counting loops",
        )
    )
    dropped = loops if options.loops == "drop" else 0
    if dropped:
        kept = build.drop_loops(ends.source, ends.target, ends.weights)
        ends.source, ends.target = ends.source[:kept], ends.target[:kept]
        ends.weights = ends.weights[:kept]
    if not options.directed:
        each(
            spans(len(ends.source)),
            lambda a, b: build.order_ends(ends.source, ends.target, a, b),
            watch,
            "ordering ends",
        )
    rows = len(ends.source)
    rough = _by_source(ends, n, watch)
    folded, zero = _merged(rough, labels, options, watch)
    merged = rows - len(folded.near) - zero
    if options.directed:
        inward = _turned(folded, watch).frozen()
        outward = folded.frozen()
    else:
        outward = inward = _mirrored(folded, watch).frozen()
    return Assembled(outward, inward, loops, dropped, merged, zero)


def _by_source(ends: Ends, n: int, watch: Watch) -> Rows:
    """Rows by source, then target, then as they came; parallel edges side by side."""
    from kingpost.core.kernels import build

    buckets = _dealt(
        n,
        spans(len(ends.source)),
        ends.target,
        ends.weights,
        lambda a, b, *into: build.to_buckets(ends.target, ends.source, ends.weights, a, b, *into),
        watch,
        "sorting edges by target",
    )
    ends.clear()
    by_target = _settled(buckets, n, watch, "sorting edges by target")
    del buckets
    again = _dealt_rows(by_target, watch, "sorting edges by source")
    del by_target
    return _settled(again, n, watch, "sorting edges by source")


def _dealt_rows(rows: Rows, watch: Watch, stage: str) -> Buckets:
    """Deal an adjacency out by neighbour, in order of the nodes."""
    from kingpost.core.kernels import build

    return _dealt(
        len(rows.offsets) - 1,
        node_spans(rows.offsets),
        rows.near,
        rows.weights,
        lambda a, b, *into: build.rows_to_buckets(
            rows.offsets, rows.near, rows.weights, a, b, *into
        ),
        watch,
        stage,
        rows.offsets,
    )


def _dealt(
    n: int,
    pieces: list[Span],
    keys: Codes,
    weights: Floats,
    deal: Any,
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
        np.empty(len(keys), dtype=np.uint32),
        np.empty(len(keys), dtype=np.uint32),
        np.empty(len(weights)),
    )
    each(
        pieces,
        lambda a, b: deal(a, b, shift, place[number[a, b]], out.keys, out.others, out.weights),
        watch,
        stage,
    )
    return out


def _settled(buckets: Buckets, n: int, watch: Watch, stage: str) -> Rows:
    from kingpost.core.kernels import build

    m = len(buckets.keys)
    rows = Rows(
        np.zeros(n + 1, dtype=np.int64),
        np.empty(m, dtype=np.uint32),
        np.empty(len(buckets.weights)),
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
    return rows


def _merged(rows: Rows, labels: pa.Array, options: LoadOptions, watch: Watch) -> tuple[Rows, int]:
    """Fold parallel edges, apply the weight change, leave out zero weights (their number too)."""
    from kingpost.core.kernels import build

    stage = "merging parallel edges"
    pieces = node_spans(rows.offsets)
    weighted = len(rows.weights) > 0
    heavy = rows.weights
    if not weighted:
        repeats = sum(
            each(
                pieces,
                lambda a, b: build.count_repeats(rows.offsets, rows.near, a, b),
                watch,
                stage,
            )
        )
        counts = options.parallel in ("sum", "count") and repeats > 0
        if not repeats and options.weight_as != "log1p":
            return rows, 0
        if counts or options.weight_as == "log1p":
            heavy = np.empty(len(rows.near))
    states = np.zeros((len(pieces), 6), dtype=np.int64)
    number = {piece: at for at, piece in enumerate(pieces)}
    lengths = np.zeros(len(labels) + 1, dtype=np.int64)
    policy, change = _POLICIES.index(options.parallel), _CHANGES[options.weight_as]

    def merge(a: int, b: int) -> None:
        build.merge(
            rows.offsets,
            rows.near,
            rows.weights,
            heavy,
            a,
            b,
            policy,
            change,
            lengths[1:],
            states[number[a, b]],
        )

    each(pieces, merge, watch, stage)
    if states[:, 2].any():
        raise RowsError(_overflow(states, labels, options))
    to = 0
    for (a, _), state in zip(pieces, states, strict=True):
        watch.check()
        size, start = int(state[0]), int(rows.offsets[a])
        if to < start:
            build.move_left(rows.near, start, size, to)
            if len(heavy):
                build.move_left(heavy, start, size, to)
        to += size
    weights = _NONE
    if states[:, 5].any() and len(heavy):
        rows.weights = _NONE
        weights = _trimmed(heavy, to)
    np.cumsum(lengths, out=lengths)
    return Rows(lengths, _trimmed(rows.near, to), weights), int(states[:, 1].sum())


def _overflow(states: NDArray[np.int64], labels: pa.Array, options: LoadOptions) -> str:
    first = states[np.flatnonzero(states[:, 2])[0]]
    ends = [visible(id_text(labels[int(node)].as_py()), 40) for node in first[3:5]]
    how = f"--parallel {options.parallel}"
    if options.weight_as != "asis":
        how += f" and --weight-as {options.weight_as}"
    total = int(states[:, 2].sum())
    many = "1 edge becomes" if total == 1 else f"{total:,} edges become"
    return (
        f"the weight of {many} infinite by {how}, for example {ends[0]} -> {ends[1]}; "
        "scale the weights, or choose another policy"
    )


def _trimmed(array: Any, size: int) -> Any:
    """Shorten an array whose memory nobody else looks at, in place where the allocator can."""
    if len(array) > size:
        array.resize(size, refcheck=False)
    return array


def _turned(rows: Rows, watch: Watch) -> Rows:
    buckets = _dealt_rows(rows, watch, "turning edges round")
    return _settled(buckets, len(rows.offsets) - 1, watch, "turning edges round")


def _mirrored(upper: Rows, watch: Watch) -> Rows:
    """A symmetric adjacency from its upper triangle."""
    from kingpost.core.kernels import build

    n = len(upper.offsets) - 1
    offsets = np.zeros(n + 1, dtype=np.int64)
    weights = upper.weights
    pieces = node_spans(upper.offsets)
    for a, b in pieces:
        watch.check()
        build.mirror_counts(upper.offsets, upper.near, a, b, offsets[1:])
    np.cumsum(offsets, out=offsets)
    near = np.empty(int(offsets[-1]), dtype=np.uint32)
    heavy = np.empty(len(near) if len(weights) else 0)
    place = offsets[:-1].copy()
    for a, b in pieces:
        watch.check()
        watch.report("mirroring edges", int(upper.offsets[a]), len(upper.near), "edges")
        build.mirror(upper.offsets, upper.near, weights, a, b, place, near, heavy)
    return Rows(offsets, near, heavy)


def node_spans(offsets: Offsets) -> list[Span]:
    """Ranges of nodes that hold some two million entries each; at least one."""
    cuts = [int(np.searchsorted(offsets[1:], b)) for _, b in spans(int(offsets[-1]))[:-1]]
    edges = sorted({0, *cuts, len(offsets) - 1})
    return list(pairwise(edges)) or [(0, 0)]
