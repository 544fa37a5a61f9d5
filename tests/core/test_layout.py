"""Renumbered rows are the same matrix, by dense products, self-loops and counts included."""

from __future__ import annotations

import numpy as np
import pytest
from graphs import build, dense, graphs
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import layout as module
from kingpost.core.layout import layout
from kingpost.core.measures import measure
from kingpost.core.operators import adjacency
from kingpost.core.structure import downstream, reachable
from kingpost.core.watch import Watch

WATCH = Watch(threads=1)


@settings(deadline=None)
@given(graphs(), st.sampled_from(["along", "against"]), st.integers(0, 2**32 - 1))
def test_products_are_those_of_the_dense_matrix(graph, flow, seed):
    a = dense(graph)
    b = 0.5 * (a.T if flow == "along" else a)
    x = np.random.default_rng(seed).random(graph.n)
    matrix = adjacency(graph, flow, 0.5)
    laid = layout(graph.structure, matrix.rows, WATCH)
    np.testing.assert_allclose(
        laid.back(laid.matrix(matrix).apply(laid.there(x), WATCH)), b @ x, rtol=1e-14
    )
    product, size = laid.apply_exactly(matrix, x, WATCH)
    np.testing.assert_allclose(product, b @ x, rtol=4e-16)
    np.testing.assert_allclose(size, b @ x, rtol=1e-14)
    moved = laid.matrix(matrix)
    loops = moved.loops if len(moved.loops) else np.zeros(graph.n)
    np.testing.assert_array_equal(laid.back(loops), np.diag(b))
    np.testing.assert_array_equal(laid.back(laid.there(x)), x)


def ring(weights):
    n = len(weights)
    return build(n, [(i, (i + 1) % n, w) for i, w in enumerate(weights)] + [(0, 0, 2.0)])


@pytest.mark.parametrize(
    ("weights", "listed"),
    [
        ([1.0, 2.0, 1.0, 1.0, 1.0, 1.0], 9),
        ([5.0, 1, 1, 1, 1, 1], None),
        ([0.5, 1, 1, 1, 1, 1], None),
    ],
)
def test_parallel_edges_are_listed_where_their_counts_are_small_and_whole(weights, listed):
    graph = ring(weights)
    laid = layout(graph.structure, graph.inward, WATCH)
    if listed is None:
        assert sorted(laid.rows.weights) == sorted([*weights, 2.0])
    else:
        assert laid.rows.weights is None
        assert len(laid.rows.neighbours) == listed


def test_it_is_made_once_for_each_direction_in_use():
    graph = ring([1.0] * 6)
    first = layout(graph.structure, graph.inward, WATCH)
    assert layout(graph.structure, graph.inward, WATCH) is first
    assert layout(graph.structure, graph.outward, WATCH) is not first


def test_without_cycles_or_above_the_limit_the_rows_stay_where_they_are(monkeypatch):
    chain = build(4, [(0, 1), (1, 2), (2, 3), (0, 3)])
    assert layout(chain.structure, chain.inward, WATCH).rows is chain.inward
    monkeypatch.setattr(module, "_MOST", 10)
    graph = ring([1.0] * 6)
    assert layout(graph.structure, graph.inward, WATCH).rows is graph.inward


def test_a_cancelled_renumbering_leaves_nothing_behind():
    graph = ring([1.0] * 6)
    watch = Watch(threads=1)
    watch.cancel()
    assert layout(graph.structure, graph.inward, watch).rows is graph.inward
    assert layout(graph.structure, graph.inward, WATCH).rows is not graph.inward


@settings(deadline=None)
@given(graphs(most=7), st.sampled_from(["surfer", "katz", "eigenvector"]))
def test_scores_agree_with_those_in_the_stored_order(graph, name):
    chosen = measure(name)
    asked = chosen.settings(tol=1e-10)
    here = chosen.rank(graph, asked)
    graph.__dict__.pop("structure", None)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(module, "_MOST", -1)
        there = chosen.rank(graph, asked)
    assert here.stop == there.stop
    low, high = here.bound.interval(here.scores)
    least, most = there.bound.interval(there.scores)
    if here.refusal is None:
        assert (low <= most).all()
        assert (least <= high).all()


@settings(deadline=None)
@given(graphs(), st.sampled_from(["along", "against"]))
def test_downstream_is_what_a_walk_reaches(graph, flow):
    structure = graph.structure
    pull, push = graph.pull(flow), graph.push(flow)
    for component in range(structure.count):
        found = downstream(structure, pull, push, component, flow, WATCH)
        walked = reachable(push, structure.members(component), WATCH)
        np.testing.assert_array_equal(found, walked)
