"""Which nodes must have exactly equal scores, because their equations are the same.

The coarsest partition in which two nodes of a class have the same right-hand side, the same
scale, and as many givers of every class with every weight.  The exact solution of
``x = b + B x``, and the Perron vector of an irreducible B, are constant on its classes: this is
what tells a true tie from two scores that the error bound cannot separate.

Colours are 64-bit hashes, so two different classes are taken for one with a probability of
about n^2 / 2^65: 2e-7 for 2.7 million nodes.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats
from kingpost.core.operators import Pull
from kingpost.core.parallel import each
from kingpost.core.watch import Watch

_ROUNDS = 200


def colours(matrix: Pull, b: Floats, watch: Watch) -> NDArray[np.int64] | None:
    """Classes of nodes with the same equations, shape (n,), numbered from 0.

    None where the partition is not stable after 200 rounds, or ``watch`` was cancelled: an
    unstable partition proves nothing.
    """
    from kingpost.core.kernels.colour import refine

    rows = matrix.rows
    bits = None if rows.weights is None else rows.weights.view(np.uint64)
    start = np.column_stack((np.broadcast_to(b, matrix.n), matrix.scale))
    _, first = np.unique(start + 0.0, axis=0, return_inverse=True)  # + 0.0: -0 is 0
    colour = first.astype(np.uint64).ravel()
    found = int(first.max(initial=0)) + 1
    if not matrix.scale.any():
        return first.astype(np.int64).ravel()
    for _ in range(_ROUNDS):
        if watch.cancelled:
            return None
        fresh = np.empty_like(colour)

        def piece(
            part: tuple[int, int],
            colour: NDArray[np.uint64] = colour,
            fresh: NDArray[np.uint64] = fresh,
        ) -> None:
            refine(rows.offsets, rows.neighbours, bits, *part, colour, fresh)

        each(piece, matrix.pieces, watch.threads)
        ordered = np.sort(fresh)
        kinds = int(np.count_nonzero(ordered[1:] != ordered[:-1])) + 1
        if kinds == found:
            classes = np.unique(fresh, return_inverse=True)[1]
            return classes.astype(np.int64).ravel()
        if kinds == matrix.n:
            return None  # every node is unlike every other: there are no ties to prove
        found, colour = kinds, fresh
    return None
