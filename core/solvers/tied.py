"""Whether components that no bracket can tell apart have exactly the same spectral radius.

Colour refinement inside the components gives an equitable partition of each; components whose
nodes show the same colours have the same quotient matrix, whose spectral radius is theirs
(Godsil and Royle, "Algebraic Graph Theory", 2001, section 9.3: the Perron vector of the quotient
lifts to a positive one).  Cycles of one length, cliques of one size and copies of one block are
told to tie exactly; for others nothing is proven.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kingpost.core.colours import colours
from kingpost.core.graph import Adjacency
from kingpost.core.operators import Pull
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch


def same_radius(
    matrix: Pull, structure: Structure, components: NDArray[np.int64], watch: Watch
) -> bool:
    """Whether the blocks of ``matrix`` on these components are proven to tie exactly."""
    rows = matrix.rows
    nodes = np.concatenate([structure.members(int(c)) for c in components]).astype(np.int64)
    lengths = rows.offsets[nodes + 1] - rows.offsets[nodes]
    at = np.arange(int(lengths.sum())) + np.repeat(
        rows.offsets[nodes] - np.cumsum(lengths) + lengths, lengths
    )
    taker, giver = np.repeat(nodes, lengths), rows.neighbours[at]
    inside = structure.component[taker] == structure.component[giver]
    place = np.zeros(matrix.n, dtype=np.uint32)
    place[nodes] = np.arange(len(nodes), dtype=np.uint32)
    offsets = np.zeros(len(nodes) + 1, dtype=np.int64)
    np.cumsum(np.bincount(place[taker[inside]], minlength=len(nodes)), out=offsets[1:])
    weights = None if rows.weights is None else np.ascontiguousarray(rows.weights[at[inside]])
    block = Adjacency(offsets, np.ascontiguousarray(place[giver[inside]]), weights)
    classes = colours(Pull(block, matrix.scale[nodes]), np.ones(1), watch)
    if classes is None:
        return False
    sizes = structure.sizes[components]
    kinds = [np.unique(part) for part in np.split(classes, np.cumsum(sizes)[:-1])]
    return all(np.array_equal(kinds[0], other) for other in kinds[1:])
