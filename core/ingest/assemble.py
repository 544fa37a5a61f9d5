"""Numbered rows -> compressed adjacency: merge parallel edges by policy, then both directions.

Rows are sorted by target and then by source, both times by a stable counting sort, so parallel
edges meet in the order of their rows and sums depend on nothing else.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import RowsError
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.ingest.dictionaries import Codes
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.sorting import (
    Rows,
    Spare,
    dealt,
    dealt_rows,
    node_spans,
    settled,
    trimmed,
)
from kingpost.core.ingest.spread import each, spans
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
    """The numbered rows; handed over whole: whoever takes them writes over their memory."""

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
    spare = Spare(rows)
    rough = _by_source(ends, n, spare, watch)
    if options.directed and not len(rough.weights) and options.weight_as in ("asis", "none"):
        # Every row counts 1: folding both directions is less work than turning the counts round.
        turned = _turned(rough, spare, watch)
        whole = spare.whole
        del spare
        rough = _folded(rough, options, whole, watch)
        turned = _folded(turned, options, _NONE, watch)
        merged = rows - len(rough.near)
        return Assembled(rough.frozen(), turned.frozen(), loops, dropped, merged, 0)
    folded, zero = _merged(rough, labels, options, watch)
    merged = rows - len(folded.near) - zero
    if options.directed:
        inward = _turned(folded, spare, watch).frozen()
        outward = folded.frozen()
    else:
        outward = inward = _mirrored(folded, watch).frozen()
    return Assembled(outward, inward, loops, dropped, merged, zero)


def _by_source(ends: Ends, n: int, spare: Spare, watch: Watch) -> Rows:
    """Rows by source, then target, then as they came; parallel edges side by side."""
    from kingpost.core.kernels import build

    buckets = dealt(
        n,
        spans(len(ends.source)),
        ends.target,
        ends.weights,
        lambda a, b, *into: build.to_buckets(ends.target, ends.source, ends.weights, a, b, *into),
        spare,
        watch,
        "sorting edges by target",
    )
    spare.give(ends.source, ends.target, ends.weights)
    ends.clear()
    by_target = settled(buckets, n, spare, watch, "sorting edges by target")
    again = dealt_rows(by_target, spare, watch, "sorting edges by source")
    spare.give(by_target.near, by_target.weights)
    del by_target
    return settled(again, n, spare, watch, "sorting edges by source")


def _folded(rows: Rows, options: LoadOptions, room: Floats, watch: Watch) -> Rows:
    """Each neighbour once, weighing as many as there were where the policy says so.

    In place; the weights go to ``room`` if it is long enough.
    """
    from kingpost.core.kernels import build

    stage, pieces = "merging parallel edges", node_spans(rows.offsets)
    offsets = np.zeros_like(rows.offsets)
    each(
        pieces,
        lambda a, b: build.count_distinct(rows.offsets, rows.near, a, b, offsets[1:]),
        watch,
        stage,
    )
    np.cumsum(offsets, out=offsets)
    size = int(offsets[-1])
    if size == len(rows.near):
        return rows
    counts = _NONE
    if options.parallel in ("sum", "count"):
        counts = room[:size] if len(room) >= size else np.empty(size)
    each(
        pieces,
        lambda a, b: build.fold(rows.offsets, rows.near, a, b, offsets, counts),
        watch,
        stage,
    )
    for a, b in pieces:
        watch.check()
        start, to = int(rows.offsets[a]), int(offsets[a])
        if to < start:
            build.move_left(rows.near, start, int(offsets[b]) - to, to)
    return Rows(offsets, trimmed(rows.near, size), trimmed(counts, size))


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
        weights = trimmed(heavy, to)
    np.cumsum(lengths, out=lengths)
    return Rows(lengths, trimmed(rows.near, to), weights), int(states[:, 1].sum())


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


def _turned(rows: Rows, spare: Spare, watch: Watch) -> Rows:
    buckets = dealt_rows(rows, spare, watch, "turning edges round")
    turned = settled(buckets, len(rows.offsets) - 1, spare, watch, "turning edges round")
    m = len(rows.near)
    if m < spare.size:
        turned = Rows(turned.offsets, trimmed(turned.near, m), trimmed(turned.weights, m))
    return turned


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
