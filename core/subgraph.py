"""A part of a graph as a graph of its own: some nodes and every edge among them."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Account, Adjacency, Graph
from kingpost.core.watch import Watch

_PIECE = 200_000  # nodes between two looks at whether to stop


def induced(graph: Graph, nodes: NDArray[Any], watch: Watch | None = None) -> Graph:
    """The subgraph induced by ``nodes`` (distinct, any order), O(k + their edges).

    Node i of it is the i-th of ``nodes`` in ascending order, so that numbers go by ids here too.
    Labels, weights and attributes are the graph's own; the account counts the edges kept and
    says in a note that this is a part.

    Raises:
        ValueError: if a node is named twice or is none of the graph's.
        Interrupted: if ``watch`` was cancelled.
    """
    import pyarrow as pa

    from kingpost.core.kernels.inside import OUTSIDE

    watch = watch or Watch()
    nodes = np.sort(np.asarray(nodes).astype(np.int64))
    if len(nodes) and (nodes[0] < 0 or nodes[-1] >= graph.n or (np.diff(nodes) == 0).any()):
        raise ValueError("nodes of a subgraph must be distinct nodes of the graph")
    number = np.full(graph.n, OUTSIDE, dtype=np.uint32)
    for start in range(0, len(nodes), _PIECE):
        part = nodes[start : start + _PIECE]
        number[part] = np.arange(start, start + len(part), dtype=np.uint32)
    outward = _rows(graph.outward, nodes, number, watch)
    inward = _rows(graph.inward, nodes, number, watch) if graph.directed else outward
    watch.check()
    picked = pa.array(nodes)
    kept = len(outward.neighbours)
    return Graph(
        graph.labels.take(picked),
        outward,
        inward,
        graph.directed,
        None if graph.attributes is None else graph.attributes.take(picked),
        Account(
            rows_read=kept,
            rows_kept=kept,
            notes=(
                f"a part of {len(nodes):,} of the {graph.n:,} nodes, with every edge among them",
            ),
        ),
        graph.origin,
    )


def _rows(side: Adjacency, nodes: Any, number: NDArray[np.uint32], watch: Watch) -> Adjacency:
    from kingpost.core.kernels.inside import copy_inside, count_inside

    counts = np.zeros(len(nodes), dtype=np.int64)
    for low in range(0, len(nodes), _PIECE):
        watch.check()
        watch.report("cutting out the part", low, len(nodes), "nodes")
        high = min(low + _PIECE, len(nodes))
        count_inside(side.offsets, side.neighbours, nodes, number, low, high, counts)
    offsets = np.zeros(len(nodes) + 1, dtype=np.int64)
    np.cumsum(counts, out=offsets[1:])
    near = np.empty(int(offsets[-1]), dtype=np.uint32)
    heavy = None if side.weights is None else np.empty(len(near))
    for low in range(0, len(nodes), _PIECE):
        watch.check()
        high = min(low + _PIECE, len(nodes))
        copy_inside(
            side.offsets, side.neighbours, side.weights, nodes, number, low, high, offsets,
            near, heavy,
        )  # fmt: skip
    return Adjacency(offsets, near, heavy)
