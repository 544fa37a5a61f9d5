"""Nodes in the order solvers visit them, with rows that lie in memory that way.

A sweep that visits rows in another order than they are stored in waits for memory at every row,
and scores that are asked for together are far apart.  With the nodes renumbered by condensation
order (and, inside components without a direction, by degree) a sweep over the R-MAT graph of the
bench takes about half the time; renumbering costs as much as one sweep or two.  The copy
takes as much memory as the rows it is made of, is kept with the structure, and is not made where
it could not pay: without cycles, or above two gigabytes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TypeVar, cast

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import Interrupted
from kingpost.core.graph import Adjacency, Floats
from kingpost.core.operators import Order, Pull
from kingpost.core.parallel import each
from kingpost.core.structure import Structure, row_pieces
from kingpost.core.watch import Watch

V = TypeVar("V", bound=np.generic)

_MOST = 2_000_000_000  # bytes; a fixed number, so that bits do not depend on the machine
_SHARE = 0.05  # of the edges must need iterating
_PIECE = 2_000_000  # edges
_LISTED = 1.5  # times as many edges, at most, where parallel ones are listed one by one


@dataclass(frozen=True)
class Layout:
    """A renumbering of the nodes: ``order[k]`` is the node at place k, shape (n,).

    ``structure`` and ``rows`` are those of the graph in the new numbers.  Rows are not ascending;
    where weights count parallel edges they may list these one by one instead.
    """

    order: Order
    structure: Structure
    rows: Adjacency

    def matrix(self, matrix: Pull) -> Pull:
        """``matrix``, whose rows the layout was made for, in the new numbers."""
        return Pull(self.rows, matrix.scale[self.order])

    def there(self, values: NDArray[V]) -> NDArray[V]:
        """``values`` by node, shape (n,), by place; those of shape (1,) as they are."""
        return values if len(values) == 1 else values[self.order]

    def back(self, values: NDArray[V]) -> NDArray[V]:
        """``values`` by place, shape (n,), by node."""
        out = np.empty_like(values)
        out[self.order] = values
        return out

    def apply_exactly(self, matrix: Pull, x: Floats, watch: Watch) -> tuple[Floats, Floats]:
        """``B x`` by compensated sums, and ``|B| |x|``, both by node, shape (n,)."""
        moved = self.matrix(matrix)
        places = np.arange(moved.n, dtype=np.uint32)
        product, size = moved.apply_exactly(self.there(x), places, 0, moved.n, watch)
        return self.back(product), self.back(size)


class _Same(Layout):
    """The numbering the graph has."""

    def matrix(self, matrix: Pull) -> Pull:
        return matrix

    def there(self, values: NDArray[V]) -> NDArray[V]:
        return values

    def back(self, values: NDArray[V]) -> NDArray[V]:
        return values


def layout(structure: Structure, rows: Adjacency, watch: Watch) -> Layout:
    """The layout to solve in for a matrix over ``rows``; made once and kept with ``structure``."""
    kept = cast("tuple[Adjacency, Layout] | None", structure.cache.get("layout"))
    if kept is not None and kept[0] is rows:
        return kept[1]
    size = rows.neighbours.nbytes + (0 if rows.weights is None else rows.weights.nbytes)
    same = _Same(structure.order, structure, rows)
    if structure.share_iterated < _SHARE or size > _MOST:
        return same
    try:
        made = _lay_out(structure, rows, watch)
    except Interrupted:
        return same
    structure.cache["layout"] = rows, made
    return made


def _lay_out(structure: Structure, rows: Adjacency, watch: Watch) -> Layout:
    from kingpost.core.kernels.rows import renumber

    order = structure.order
    n = len(order)
    lengths = _repeats(rows, watch)
    weights = rows.weights if lengths is None else None
    offsets = np.zeros(n + 1, dtype=np.int64)
    np.cumsum((rows.degrees if lengths is None else lengths)[order], out=offsets[1:])
    identity: NDArray[np.uint32] = np.arange(n, dtype=np.uint32)
    place = np.empty_like(identity)
    place[order] = identity
    near = np.empty(int(offsets[-1]), dtype=np.uint32)
    heavy = np.empty(0 if weights is None else len(near))
    diagonal = np.empty(n)

    def piece(part: tuple[int, int]) -> int:
        watch.check()
        found = renumber(
            rows.offsets, rows.neighbours, rows.weights, order, place, offsets, *part,
            near, heavy, diagonal,
        )  # fmt: skip
        return int(found)

    loops = sum(each(piece, row_pieces(offsets, _PIECE), watch.threads))
    moved = replace(
        structure, component=structure.component[order], order=identity, _outward=None, cache={}
    )
    laid = Adjacency(offsets, near, None if weights is None else heavy)
    laid.__dict__["loops"] = diagonal if loops else np.empty(0)  # not to be found by bisection here
    # Whoever solves in the new numbers need not renumber again.
    moved.cache["layout"] = laid, _Same(identity, moved, laid)
    return Layout(order, moved, laid)


def _repeats(rows: Adjacency, watch: Watch) -> NDArray[np.int64] | None:
    """Row lengths with every edge listed as often as it weighs, where that saves work."""
    from kingpost.core.kernels.rows import row_totals

    if rows.weights is None:
        return None
    totals = np.zeros(len(rows.offsets) - 1)

    def piece(part: tuple[int, int]) -> bool:
        watch.check()
        return bool(row_totals(rows.offsets, rows.weights, *part, totals))

    if not all(each(piece, row_pieces(rows.offsets, _PIECE), watch.threads)):
        return None
    # A listed edge costs 4 bytes and no product, a weighted one 12 bytes and one.
    if totals.sum() > _LISTED * len(rows.neighbours):
        return None
    return totals.astype(np.int64)
