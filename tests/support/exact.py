"""Exact answers, to 60 digits, and the check that a Result claims nothing that is not so.

Nothing here uses the package's solvers, operators or kernels: dense elimination and inverse
iteration in mpmath, over the float64 weights taken at their exact binary values.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import mpmath
import networkx as nx
import numpy as np
from graphs import to_networkx
from mpmath import mpf

from kingpost.core.graph import Graph
from kingpost.core.result import BoundKind, Result
from kingpost.core.standing import PROVEN, TIED, UNRANKED

mpmath.mp.dps = 60
TINY = mpf(10) ** -45  # far below any float64 error, far above the error of 60 digits
Vector = list[mpf]


def pull_rows(graph: Graph, flow: str) -> list[dict[int, mpf]]:
    """For every node its givers with weights, read from the outgoing side only."""
    rows: list[dict[int, mpf]] = [{} for _ in range(graph.n)]
    for u in range(graph.n):
        near, weights = graph.outward.row(u)
        for v, w in zip(near.tolist(), weights.tolist(), strict=True):
            giver, taker = (u, v) if flow == "along" else (v, u)
            rows[taker][giver] = mpf(w)
    return rows


def eliminate(matrix: list[Vector], right: Vector) -> Vector:
    """Gaussian elimination with partial pivoting."""
    n = len(right)
    rows = [[*line, value] for line, value in zip(matrix, right, strict=True)]
    for k in range(n):
        pivot = max(range(k, n), key=lambda i: abs(rows[i][k]))
        rows[k], rows[pivot] = rows[pivot], rows[k]
        for i in range(k + 1, n):
            if rows[i][k] == 0:
                continue
            factor = rows[i][k] / rows[k][k]
            rows[i][k] = mpf(0)
            for j in range(k + 1, n + 1):
                if rows[k][j] != 0:
                    rows[i][j] -= factor * rows[k][j]
    x = [mpf(0)] * n
    for k in range(n - 1, -1, -1):
        rest = rows[k][n]
        for j in range(k + 1, n):
            if rows[k][j] != 0:
                rest -= rows[k][j] * x[j]
        x[k] = rest / rows[k][k]
    return x


def solve(b_rows: list[dict[int, mpf]], right: Vector) -> Vector:
    """``x = right + B x``, strong component by strong component: zeros stay exactly zero."""
    n = len(right)
    shape = nx.DiGraph()
    shape.add_nodes_from(range(n))
    shape.add_edges_from((j, i) for i, row in enumerate(b_rows) for j, w in row.items() if w != 0)
    condensed = nx.condensation(shape)
    x: Vector = [mpf(0)] * n
    for number in nx.topological_sort(condensed):
        nodes = sorted(condensed.nodes[number]["members"])
        place = {node: k for k, node in enumerate(nodes)}
        local = [
            right[i] + sum((w * x[j] for j, w in b_rows[i].items() if j not in place), mpf(0))
            for i in nodes
        ]
        matrix = [[mpf(int(i == j)) - b_rows[i].get(j, mpf(0)) for j in nodes] for i in nodes]
        for node, value in zip(nodes, eliminate(matrix, local), strict=True):
            x[node] = value
    return x


def surfer(graph: Graph, flow: str, d: float, teleport: Any = None, dangling: Any = None) -> Vector:
    """Random surfer at d < 1: the stationary vector of the whole chain, sum 1."""
    n, damping = graph.n, mpf(d)
    rows = pull_rows(graph, flow)
    strength = [mpf(0)] * n
    for row in rows:
        for j, w in row.items():
            strength[j] += w
    v = _share(teleport, n)
    hop = v if dangling is None else _share(dangling, n)
    b_rows = [{j: damping * w / strength[j] for j, w in row.items()} for row in rows]
    base = solve(b_rows, [(1 - damping) * value for value in v])
    hang = [i for i in range(n) if strength[i] == 0]
    jumped = solve(b_rows, hop)
    back = sum((jumped[i] for i in hang), mpf(0))
    lost = sum((base[i] for i in hang), mpf(0))
    t = damping * lost / (1 - damping * back)
    return [a + t * b for a, b in zip(base, jumped, strict=True)]


def _share(vector: Any, n: int) -> Vector:
    if vector is None:
        return [mpf(1) / n] * n
    values = [mpf(float(value)) for value in vector]
    total = sum(values)
    return [value / total for value in values]


def katz(graph: Graph, flow: str, alpha: float, beta: Any = 1.0) -> Vector:
    """``x = beta + alpha B x``."""
    start = [mpf(float(value)) for value in np.broadcast_to(beta, graph.n)]
    rows = [{j: mpf(alpha) * w for j, w in row.items()} for row in pull_rows(graph, flow)]
    return solve(rows, start)


def degree(graph: Graph, flow: str) -> Vector:
    """Sums of weights."""
    return [sum(row.values(), mpf(0)) for row in pull_rows(graph, flow)]


def perron(rows: list[dict[int, mpf]], nodes: Sequence[int]) -> tuple[mpf, Vector]:
    """Spectral radius and positive vector (largest entry 1) of one irreducible block."""
    if len(nodes) == 1:
        return rows[nodes[0]].get(nodes[0], mpf(0)), [mpf(1)]
    block = [[rows[i].get(j, mpf(0)) for j in nodes] for i in nodes]
    # A dense float eigenvector of a balanced copy is the start; inverse iteration does the rest.
    values, vectors = np.linalg.eig(np.array([[float(w) for w in line] for line in block]))
    lead = int(np.argmax(values.real))
    y = [mpf(max(abs(float(value.real)), 1e-12)) for value in vectors[:, lead]]
    for _ in range(60):
        product = [
            sum((w * z for w, z in zip(line, y, strict=True) if w), mpf(0)) for line in block
        ]
        ratios = [p / z for p, z in zip(product, y, strict=True)]
        low, high = min(ratios), max(ratios)
        if high - low <= mpf(10) ** -52 * high:
            return (low + high) / 2, y
        # A shift above the upper end keeps the inverse nonnegative, hence y positive.
        shift = high + (high - low) / 8
        matrix = [
            [(shift if i == j else mpf(0)) - w for j, w in enumerate(line)]
            for i, line in enumerate(block)
        ]
        y = eliminate(matrix, y)
        top = max(y)
        y = [value / top for value in y]
    raise AssertionError("no convergence of the reference")


def radii(graph: Graph, flow: str) -> list[tuple[mpf, list[int], Vector]]:
    """(rho, nodes, vector) of every strong component that holds a cycle, largest rho first."""
    rows, found = pull_rows(graph, flow), []
    for part in nx.strongly_connected_components(to_networkx(graph).to_directed()):
        nodes = sorted(part)
        if len(nodes) > 1 or nodes[0] in rows[nodes[0]]:
            rho, y = perron(rows, nodes)
            found.append((rho, nodes, y))
    return sorted(found, key=lambda item: -item[0])


def eigenvector(graph: Graph, flow: str) -> Vector | None:
    """The one nonnegative vector, length 1; None where there is none or more than one.

    Unique exactly when one component of the largest radius is fed by no vector of another's:
    of all components of that radius, the one that all the others feed (or the only one).
    """
    found = radii(graph, flow)
    if not found:
        return None
    top = [item for item in found if item[0] >= found[0][0] * (1 - TINY)]
    shape = to_networkx(graph).to_directed()
    if flow == "against":
        shape = shape.reverse()
    below = {item[1][0]: nx.descendants(shape, item[1][0]) for item in top}
    last = [
        item for item in top if not any(o is not item and o[1][0] in below[item[1][0]] for o in top)
    ]
    if len(last) != 1:
        return None
    rho, nodes, y = last[0]
    rows = pull_rows(graph, flow)
    inside = set(nodes)
    fed = below[nodes[0]] - inside
    x = [mpf(0)] * graph.n
    for node, value in zip(nodes, y, strict=True):
        x[node] = value
    given = [
        sum((w * x[j] for j, w in rows[i].items() if j in inside), mpf(0)) / rho
        if i in fed
        else mpf(0)
        for i in range(graph.n)
    ]
    scaled = [
        {j: w / rho for j, w in rows[i].items() if j in fed} if i in fed else {}
        for i in range(graph.n)
    ]
    tail = solve(scaled, given)
    x = [x[i] if i in inside else tail[i] for i in range(graph.n)]
    norm = mpmath.sqrt(sum(value * value for value in x))
    return [value / norm for value in x]


def confirm(result: Result, exact: Vector, *, informative: bool = True) -> None:
    """Hold every claim of a Result against the exact scores.

    The interval of every score, the headline bound, proven order, rank ranges, ties, rail and
    exact zeros.  ``informative``: the bound must be finite too.
    """
    n = len(exact)
    assert result.refusal is None, result.reason
    scores = [mpf(float(value)) for value in result.scores]
    assert len(scores) == n
    if informative:
        assert np.isfinite(result.bound.value), result.reason
    low, high = result.bound.interval(result.scores)
    room = TINY * max((abs(value) for value in exact), default=mpf(0))
    for i in range(n):
        if np.isfinite(low[i]):
            assert mpf(float(low[i])) <= exact[i] + room, (i, float(exact[i] - scores[i]))
        if np.isfinite(high[i]):
            assert exact[i] - room <= mpf(float(high[i])), (i, float(exact[i] - scores[i]))
    if result.bound.kind is BoundKind.BRACKET:  # of the eigenvalue: no score is claimed
        assert result.bound.relative is None
        assert result.bound.absolute is None
        assert result.proven_order <= sum(x == 0 for x in exact)
    elif np.isfinite(result.bound.value):
        off = sum((abs(a - b) for a, b in zip(scores, exact, strict=True)), mpf(0))
        whole = sum((abs(a) for a in scores), mpf(0))
        # The bound is a float itself: one rounding of its own.
        assert off <= mpf(result.bound.value) * whole * (1 + mpf(2) ** -50) + room
    if result.exact_zero is not None:
        assert all(exact[i] == 0 for i in np.flatnonzero(result.exact_zero))
    confirm_order(result, exact)


def confirm_order(result: Result, exact: Vector) -> None:
    """Ranks, ties and rail of a Result against the exact scores."""
    standing, n = result.standing, len(exact)
    assert sorted(standing.order.tolist()) == list(range(n))
    ranked = [exact[i] for i in standing.order.tolist()]
    room = TINY * max((abs(value) for value in exact), default=mpf(0))
    least, most = [], []
    for value in ranked:
        least.append(min([value, *least[-1:]]))
    for value in reversed(ranked):
        most.append(max([value, *most[-1:]]))
    most.reverse()
    ordered = sorted(exact)
    for k in range(n):
        if k < result.proven_order and k + 1 < n:
            assert least[k] >= most[k + 1] - room, ("order", k)
        mark = standing.rail[k]
        if k + 1 < n and mark == PROVEN:
            assert least[k] > most[k + 1], ("rail", k)
        if mark == TIED:
            assert abs(ranked[k] - ranked[k + 1]) <= room, ("tie", k)
        above = n - _place(ordered, ranked[k] + room, right=True)
        below = _place(ordered, ranked[k] - room, right=False)
        assert standing.first[k] <= 1 + above, ("first", k)
        assert n - below <= standing.last[k], ("last", k)
    low, high = result.bound.interval(result.scores)
    for k in np.flatnonzero(standing.rail == UNRANKED):
        node = standing.order[k]
        assert low[node] <= 0 <= high[node]
    # The proven order is the first stretch without an open mark, less a tie that reaches it:
    # nodes equal to one that may have to give way may have to give way too.
    settled = (standing.rail == PROVEN) | (standing.rail == TIED)
    end = n if settled.all() else int(np.argmin(settled))
    while 0 < end < n and standing.rail[end - 1] == TIED:
        end -= 1
    assert result.proven_order >= end


def _place(ordered: Vector, value: mpf, right: bool) -> int:
    low, high = 0, len(ordered)
    while low < high:
        middle = (low + high) // 2
        if ordered[middle] < value or (right and ordered[middle] == value):
            low = middle + 1
        else:
            high = middle
    return low
