"""Small shapes whose centralities can be written down: paths, stars, cycles, cliques, grids."""

from __future__ import annotations

import numpy as np

from kingpost.core.errors import SettingsError
from kingpost.core.gallery.chance import below
from kingpost.core.gallery.edges import EdgeList, Ints


def _need(smallest: int, **sizes: int) -> None:
    for name, size in sizes.items():
        if size < smallest:
            raise SettingsError(f"{name} must be at least {smallest}, not {size}")


def _ids(count: int) -> Ints:
    return np.arange(count, dtype=np.int64)


def path(n: int) -> EdgeList:
    """0 -> 1 -> ... -> n-1."""
    _need(1, n=n)
    return EdgeList(n, _ids(n - 1), _ids(n - 1) + 1)


def star(n: int, *, inward: bool = True) -> EdgeList:
    """Nodes 1..n-1 all point at node 0, or with ``inward=False`` node 0 at all of them."""
    _need(1, n=n)
    leaves, centre = _ids(n - 1) + 1, np.zeros(n - 1, np.int64)
    return EdgeList(n, leaves, centre) if inward else EdgeList(n, centre, leaves)


def cycle(n: int) -> EdgeList:
    """0 -> 1 -> ... -> n-1 -> 0: period n; a self-loop for n = 1."""
    _need(1, n=n)
    return EdgeList(n, _ids(n), (_ids(n) + 1) % n)


def complete(n: int) -> EdgeList:
    """Every ordered pair of different nodes: rho = n - 1."""
    _need(1, n=n)
    source, target = np.repeat(_ids(n), n), np.tile(_ids(n), n)
    keep = source != target
    return EdgeList(n, source[keep], target[keep])


def bipartite(left: int, right: int, *, both: bool = False) -> EdgeList:
    """Nodes 0..left-1 point at each of the ``right`` others; ``both``: and back, period 2.

    With ``both``, rho = sqrt(left * right) and -rho is an eigenvalue too.
    """
    _need(1, left=left, right=right)
    source = np.repeat(_ids(left), right)
    target = np.tile(_ids(right) + left, left)
    if both:
        source, target = np.concatenate([source, target]), np.concatenate([target, source])
    return EdgeList(left + right, source, target)


def clique_chain(cliques: int, size: int) -> EdgeList:
    """Complete graphs of ``size`` nodes, each one's last node pointing at the next one's first.

    Strong components are the cliques; all tie for rho = size - 1.
    """
    _need(1, cliques=cliques, size=size)
    one = complete(size)
    base = np.repeat(_ids(cliques) * size, one.m)
    bridge = _ids(cliques - 1) * size + size - 1
    source = np.concatenate([np.tile(one.source, cliques) + base, bridge])
    target = np.concatenate([np.tile(one.target, cliques) + base, bridge + 1])
    return EdgeList(cliques * size, source, target)


def grid(rows: int, columns: int) -> EdgeList:
    """The undirected grid; node ``row * columns + column``."""
    _need(1, rows=rows, columns=columns)
    place = _ids(rows * columns).reshape(rows, columns)
    source = np.concatenate([place[:, :-1].ravel(), place[:-1, :].ravel()])
    target = np.concatenate([place[:, 1:].ravel(), place[1:, :].ravel()])
    return EdgeList(rows * columns, source, target, directed=False)


def layered_dag(layers: int, width: int, per_node: int, *, seed: int = 0) -> EdgeList:
    """Every node of a layer points at ``per_node`` random nodes of the next; acyclic.

    Node ``layer * width + place``.  Parallel edges may occur.
    """
    _need(1, layers=layers, width=width)
    _need(0, per_node=per_node)
    source = np.repeat(_ids((layers - 1) * width), per_node)
    place = below(width, seed, 1, np.arange(len(source), dtype=np.uint64))
    return EdgeList(layers * width, source, (source // width + 1) * width + place)


def two_tied_components(size: int, *, bridge: bool = False) -> EdgeList:
    """Two complete graphs of ``size`` nodes that tie for rho = size - 1.

    The eigenvector is then not unique.  ``bridge`` adds one edge from the first to the second.
    """
    _need(2, size=size)
    pair = clique_chain(2, size)
    return pair if bridge else EdgeList(pair.n, pair.source[:-1], pair.target[:-1])


def hub(edges: int) -> EdgeList:
    """Node 0 is pointed at by ``edges`` others and points back at node 1: one row of all edges."""
    _need(1, edges=edges)
    inward = star(edges + 1)
    zero, one = np.zeros(1, np.int64), np.ones(1, np.int64)
    return EdgeList(
        edges + 1, np.concatenate([inward.source, zero]), np.concatenate([inward.target, one])
    )
