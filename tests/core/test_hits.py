"""Hubs and authorities against 60-digit Perron vectors, numpy's singular vectors and networkx."""

from __future__ import annotations

import exact
import mpmath
import networkx as nx
import numpy as np
import pytest
from graphs import build, classics, dense, from_networkx, graphs, of
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import NodeNotFound
from kingpost.core.gallery import hub, path, rmat, star
from kingpost.core.measures.hits import MEASURE, HitsSettings
from kingpost.core.result import BoundKind, Stop
from kingpost.core.watch import Watch


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, HitsSettings(**chosen), watch)


def reference(graph, takes):
    """The scores to 60 digits, or None where the two largest singular values tie.

    Built from the edges alone: node u as a hub joined to node v as an authority.
    """
    pairs = [
        (u, graph.n + int(v), float(w))
        for u in range(graph.n)
        for v, w in zip(*graph.outward.row(u), strict=True)
    ]
    found = exact.radii(build(2 * graph.n, pairs, directed=False), "along")
    if len(found) > 1 and found[1][0] >= found[0][0] * (1 - exact.TINY):
        return None, found
    _, nodes, y = found[0]
    whole = [mpmath.mpf(0)] * (2 * graph.n)
    for node, value in zip(nodes, y, strict=True):
        whole[node] = value
    mine = whole[graph.n :] if takes else whole[: graph.n]
    norm = mpmath.sqrt(sum(value**2 for value in mine))
    return [value / norm for value in mine], found


ROLES = st.sampled_from(["authority", "hub"])
FLOWS = st.sampled_from(["along", "against"])


@settings(max_examples=100, deadline=None)
@given(graphs(most=7), ROLES, FLOWS)
def test_every_claim_holds_in_sixty_digits(graph, role, flow):
    found = rank(graph, role=role, flow=flow)
    if graph.stored == 0:
        assert "no edges" in found.refusal.reason
        return
    truth, parts = reference(graph, (role == "authority") == (flow == "along"))
    if found.stop is Stop.REFUSED:
        # Tied, or so nearly that double precision cannot tell.
        assert parts[1][0] >= parts[0][0] * (1 - mpmath.mpf(10) ** -11)
        return
    assert truth is not None
    weights = graph.outward.weights
    if weights is None or weights.max() < 1e3 * weights.min():
        assert found.bound.kind is BoundKind.COMPONENTWISE
        assert found.stop in (Stop.CONVERGED, Stop.STALLED)
    # Weights further apart can leave a gap between singular values that double precision cannot
    # resolve: then less may be claimed, and whatever is claimed must hold all the same.
    exact.confirm(found, truth, informative=False)
    low, high = found.facts["sigma"]
    assert mpmath.mpf(low) <= parts[0][0] * (1 + exact.TINY)
    assert parts[0][0] * (1 - exact.TINY) <= mpmath.mpf(high)


@pytest.mark.parametrize("seed", range(4))
def test_numpys_singular_vectors(seed):
    graph = from_networkx(nx.gnp_random_graph(80, 0.06, seed=seed, directed=True))
    left, sigma, right = np.linalg.svd(dense(graph))
    assert sigma[1] < 0.99 * sigma[0]
    for role, vector in (("authority", right[0]), ("hub", left[:, 0])):
        found = rank(graph, role=role, tol=1e-12)
        assert found.stop is Stop.CONVERGED
        np.testing.assert_allclose(found.scores, np.abs(vector), atol=1e-12)
        assert found.facts["sigma"][0] == pytest.approx(sigma[0], rel=1e-12)


def test_networkx_hits_up_to_its_scaling():
    graph = classics()["les miserables"]
    hubs, _ = nx.hits(nx.les_miserables_graph(), max_iter=1000, tol=1e-14)
    found = rank(graph)
    np.testing.assert_allclose(found.scores / found.scores.sum(), list(hubs.values()), atol=1e-9)
    assert "undirected" in found.conventions["flow"]


def test_flow_against_the_edges_swaps_the_roles():
    graph = from_networkx(nx.gnp_random_graph(40, 0.1, seed=9, directed=True))
    swapped = rank(graph, role="authority", flow="against")
    plain = rank(graph, role="hub", flow="along")
    np.testing.assert_allclose(swapped.scores, plain.scores, atol=1e-12)
    assert "points at good authorities" in swapped.conventions["flow"]


def test_parts_that_tie_have_no_one_answer():
    graph = build(6, [(0, 1), (0, 2), (3, 4), (3, 5)])
    found = rank(graph)
    assert found.stop is Stop.REFUSED
    assert "2 separate parts" in found.refusal.reason
    assert "1 in one" in found.refusal.reason
    assert "4 in another" in found.refusal.reason
    assert np.isnan(found.scores).all()
    inside = rank(graph, component="5")
    np.testing.assert_allclose(inside.scores, [0, 0, 0, 0, 0.5**0.5, 0.5**0.5], atol=1e-12)
    assert inside.proven_order == 6
    assert inside.standing.range_of(5) == (1, 2)
    outside = rank(graph, component="5", role="hub")
    assert outside.stop is Stop.REFUSED
    assert "5 has no edges" in outside.refusal.reason
    with pytest.raises(NodeNotFound):
        rank(graph, component="nobody")


def test_an_undirected_bipartite_graph_splits_into_two_that_tie():
    found = rank(classics()["davis"])
    assert found.stop is Stop.REFUSED
    assert "2 separate parts" in found.refusal.reason


@pytest.mark.parametrize("gap", [1e-3, 1e-8])
def test_parts_that_nearly_tie_are_told_apart(gap):
    edges = [(0, 1, 1.0), (2, 1, 1.0), (3, 4, 1.0), (5, 4, 1.0 + gap)]
    found = rank(build(6, edges))
    truth, _ = reference(build(6, edges), True)
    exact.confirm(found, truth)
    assert found.scores[4] == pytest.approx(1.0)
    assert found.exact_zero.tolist() == [True, True, True, True, False, True]


def test_acyclic_single_and_empty_graphs():
    chain = rank(of(path(6)))  # five parts of one edge each
    assert "5 separate parts" in chain.refusal.reason
    wheel = rank(of(star(7)))
    assert wheel.scores.tolist() == [1.0] + [0.0] * 6
    assert rank(of(star(7)), role="hub").scores[1:] == pytest.approx(6**-0.5)
    assert "no edges" in rank(build(1, [])).refusal.reason
    assert rank(build(1, [(0, 0)])).scores.tolist() == [1.0]
    assert "no nodes" in rank(build(0, [])).refusal.reason


def test_a_row_of_many_edges_and_weights_over_twelve_decades():
    found = rank(of(hub(50_000)))
    assert found.stop is Stop.CONVERGED
    assert found.proven_order == 50_001
    rng = np.random.default_rng(11)
    edges = [
        (int(u), int(v), float(10.0 ** rng.uniform(-6, 6)))
        for u, v in {tuple(pair) for pair in rng.integers(0, 9, (30, 2)).tolist()}
    ]
    graph = build(9, edges)
    truth, _ = reference(graph, True)
    exact.confirm(rank(graph), truth)


def test_the_limit_the_order_and_the_log():
    graph = of(rmat(9, 4000, seed=3))
    whole = rank(graph, tol=1e-12)
    assert [line.index for line in whole.log] == sorted(line.index for line in whole.log)
    assert {line.part for line in whole.log} >= {"bracket", "certificate", "certified"}
    early = rank(graph, tol=1e-12, stop="order:3")
    assert early.stop in (Stop.ORDER_PROVEN, Stop.CONVERGED)
    assert early.proven_order >= 3
    assert early.sweeps <= whole.sweeps
    short = rank(graph, max_sweeps=2)
    assert short.stop is Stop.LIMIT
    assert short.bound.kind is BoundKind.NONE
    assert np.isfinite(short.scores).all()


@pytest.mark.parametrize("line", [0, 3, 12])
def test_cancelled_it_keeps_what_it_has(line):
    graph, watch, seen = of(rmat(9, 4000, seed=3)), Watch(), []

    def halt(news):
        seen.append(news)
        if len(seen) == line:
            watch.cancel()

    if line == 0:
        watch.cancel()
    found = MEASURE.rank(graph, HitsSettings(tol=1e-13), watch, halt)
    assert found.stop is Stop.CANCELLED
    assert np.isfinite(found.scores).all()
    assert np.linalg.norm(found.scores) == pytest.approx(1.0)


def test_the_same_bits_for_one_thread_and_two():
    graph = of(rmat(10, 9000, seed=5))
    one, two = rank(graph, Watch(threads=1)), rank(graph, Watch(threads=2))
    assert (one.scores == two.scores).all()
    assert one.bound.value == two.bound.value
