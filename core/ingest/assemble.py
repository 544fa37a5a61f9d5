"""Numbered rows -> compressed adjacency: merge parallel edges by policy, then both directions.

Both passes are stable counting sorts, so parallel edges meet in the order of their rows and sums
do not depend on anything else.  Arrays are let go of as soon as the next one is filled.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import RowsError
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.ingest.numbering import Codes
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.text import id_text, visible
from kingpost.core.watch import Watch

_PIECE = 1 << 21  # rows or entries a kernel call works on: some 20 ms
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


class Ends:
    """The numbered rows; handed over whole, so that whoever takes them can let them go."""

    def __init__(self, source: Codes, target: Codes, weights: Floats | None) -> None:
        self.source = source
        self.target = target
        self.weights = _NONE if weights is None else weights

    def clear(self) -> None:
        """Let go of the arrays."""
        self.source = self.target = np.empty(0, dtype=np.uint32)
        self.weights = _NONE


def assemble(ends: Ends, labels: pa.Array, options: LoadOptions, watch: Watch) -> Assembled:
    """Build the adjacency of ``len(labels)`` nodes from numbered rows.

    Raises:
        RowsError: if merged or inverted weights are too great for a number to hold.
        Interrupted: if the watch is cancelled.
    """
    from kingpost.core.kernels import build

    n = len(labels)
    loops = sum(
        build.count_loops(ends.source, ends.target, a, b)
        for a, b in _spans(len(ends.source), watch, "counting loops")
    )
    dropped = 0
    if options.loops == "drop" and loops:
        kept = build.drop_loops(ends.source, ends.target, ends.weights)
        dropped = len(ends.source) - kept
        ends.source, ends.target = ends.source[:kept], ends.target[:kept]
        ends.weights = ends.weights[:kept]
    if not options.directed:
        for a, b in _spans(len(ends.source), watch, "ordering ends"):
            build.order_ends(ends.source, ends.target, a, b)
    rows = len(ends.source)
    rough = _sorted_rows(ends, n, watch)
    outward, zero = _merged(rough, labels, options, watch)
    merged = rows - len(outward.neighbours) - zero
    if options.directed:
        inward = _turned(outward, watch)
    else:
        outward = inward = _mirrored(outward, watch)
    return Assembled(outward, inward, loops, dropped, merged, zero)


def _sorted_rows(ends: Ends, n: int, watch: Watch) -> list[Any]:
    """Offsets, neighbours and weights by source, then target, then row, not yet merged."""
    from kingpost.core.kernels import build

    rows = len(ends.source)
    by_source = _offsets(
        n, lambda counts, a, b: build.tally(ends.source, a, b, counts), rows, watch
    )
    by_target = _offsets(
        n, lambda counts, a, b: build.tally(ends.target, a, b, counts), rows, watch
    )
    near = np.empty(rows, dtype=np.uint32)
    heavy = np.empty(len(ends.weights))
    place = by_target[:-1].copy()
    for a, b in _spans(rows, watch, "sorting edges by target"):
        build.scatter_rows(ends.target, ends.source, ends.weights, a, b, place, near, heavy)
    ends.clear()
    return _transposed(by_target, near, heavy, by_source, watch, "sorting edges by source")


def _transposed(
    offsets: NDArray[np.int64],
    near: Codes,
    heavy: Floats,
    turned: NDArray[np.int64],
    watch: Watch,
    stage: str,
) -> list[Any]:
    from kingpost.core.kernels import build

    out = np.empty(len(near), dtype=np.uint32)
    out_heavy = np.empty(len(heavy))
    place = turned[:-1].copy()
    for a, b in _node_spans(offsets, watch, stage):
        build.transpose(offsets, near, heavy, a, b, place, out, out_heavy)
    return [turned, out, out_heavy]


def _merged(
    rough: list[Any], labels: pa.Array, options: LoadOptions, watch: Watch
) -> tuple[Adjacency, int]:
    """Fold parallel edges, apply the weight change, leave out zero weights (their number too)."""
    from kingpost.core.kernels import build

    offsets, near, weights = rough
    rough.clear()
    spans = list(_node_spans(offsets, watch, "merging parallel edges"))
    state = np.zeros(7, dtype=np.int64)
    weighted = len(weights) > 0
    repeats = 0
    if not weighted:
        repeats = sum(build.count_repeats(offsets, near, a, b) for a, b in spans)
    counted = options.parallel in ("sum", "count") and repeats > 0
    if not weighted and not counted and options.weight_as != "log1p":
        for a, b in spans:
            watch.check()
            build.merge_pattern(offsets, near, a, b, state)
        offsets[-1] = state[0]
        return Adjacency(offsets, _trim(near, int(state[0]))), 0
    # Without a weight column results go to an array of their own, as long as the edges.
    heavy = weights if weighted else np.empty(len(near) - repeats)
    policy = _POLICIES.index(options.parallel)
    for a, b in spans:
        watch.check()
        build.merge(offsets, near, weights, heavy, a, b, policy, _CHANGES[options.weight_as], state)
    offsets[-1] = state[0]
    if state[3]:
        raise RowsError(_overflow(state, labels, options))
    kept = int(state[0])
    del weights, rough
    near = _trim(near, kept)
    return Adjacency(offsets, near, _trim(heavy, kept) if state[6] else None), int(state[2])


def _overflow(state: NDArray[np.int64], labels: pa.Array, options: LoadOptions) -> str:
    ends = [visible(id_text(labels[int(node)].as_py()), 40) for node in state[4:6]]
    how = f"--parallel {options.parallel}"
    if options.weight_as != "asis":
        how += f" and --weight-as {options.weight_as}"
    many = "1 edge becomes" if state[3] == 1 else f"{state[3]:,} edges become"
    return (
        f"the weight of {many} infinite by {how}, for example {ends[0]} -> {ends[1]}; "
        "scale the weights, or choose another policy"
    )


def _trim(array: Any, size: int) -> Any:
    """Shorten an array that nobody else refers to, in place where the allocator can."""
    if len(array) == size:
        return array
    array.resize(size, refcheck=False)
    return array


def _turned(outward: Adjacency, watch: Watch) -> Adjacency:
    from kingpost.core.kernels import build

    m = len(outward.neighbours)
    n = len(outward.offsets) - 1
    offsets = _offsets(
        n, lambda counts, a, b: build.tally(outward.neighbours, a, b, counts), m, watch
    )
    weights = _NONE if outward.weights is None else outward.weights
    offsets, near, heavy = _transposed(
        outward.offsets, outward.neighbours, weights, offsets, watch, "turning edges round"
    )
    return Adjacency(offsets, near, None if outward.weights is None else heavy)


def _mirrored(upper: Adjacency, watch: Watch) -> Adjacency:
    from kingpost.core.kernels import build

    n = len(upper.offsets) - 1
    offsets = np.zeros(n + 1, dtype=np.int64)
    spans = list(_node_spans(upper.offsets, watch, "mirroring edges"))
    for a, b in spans:
        build.mirror_counts(upper.offsets, upper.neighbours, a, b, offsets[1:])
    np.cumsum(offsets, out=offsets)
    near = np.empty(int(offsets[-1]), dtype=np.uint32)
    weights = _NONE if upper.weights is None else upper.weights
    heavy = np.empty(len(near) if len(weights) else 0)
    place = offsets[:-1].copy()
    for a, b in spans:
        watch.check()
        build.mirror(upper.offsets, upper.neighbours, weights, a, b, place, near, heavy)
    return Adjacency(offsets, near, heavy if len(weights) else None)


def _offsets(
    n: int, tally: Callable[[NDArray[np.int64], int, int], None], rows: int, watch: Watch
) -> NDArray[np.int64]:
    """Offsets of n rows from a kernel that counts a span of entries."""
    offsets = np.zeros(n + 1, dtype=np.int64)
    for a, b in _spans(rows, watch, "counting degrees"):
        tally(offsets[1:], a, b)
    np.cumsum(offsets, out=offsets)
    return offsets


def _spans(rows: int, watch: Watch, stage: str) -> Iterator[tuple[int, int]]:
    for a in range(0, rows, _PIECE):
        watch.check()
        watch.report(stage, a, rows, "rows")
        yield a, min(a + _PIECE, rows)
    watch.report(stage, rows, rows, "rows")


def _node_spans(offsets: NDArray[np.int64], watch: Watch, stage: str) -> Iterator[tuple[int, int]]:
    """Ranges of nodes that hold about _PIECE entries each."""
    n, m = len(offsets) - 1, int(offsets[-1])
    marks = np.arange(_PIECE, m, _PIECE)
    cuts = np.unique(np.concatenate(([0], np.searchsorted(offsets[1:], marks), [n])))
    for a, b in zip(cuts[:-1].tolist(), cuts[1:].tolist(), strict=True):
        watch.check()
        watch.report(stage, int(offsets[a]), m, "edges")
        yield a, b
    watch.report(stage, m, m, "edges")
