"""Scores rescaled among peers, so that old papers or front doors do not win by age alone.

In a growing network a node's score follows its age (Mariani, Medo, Zhang, "Ranking nodes in
growing networks: when PageRank fails", Scientific Reports 5, 2015, arXiv 1509.01476).  The remedy
of the same authors is to compare a node with nodes of similar age::

    z_i = (x_i - m_i) / s_i

with m_i and s_i the mean and the standard deviation of the scores of i's peers, itself included.
Peers are the nodes of the same value (a tier, a team), or, for numbers and dates, a window of a
given number of nodes nearest in the order of the column, i in its middle, widened so that nodes
of one value are taken together or not at all.

Nothing is lost of the proof: with ``|x_j - exact_j| <= d_j`` the mean is within the mean of d, and
the standard deviation within the root mean square of d (it is a Euclidean norm of the centred
scores over the square root of their number), so z has an interval and its ranks are ranges.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.parallel import each
from kingpost.core.result import Bound, BoundKind, Result
from kingpost.core.standing import TIED, UNRANKED, Standing, stand
from kingpost.core.text import visible
from kingpost.core.watch import Watch

WINDOW = 1000  # peers of a node, as in the paper on citations
_MOST = 5e10  # entries of all windows together that are gone through
_PIECE = 2_000_000
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Cohorts:
    """What :func:`within` found; arrays have shape (n,).

    Attributes:
        column: the node attribute.
        window: number of peers of a moving window; None for groups of one value.
        groups: number of different values.
        peers: nodes each is compared with, itself included; 0 without a value.
        scores: z; NaN where the peers' scores do not differ, or there is no value.
        low, high: ends of the interval of z.
        first, last: rank among the peers that the node may truly have; -1 without a value.
        standing: the order by z of all nodes, those without z last and unranked.
        ranked: number of nodes with a z.
        alike: nodes whose peers (or only they themselves) score alike, to within the error
            bound: they have no z.
        valueless: nodes without a value.
    """

    column: str
    window: int | None
    groups: int
    peers: Ints
    scores: Floats
    low: Floats
    high: Floats
    first: Ints
    last: Ints
    standing: Standing
    ranked: int
    alike: int
    valueless: int

    @property
    def words(self) -> str:
        """What was done, in a sentence."""
        name = visible(self.column, 40)
        if self.window is None:
            whom = f"nodes of the same {name} ({self.groups:,} values)"
        else:
            whom = (
                f"the {self.window:,} nodes nearest by {name}, those of one value together "
                f"({self.groups:,} values)"
            )
        return (
            f"ranked by z, the score less the mean of its peers over their standard deviation; "
            f"peers are {whom} (Mariani, Medo, Zhang, arXiv 1509.01476)"
        )

    @property
    def left_out(self) -> str:
        """Who has no z, in words; empty where all have."""
        parts = []
        if self.alike:
            parts.append(f"{self.alike:,} with peers that all score alike, or none")
        if self.valueless:
            parts.append(f"{self.valueless:,} without a value")
        return f"not rescaled, and last: {', '.join(parts)}" if parts else ""


def within(
    graph: Graph,
    result: Result,
    column: str,
    window: int | None = None,
    watch: Watch | None = None,
) -> Cohorts:
    """Rescale the scores of ``result`` among peers by a node attribute.

    Args:
        column: name of the attribute.
        window: peers of a number or date, :data:`WINDOW` where None; a text has none.

    Raises:
        SettingsError: for a refused result, an attribute that does not exist or cannot be
            grouped by, or a window that is out of place or too large for this graph.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    if result.refusal is not None:
        raise SettingsError(f"{result.measure} has no answer here: {result.refusal.sentence}")
    values = _values(graph, column)
    numeric = _ordered(values.type)
    if window is not None and not numeric:
        raise SettingsError(
            f"--window is for numbers and dates; {column} is {values.type}, where peers are the "
            "nodes of the same value"
        )
    if window is not None and window < 2:
        raise SettingsError(f"--window is {window}; a node is compared with at least 2")
    size = (WINDOW if window is None else window) if numeric else None
    codes, groups = _codes(values)
    return _rescaled(result, column, size, codes, groups, watch)


def _values(graph: Graph, column: str) -> pa.ChunkedArray:
    table = graph.attributes
    names = [] if table is None else table.column_names
    if table is None or column not in names:
        have = f"there are {', '.join(map(visible, names))}" if names else "there are none: --nodes"
        raise SettingsError(f"--within {column}: no node attribute is called so; {have}")
    values = table.column(column)
    if pa.types.is_dictionary(values.type):
        values = pc.cast(values, values.type.value_type)
    if pa.types.is_nested(values.type) or pa.types.is_null(values.type):
        raise SettingsError(f"--within {column}: that attribute is {values.type}; no groups by it")
    if pa.types.is_floating(values.type):  # NaN is no value to be near to
        values = pc.if_else(pc.is_nan(values), pa.scalar(None, values.type), values)
    return values


def _ordered(kind: pa.DataType) -> bool:
    return bool(
        pa.types.is_integer(kind)
        or pa.types.is_floating(kind)
        or pa.types.is_decimal(kind)
        or pa.types.is_temporal(kind)
    )


def _codes(values: pa.ChunkedArray) -> tuple[Ints, int]:
    """The place of each value among the different ones, ascending; -1 for null."""
    encoded = values.combine_chunks().dictionary_encode()
    if isinstance(encoded, pa.ChunkedArray):
        encoded = encoded.combine_chunks()
    order = pc.sort_indices(encoded.dictionary).to_numpy(zero_copy_only=False)
    place = np.empty(len(order) + 1, dtype=np.int64)
    place[order] = np.arange(len(order))
    place[-1] = -1
    at = pc.fill_null(encoded.indices, -1).to_numpy(zero_copy_only=False).astype(np.int64)
    return place[at], len(order)


def _windows(counts: Ints, size: int | None) -> tuple[Ints, Ints]:
    """Left and right ends of the peers of each value, in the order of the values."""
    end = np.cumsum(counts)
    start = end - counts
    if size is None:
        return start, end
    total = int(end[-1])
    more = np.maximum(size - counts, 0)
    left = start - more // 2
    right = end + (more - more // 2)
    right += np.maximum(-left, 0)
    left -= np.maximum(right - total, 0)
    left, right = np.maximum(left, 0), np.minimum(right, total)
    # Values are taken whole: down to where the one begins, up to where the other ends.
    left = start[np.searchsorted(end, left, side="right")]
    right = end[np.searchsorted(end, right, side="left")]
    return left, right


def _rescaled(
    result: Result, column: str, size: int | None, codes: Ints, groups: int, watch: Watch
) -> Cohorts:
    from kingpost.core.kernels.windows import moments, ranks

    n = len(codes)
    valued = np.flatnonzero(codes >= 0)
    order = valued[np.argsort(codes[valued], kind="stable")]
    counts = np.bincount(codes[order], minlength=groups)[:groups].astype(np.int64)
    low, high = result.bound.interval(result.scores)
    if result.exact_zero is not None:
        low[result.exact_zero] = high[result.exact_zero] = 0.0
    none = np.full(n, -1, dtype=np.int64)
    z, below, above = np.full(n, np.nan), np.full(n, np.nan), np.full(n, np.nan)
    first, last, peers = none.copy(), none.copy(), np.zeros(n, dtype=np.int64)
    if len(order):
        left, right = _windows(counts, size)
        work = np.cumsum(right - left)
        if work[-1] > _MOST:
            raise SettingsError(
                f"--window {size:,} goes through {work[-1]:.1e} scores on this graph; choose a "
                "smaller one"
            )
        x, lows, highs = result.scores[order], low[order], high[order]
        reach = np.maximum(highs - x, x - lows)
        end = np.cumsum(counts)
        start = end - counts
        found = np.empty((groups, 5))
        a, b = np.empty(len(order), np.int64), np.empty(len(order), np.int64)

        def piece(part: tuple[int, int]) -> None:
            watch.check()
            watch.report("comparing peers", part[0], groups, "values")
            moments(x, reach, left, right, *part, found)
            ranks(lows, highs, start, end, left, right, *part, a, b)

        each(piece, _pieces(work), watch.threads)
        owner = np.repeat(np.arange(groups), counts)
        z[order], below[order], above[order] = _interval(
            x, reach, found[owner], (right - left)[owner]
        )
        peers[order] = (right - left)[owner]
        first[order], last[order] = a, b
    classes = _classes(result)
    _share(first, last, classes, codes, order)
    standing, ranked = _standing(z, below, above, classes, codes, size, result)
    valueless = n - len(order)
    return Cohorts(
        column, size, groups, peers, z, below, above, first, last, standing, ranked,
        n - ranked - valueless, valueless,
    )  # fmt: skip


def _pieces(work: Ints) -> list[tuple[int, int]]:
    marks = np.searchsorted(work, np.arange(_PIECE, int(work[-1]) + _PIECE, _PIECE)) + 1
    stops = np.unique(np.minimum(marks, len(work)))
    return list(zip(np.concatenate(([0], stops[:-1])).tolist(), stops.tolist(), strict=True))


def _interval(x: Floats, reach: Floats, found: Floats, size: Ints) -> tuple[Floats, Floats, Floats]:
    mean, spread, blur, root, weight = found.T
    # Sums of that many terms one after the other, and a few roundings more.
    rounding = (size + 16.0) * UNIT * (weight + spread)
    off = reach + blur + rounding + 4 * UNIT * np.abs(x - mean)
    thin, wide = spread - root - rounding, spread + root + rounding
    with np.errstate(divide="ignore", invalid="ignore"):
        z = np.where(thin > 0, (x - mean) / spread, np.nan)
        bottom, top = x - mean - off, x - mean + off
        low = np.where(bottom > 0, bottom / wide, bottom / thin)
        high = np.where(top > 0, top / thin, top / wide)
        if not np.isfinite(reach).all():  # no bound: no claim, and still an order
            z = np.where(np.isfinite(root) | (spread <= rounding), z, (x - mean) / spread)
            low = np.where(np.isfinite(reach), low, -np.inf)
            high = np.where(np.isfinite(reach), high, np.inf)
    return z, low - 4 * UNIT * np.abs(low), high + 4 * UNIT * np.abs(high)


def _classes(result: Result) -> Ints:
    """Class of every node: those tied in the result's own standing are in one."""
    standing = result.standing
    number = np.empty(len(result.scores), dtype=np.int64)
    new = np.concatenate(([0], np.cumsum(standing.rail[:-1] != TIED)))[: len(number)]
    number[standing.order] = new
    return number


def _share(first: Ints, last: Ints, classes: Ints, codes: Ints, order: Ints) -> None:
    """Tied nodes of one value share their ranks among peers."""
    if len(order) == 0:
        return
    by = order[np.lexsort((classes[order], codes[order]))]
    new = (np.diff(classes[by]) != 0) | (np.diff(codes[by]) != 0)
    heads = np.flatnonzero(np.concatenate(([True], new)))
    group = np.cumsum(np.concatenate(([0], new.astype(np.int64))))
    first[by] = np.minimum.reduceat(first[by], heads)[group]
    last[by] = np.maximum.reduceat(last[by], heads)[group]


def _standing(
    z: Floats,
    low: Floats,
    high: Floats,
    classes: Ints,
    codes: Ints,
    size: int | None,
    result: Result,
) -> tuple[Standing, int]:
    n = len(z)
    some = np.flatnonzero(~np.isnan(z))
    rest = result.standing.order[np.isnan(z[result.standing.order])]
    k = len(some)
    kind = result.bound.kind
    if k:
        keys = classes[some] * (int(codes.max()) + 1) + codes[some]
        same = np.unique(keys, return_inverse=True)[1]
        # z is about 0 where a score is like its peers': that is no score lost in its error.
        bottom = low[some][np.isfinite(low[some])]
        shift = 1.0 - float(bottom.min(initial=0.0))
        reach = np.maximum(high[some] - z[some], z[some] - low[some])
        reach = reach + 4 * UNIT * (np.abs(z[some]) + shift)
        part = stand(
            z[some] + shift,
            Bound(BoundKind.COMPONENTWISE if kind is BoundKind.EXACT else kind, 0.0, None, reach),
            None,
            same.ravel().astype(np.int64),
        )
        order = some[part.order]
        rail, first, last, proven = part.rail, part.first, part.last, part.proven
    else:
        order, proven = some, 0
        rail = np.empty(0, np.uint8)
        first = last = np.empty(0, np.int64)
    m = len(rest)
    return Standing(
        np.concatenate((order, rest)).astype(np.int64),
        np.concatenate((rail, np.full(m, UNRANKED, np.uint8))),
        np.concatenate((first, np.full(m, k + 1, np.int64))),
        np.concatenate((last, np.full(m, n, np.int64))),
        proven,
    ), k
