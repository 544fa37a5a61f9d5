"""What every generator returns: a number of nodes and the end points of the edges."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kingpost.core.gallery.chance import bits

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class EdgeList:
    """Edges ``source[k] -> target[k]`` over nodes 0..n-1; ``weight`` None means 1 each.

    Arrays have shape (m,).  Parallel edges and self-loops may occur where the generator says so.
    With ``directed`` false each undirected edge is listed once.
    """

    n: int
    source: Ints
    target: Ints
    weight: Floats | None = None
    directed: bool = True

    @property
    def m(self) -> int:
        """Number of listed edges."""
        return len(self.source)

    def distinct(self, *, loops: bool = True) -> EdgeList:
        """The same without repeated edges (the first weight stays), ascending by end points.

        ``loops=False`` leaves self-loops out too.
        """
        low, high = self.source, self.target
        if not self.directed:
            low, high = np.minimum(low, high), np.maximum(low, high)
        _, first = np.unique(low * np.int64(self.n) + high, return_index=True)
        if not loops:
            first = first[low[first] != high[first]]
        weight = None if self.weight is None else self.weight[first]
        return EdgeList(self.n, low[first], high[first], weight, self.directed)

    def shuffled(self, seed: int) -> EdgeList:
        """The same graph under a random renumbering of its nodes; holds two arrays of n."""
        keys = bits(seed, 101, np.arange(self.n, dtype=np.uint64))
        order = np.argsort(keys, kind="stable").astype(np.int64)
        return EdgeList(self.n, order[self.source], order[self.target], self.weight, self.directed)
