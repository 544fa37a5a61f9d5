"""Perron vectors by sweeps at an estimated root, and the small parts these are made of."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from graphs import build, dense, from_networkx, graphs
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.gallery import recipe
from kingpost.core.ingest import from_table
from kingpost.core.layout import layout
from kingpost.core.operators import ROW, adjacency, cut, given_back
from kingpost.core.parallel import each
from kingpost.core.solvers import stages
from kingpost.core.solvers.perron import bracket
from kingpost.core.solvers.settling import Settling
from kingpost.core.watch import Watch

WATCH = Watch(threads=1)


def connected(seed: int, nodes: int = 60, decades: float = 2.0):
    """A random graph made strong by a ring, weights spread over some decades."""
    rng = np.random.default_rng(seed)
    plain = nx.gnp_random_graph(nodes, 4 / nodes, seed=seed, directed=True)
    plain.add_edges_from((node, (node + 1) % nodes) for node in range(nodes))
    for u, v in plain.edges:
        plain[u][v]["weight"] = float(10 ** rng.uniform(-decades / 2, decades / 2))
    return from_networkx(plain)


def perron(a: np.ndarray) -> np.ndarray:
    """The dominant eigenvector by numpy, largest entry 1."""
    values, vectors = np.linalg.eig(a)
    vector = np.abs(vectors[:, int(np.argmax(values.real))].real)
    return vector / vector.max()


@pytest.mark.parametrize("flow", ["along", "against"])
@pytest.mark.parametrize("seed", range(6))
def test_numpys_perron_vector(seed: int, flow: str) -> None:
    graph = connected(seed)
    a = dense(graph)
    a = a.T if flow == "along" else a
    order = graph.structure.order
    work = Settling(adjacency(graph, flow), order, np.ones(graph.n), WATCH)
    moves = list(work.run())
    assert work.sound
    assert moves[-1] < 1e-14
    np.testing.assert_allclose(work.x / work.x.max(), perron(a), rtol=1e-9)
    # Two steps of the left power iteration from ones.
    left = a.T @ (a.T @ np.ones(graph.n))
    np.testing.assert_allclose(work.left / work.left.max(), left / left.max(), rtol=1e-12)


def test_a_left_vector_that_is_given_is_used() -> None:
    graph = connected(1)
    a = dense(graph).T
    left = perron(a.T)
    order = graph.structure.order
    matrix = adjacency(graph, "along")
    told = Settling(matrix, order, np.ones(graph.n), WATCH, gives=left)
    assert len(list(told.run())) <= len(
        list(Settling(matrix, order, np.ones(graph.n), WATCH).run())
    )
    np.testing.assert_allclose(told.x / told.x.max(), perron(a), rtol=1e-9)


def test_it_ends_once_entries_move_little_enough() -> None:
    graph = connected(2)
    work = Settling(adjacency(graph, "along"), graph.structure.order, np.ones(graph.n), WATCH, 1e-6)
    list(work.run())
    off = np.abs(work.x / work.x.max() / perron(dense(graph).T) - 1).max()
    assert 1e-13 < off < 1e-5


@pytest.mark.parametrize("loop", [0.9, 1.0, 5.0, 1e6])
def test_a_self_loop_near_the_root_or_far_above_the_rest(loop: float) -> None:
    ring = [(k, (k + 1) % 8) for k in range(8)]
    graph = build(8, [(u, v, 1.0) for u, v in ring] + [(3, 3, loop)])
    work = Settling(adjacency(graph, "along"), graph.structure.order, np.ones(8), WATCH)
    list(work.run())
    assert work.sound
    np.testing.assert_allclose(work.x / work.x.max(), perron(dense(graph).T), rtol=1e-9, atol=1e-15)
    # Behind the loop every score is rho times smaller, far below what numpy can resolve.
    if loop == 1e6:
        np.testing.assert_allclose(work.x[2] / work.x[3], 1e-42, rtol=1e-9)


def test_sweeps_in_the_direction_of_most_edges_are_few() -> None:
    made = from_table(
        # Nine edges in ten lead to the next layer: what power iteration needs 50 products for.
        table_of(recipe("layered", 200_000, seed=5))
    )
    found = bracketed(made)
    sweeps = [line for line in found.log if line.part == "settling sweep"]
    assert found.decided
    assert found.rho[1] - found.rho[0] <= 1e-12 * found.rho[1]
    assert len(sweeps) <= 30


def table_of(graph):
    """A recipe as a table of source, target, weight."""
    import pyarrow as pa

    parts = list(graph.stream(1 << 16))
    columns = {
        "source": np.concatenate([part.source for part in parts]),
        "target": np.concatenate([part.target for part in parts]),
        "weight": np.concatenate([part.weight for part in parts]),
    }
    return pa.table(columns)


def bracketed(graph, **wanted):
    work = bracket(
        adjacency(graph, "along"), graph.structure, width=1e-12, max_steps=500, watch=WATCH,
        **wanted,
    )  # fmt: skip
    try:
        while True:
            next(work)
    except StopIteration as end:
        return end.value


def test_the_largest_component_is_settled_before_many_small_ones_are_out() -> None:
    # Two-cycles of root 0.99 times the giant's, and a chain between them and it.
    giant = nx.gnp_random_graph(400, 0.02, seed=3, directed=True)
    giant.add_edges_from((node, (node + 1) % 400) for node in range(400))
    root = max(abs(np.linalg.eigvals(nx.to_numpy_array(giant))))
    edges = [(u, v, 1.0) for u, v in giant.edges]
    for k in range(50):
        u = 400 + 2 * k
        edges += [(u, u + 1, 0.99 * root), (u + 1, u, 0.99 * root), (u, k, 1.0)]
    found = bracketed(build(500, edges))
    assert found.decided
    assert found.rho[0] <= root * (1 + 1e-12)
    assert root <= found.rho[1] * (1 + 1e-12)
    assert len(found.y.nonzero()[0]) == 400
    assert found.left is not None
    assert (found.left[:400] > 0).all()


@settings(deadline=None)
@given(graphs(), st.integers(1, 40), st.data())
def test_cuts_are_those_of_a_plain_loop(graph, edges, data):
    order = graph.structure.order
    low = data.draw(st.integers(0, graph.n))
    high = data.draw(st.integers(low, graph.n))
    wanted, start, total, mark = [], low, 0, edges
    for k in range(low, high):
        total += int(graph.inward.degrees[order[k]]) + ROW
        if total >= mark or k == high - 1:
            wanted.append((start, k + 1))
            start = k + 1
            mark = (total // edges + 1) * edges
    assert cut(graph.inward, order, low, high, edges) == wanted


@settings(deadline=None)
@given(graphs(), st.integers(0, 2**32 - 1), st.data())
def test_what_is_given_back_is_the_transposed_product(graph, seed, data):
    order = graph.structure.order
    low = data.draw(st.integers(0, graph.n))
    high = data.draw(st.integers(low, graph.n))
    values = np.random.default_rng(seed).random(graph.n)
    some = np.zeros(graph.n)
    some[order[low:high]] = 1.0
    a = dense(graph)  # row i of inward lists the j of a[j, i]
    found = given_back(graph.inward, order, low, high, values, WATCH)
    np.testing.assert_allclose(found, a @ (some * values), rtol=1e-13, atol=1e-300)
    ones = given_back(graph.inward, order, low, high, np.ones(1), WATCH)
    np.testing.assert_allclose(ones, a @ some, rtol=1e-13, atol=1e-300)


def test_lanes_of_the_transposed_product_do_not_change_a_bit(monkeypatch) -> None:
    monkeypatch.setattr("kingpost.core.operators._PIECE", 500)
    graph = connected(4, 300)
    values = np.random.default_rng(0).random(graph.n)
    found = [
        given_back(graph.inward, graph.structure.order, 0, graph.n, values, Watch(threads=threads))
        for threads in (1, 2)
    ]
    assert found[0].tobytes() == found[1].tobytes()
    np.testing.assert_allclose(found[0], dense(graph) @ values, rtol=1e-12)


@pytest.mark.parametrize("threads", [1, 2])
def test_settling_in_lanes_has_the_bits_of_one_thread(monkeypatch, threads: int) -> None:
    monkeypatch.setattr(stages, "_SPLIT", 100)
    monkeypatch.setattr(stages, "_BLOCK", 60)
    graph = connected(6, 300)
    order = graph.structure.order
    work = Settling(adjacency(graph, "along"), order, np.ones(graph.n), Watch(threads=threads))
    assert work.stage.lanes == 2
    assert len(work.stage.steps) > 5
    list(work.run())
    np.testing.assert_allclose(work.x / work.x.max(), perron(dense(graph).T), rtol=1e-9)
    alone = Settling(adjacency(graph, "along"), order, np.ones(graph.n), WATCH)
    list(alone.run())
    assert work.x.tobytes() == alone.x.tobytes()


@settings(deadline=None)
@given(graphs())
def test_a_graph_laid_out_is_not_laid_out_again(graph):
    matrix = adjacency(graph, "along")
    laid = layout(graph.structure, matrix.rows, WATCH)
    again = layout(laid.structure, laid.rows, WATCH)
    assert again.rows is laid.rows
    moved = laid.matrix(matrix)
    assert again.matrix(moved) is moved


@pytest.mark.parametrize("threads", [1, 2, 3])
def test_pieces_come_back_in_their_order(threads: int) -> None:
    assert each(lambda k: k * k, range(50), threads) == [k * k for k in range(50)]
    assert each(lambda k: k, [], threads) == []


@pytest.mark.parametrize("threads", [1, 2])
def test_what_a_piece_raises_comes_after_all_that_were_begun(threads: int) -> None:
    begun, ended = [], []

    def piece(k: int) -> None:
        begun.append(k)
        if k == 3:
            raise ValueError("three")
        ended.append(k)

    with pytest.raises(ValueError, match="three"):
        each(piece, range(1000), threads)
    assert set(begun) == {*ended, 3}
    assert len(begun) < 1000
