"""Contributions against scores computed elsewhere: networkx and numpy's dense eigenvectors."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pyarrow as pa
import pytest

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.insight.contributions import contributions, shares_given
from kingpost.core.measures.base import Settings
from kingpost.core.result import Bound, BoundKind, Result, Stop


def adjacency(matrix):
    rows, near = np.nonzero(matrix)
    offsets = np.concatenate(([0], np.cumsum(np.bincount(rows, minlength=len(matrix)))))
    return Adjacency(offsets.astype(np.int64), near.astype(np.uint32), matrix[rows, near].copy())


def graph_of(matrix, weighted=True):
    out, into = adjacency(matrix), adjacency(np.ascontiguousarray(matrix.T))
    if not weighted:
        out = Adjacency(out.offsets, out.neighbours)
        into = Adjacency(into.offsets, into.neighbours)
    return Graph(pa.array(range(len(matrix))), out, into)


def result_of(measure, scores, flow="along", **facts):
    return Result(
        measure, Settings(flow=flow), np.asarray(scores, float), Stop.CONVERGED, "",
        Bound(BoundKind.NONE, np.nan), facts=facts,
    )  # fmt: skip


@pytest.fixture(scope="module")
def matrix():
    """A strongly connected weighted digraph of 30 nodes."""
    rng = np.random.default_rng(7)
    made = rng.integers(1, 9, (30, 30)) * (rng.random((30, 30)) < 0.15)
    made[np.arange(30), (np.arange(30) + 1) % 30] = 2
    return made.astype(float)


def digraph(matrix):
    return nx.from_numpy_array(matrix, create_using=nx.DiGraph)


@pytest.mark.parametrize("flow", ["along", "against"])
def test_surfer_terms_sum_to_networkx_pagerank(matrix, flow):
    walked = matrix if flow == "along" else matrix.T
    ranks = nx.pagerank(digraph(walked), alpha=0.8, tol=1e-14, max_iter=2000)
    graph = graph_of(matrix)
    result = result_of("surfer", [ranks[i] for i in range(30)], flow, damping=0.8)
    for node in range(30):
        given = contributions(graph, result, node)
        assert given.amount.sum() + 0.2 / 30 == pytest.approx(ranks[node], abs=1e-10)
        assert sum(given.parts.values()) == pytest.approx(1.0)
        assert (np.diff(given.amount) <= 0).all()


def test_katz_terms_sum_to_networkx_katz(matrix):
    alpha = 0.5 / max(abs(np.linalg.eigvals(matrix)))
    scores = nx.katz_centrality_numpy(
        digraph(matrix), alpha, 1.0, normalized=False, weight="weight"
    )
    graph = graph_of(matrix)
    result = result_of("katz", [scores[i] for i in range(30)], alpha=alpha)
    for node in range(30):
        assert contributions(graph, result, node).amount.sum() + 1.0 == pytest.approx(scores[node])


def test_eigenvector_terms_are_the_whole_score(matrix):
    values, vectors = np.linalg.eig(matrix.T)
    at = np.argmax(values.real)
    scores = np.abs(vectors[:, at].real)
    result = result_of("eigenvector", scores, rho=float(values[at].real))
    for node in range(30):
        given = contributions(graph_of(matrix), result, node)
        assert given.amount.sum() == pytest.approx(scores[node])
        assert given.parts == pytest.approx({"feeders": 1.0})


def test_degree_terms_are_the_weights(matrix):
    scores = matrix.sum(axis=0)
    given = contributions(graph_of(matrix), result_of("degree", scores), 3)
    assert given.amount.sum() == scores[3]
    assert np.array_equal(np.sort(given.amount), np.sort(matrix[:, 3][matrix[:, 3] > 0]))


def test_without_weights_every_edge_counts_one(matrix):
    plain = (matrix > 0).astype(float)
    ranks = nx.pagerank(digraph(plain), alpha=0.85, tol=1e-14, max_iter=2000)
    result = result_of("surfer", [ranks[i] for i in range(30)], damping=0.85)
    given = contributions(graph_of(plain, weighted=False), result, 5)
    assert given.amount.sum() + 0.15 / 30 == pytest.approx(ranks[5], abs=1e-10)


def test_shares_given_sum_to_one(matrix):
    near, weights, share = shares_given(graph_of(matrix), result_of("degree", np.ones(30)), 4)
    assert share.sum() == pytest.approx(1.0)
    assert np.array_equal(weights, matrix[4, near])


def test_nothing_is_given_where_there_is_no_score():
    lonely = np.zeros((2, 2))
    given = contributions(graph_of(lonely), result_of("degree", [0.0, 0.0]), 0)
    assert len(given.neighbours) == 0
    assert given.parts == {}
    linked = np.array([[0.0, 1.0], [0.0, 0.0]])
    refused = contributions(graph_of(linked), result_of("surfer", [np.nan, np.nan]), 1)
    assert refused.amount.tolist() == [0.0]
    assert refused.share.tolist() == [0.0]


def test_scores_that_are_no_sum_over_neighbours_have_shares_of_weight(matrix):
    """A score of another scale than the weights must not make shares beyond 1."""
    graph, result = graph_of(matrix), result_of("votes", np.full(30, 1e-3))
    for node in range(30):
        given = contributions(graph, result, node)
        expected = np.sort(matrix[:, node][matrix[:, node] > 0])[::-1]
        assert not given.of_score
        assert given.parts == {}
        np.testing.assert_allclose(given.share, expected / expected.sum(), rtol=1e-15)
