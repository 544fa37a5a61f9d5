"""Which nodes must have exactly equal scores, because their equations are the same.

The coarsest partition in which two nodes of a class have the same right-hand side and as many
givers of every class with every scale and weight.  The exact solution of
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
_VISITS = 400_000_000  # edges read before the search for ties is given up on a large graph


def colours(matrix: Pull, b: Floats, watch: Watch) -> NDArray[np.int64] | None:
    """Classes of nodes with the same equations, shape (n,), numbered from 0.

    None where the partition is not stable after 200 rounds or 400 million edge visits, or
    ``watch`` was cancelled: an unstable partition proves nothing.
    """
    from kingpost.core.kernels.colour import gifts, refine

    rows = matrix.rows
    bits = None if rows.weights is None else rows.weights.view(np.uint64)
    scale_bits = (matrix.scale + 0.0).view(np.uint64)  # + 0.0: -0 is 0
    kinds, start = np.unique(np.broadcast_to(b, matrix.n) + 0.0, return_inverse=True)
    colour = start.ravel().astype(np.uint64)
    found = len(kinds)
    gift = np.empty_like(colour)
    for _ in range(min(_ROUNDS, max(4, _VISITS // max(matrix.stored, 1)))):
        if watch.cancelled:
            return None
        fresh = np.empty_like(colour)
        gifts(colour, scale_bits, gift)

        def piece(
            part: tuple[int, int],
            colour: NDArray[np.uint64] = colour,
            fresh: NDArray[np.uint64] = fresh,
        ) -> None:
            refine(rows.offsets, rows.neighbours, bits, *part, colour, gift, fresh)

        each(piece, matrix.pieces, watch.threads)
        ordered = np.sort(fresh)
        seen = int(np.count_nonzero(ordered[1:] != ordered[:-1])) + 1
        if seen == found:
            classes = np.unique(fresh, return_inverse=True)[1]
            return classes.astype(np.int64).ravel()
        if seen == matrix.n:
            return None  # every node is unlike every other: there are no ties to prove
        found, colour = seen, fresh
    return None
