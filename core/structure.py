"""Where a graph's cycles are: strong components, their order, dangling nodes, period.

Everything a solver needs to know about the shape of a graph, found once and kept with it.  Score
flowing along the edges never returns to an earlier strong component, so components are numbered
in condensation order: along an edge the number stays or grows.  Nodes outside non-trivial
components are solved in one visit; only edges inside them need iterating.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.watch import Watch

_LEANING = 0.6  # share of the edges that must lead one way by number for numbers to be an order
_PIECE = 4_000_000  # edges a kernel call may visit before it looks whether it was cancelled


@dataclass(frozen=True)
class Structure:
    """Strong components of a directed graph in condensation order.

    Attributes:
        component: component number of each node, shape (n,), uint32.
        order: all nodes, component by component, shape (n,), uint32; inside a component by
            number, ascending or descending, whichever lets more edges lead onwards: ids often
            grow with time, and sweeps settle sooner the fewer edges lead back.  Where neither
            does clearly, those that meet most edges come first: what is asked for most often
            then lies together.
        starts: where each component begins in ``order``, shape (components + 1,), int64.
        inner: number of stored edges inside each non-trivial component, in the order of
            ``cyclic``, shape (k,), int64.
        cyclic: numbers of the components that hold a cycle (more than one node, or a
            self-loop), ascending, shape (k,), int64.
        stored: number of stored edges of the graph.
    """

    component: NDArray[np.uint32]
    order: NDArray[np.uint32]
    starts: NDArray[np.int64]
    cyclic: NDArray[np.int64]
    inner: NDArray[np.int64]
    stored: int
    _outward: Adjacency | None
    cache: dict[Any, Any] = field(default_factory=dict)  # what measures found out and keep

    @property
    def count(self) -> int:
        """Number of strong components, single nodes included."""
        return len(self.starts) - 1

    @property
    def acyclic(self) -> bool:
        """Whether there is no cycle, not even a self-loop."""
        return len(self.cyclic) == 0

    @property
    def share_iterated(self) -> float:
        """Share of the stored edges inside non-trivial components: what needs iterating."""
        return float(self.inner.sum()) / self.stored if self.stored else 0.0

    @cached_property
    def sizes(self) -> NDArray[np.int64]:
        """Number of nodes of every component."""
        return np.diff(self.starts)

    def members(self, component: int) -> NDArray[np.uint32]:
        """Nodes of one component, in the order of ``order``."""
        return self.order[self.starts[component] : self.starts[component + 1]]

    def period(self, component: int) -> int:
        """Greatest common divisor of the lengths of a component's cycles; 0 if it has none."""
        from kingpost.core.kernels.components import cycle_gcd

        nodes = self.members(component)
        level = np.full(len(self.component), -1, dtype=np.int64)
        queue = np.empty(len(nodes), dtype=np.uint32)
        out = self._outward
        assert out is not None, "not known of a renumbered structure"
        return int(
            cycle_gcd(out.offsets, out.neighbours, self.component, int(nodes[0]), level, queue)
        )


def analyse(graph: Graph, watch: Watch | None = None) -> Structure:
    """Find the strong components of ``graph`` in condensation order.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    from kingpost.core.kernels import components as kernels

    watch = watch or Watch()
    out, n = graph.outward, graph.n
    down = up = 0
    for low, high in row_pieces(out.offsets, _PIECE):
        watch.check()
        falls, rises = kernels.backward_edges(out.offsets, out.neighbours, low, high)
        down, up = down + falls, up + rises
    if down == 0 or up == 0:
        # The numbering of the nodes is a topological order already, or its reverse.
        order = np.arange(n, dtype=np.uint32)
        component = order if down == 0 else order[::-1].copy()
        starts = np.arange(n + 1, dtype=np.int64)
        order = component
    else:
        component, found = _strong(out, n, watch)
        counts = np.bincount(component, minlength=found)
        starts = np.zeros(found + 1, dtype=np.int64)
        np.cumsum(counts, out=starts[1:])
        order = np.empty(n, dtype=np.uint32)
        if max(down, up) >= _LEANING * (down + up):
            along = np.arange(n, dtype=np.uint32)
            visit = along[::-1] if down > up else along
        else:
            visit = _by_degree(graph)
        kernels.group_order(component, starts[:-1].copy(), np.ascontiguousarray(visit), order)
    return _finish(component, order, starts, graph, watch)


def structure_of(graph: Graph, watch: Watch) -> Structure:
    """``graph.structure``, looked for where that can be cancelled if it is not known yet.

    Raises:
        Interrupted: if ``watch`` was cancelled.
    """
    if "structure" not in graph.__dict__:
        graph.__dict__["structure"] = analyse(graph, watch)
    return graph.structure


def _by_degree(graph: Graph) -> NDArray[np.uint32]:
    """All nodes, those that meet most edges first, ties by number."""
    met = np.minimum(graph.outward.degrees + graph.inward.degrees, 65_535)
    # 16 bits: numpy sorts those by counting.
    return np.argsort((65_535 - met).astype(np.uint16), kind="stable").astype(np.uint32)


def _strong(out: Adjacency, n: int, watch: Watch) -> tuple[NDArray[np.uint32], int]:
    from kingpost.core.kernels import components as kernels

    state = np.zeros(5, dtype=np.int64)
    index = np.full(n, kernels.UNSEEN, dtype=np.uint32)
    cursor = np.empty(n, dtype=np.int64)
    stack, path = np.empty(n, dtype=np.uint32), np.empty(n, dtype=np.uint32)
    done = False
    while not done:
        watch.check()
        done = kernels.strong(
            out.offsets, out.neighbours, state, index, cursor, stack, path, _PIECE
        )
        watch.report("finding strong components", min(int(state[0]), n), n, "nodes")
    found = int(state[4])
    return index - np.uint32(n - found), found


def _finish(
    component: NDArray[np.uint32],
    order: NDArray[np.uint32],
    starts: NDArray[np.int64],
    graph: Graph,
    watch: Watch,
) -> Structure:
    from kingpost.core.kernels import components as kernels

    out, count = graph.outward, len(starts) - 1
    counts = np.zeros(count, dtype=np.int64)
    for low, high in row_pieces(out.offsets, _PIECE):
        watch.check()
        kernels.edges_inside(out.offsets, out.neighbours, component, low, high, counts)
    cyclic = np.flatnonzero(counts)
    return Structure(component, order, starts, cyclic, counts[cyclic], graph.stored, graph.outward)


def weak_components(graph: Graph, watch: Watch | None = None) -> NDArray[np.uint32]:
    """For each node the lowest number in its weakly connected component, shape (n,)."""
    from kingpost.core.kernels import components as kernels

    watch = watch or Watch()
    parent = np.arange(graph.n, dtype=np.uint32)
    out = graph.outward
    for low, high in row_pieces(out.offsets, _PIECE):
        watch.check()
        kernels.unite(out.offsets, out.neighbours, low, high, parent)
    kernels.find_roots(parent)
    return parent


def reachable(
    push: Adjacency, start: NDArray[np.uint32], watch: Watch | None = None
) -> NDArray[np.bool_]:
    """Which nodes can be reached from ``start`` (itself included), shape (n,)."""
    from kingpost.core.kernels.rows import spread

    watch = watch or Watch()
    n = len(push.offsets) - 1
    seen = np.zeros(n, dtype=bool)
    seen[start] = True
    queue = np.empty(n, dtype=np.uint32)
    head, tail = 0, len(start)
    queue[:tail] = start
    while head < tail:
        watch.check()
        head, tail = spread(push.offsets, push.neighbours, queue, head, tail, seen, _PIECE)
    return seen


def downstream(
    structure: Structure, pull: Adjacency, push: Adjacency, component: int, flow: str, watch: Watch
) -> NDArray[np.bool_]:
    """Members of ``component`` and everything that score flows to from them, shape (n,)."""
    from kingpost.core.kernels.rows import reach_on

    n = len(structure.order)
    members = structure.members(component)
    live = np.zeros(n, dtype=bool)
    live[members] = True
    # Only what comes later in the order of the flow can be downstream; it is often little.
    if flow == "along":
        order, after = structure.order, int(structure.starts[component + 1])
    else:
        order = np.ascontiguousarray(structure.order[::-1])
        after = n - int(structure.starts[component])
    for _ in range(4):
        watch.check()
        if not reach_on(pull.offsets, pull.neighbours, order, after, n, live):
            return live
    return reachable(push, members, watch)  # long ways against the order


def row_pieces(offsets: NDArray[np.int64], edges: int) -> Iterator[tuple[int, int]]:
    """Cut the rows into consecutive ranges of about ``edges`` edges (and as many nodes) each."""
    n = len(offsets) - 1
    low = 0
    while low < n:
        high = int(np.searchsorted(offsets, offsets[low] + edges, side="right")) - 1
        high = min(max(high, low + 1), low + edges, n)
        yield low, high
        low = high
