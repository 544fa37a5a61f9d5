"""Subgraph centrality against mpmath's exponential, networkx, scipy and closed forms."""

from __future__ import annotations

import exact
import mpmath
import networkx as nx
import numpy as np
import pytest
from graphs import build, classics, dense, from_arrays, from_networkx, graphs, of
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.linalg import expm

from kingpost.core import gallery
from kingpost.core.errors import SettingsError
from kingpost.core.measures.base import finish
from kingpost.core.measures.subgraph import MEASURE, SubgraphSettings
from kingpost.core.result import BoundKind, Stop
from kingpost.core.solvers.closed import Sides, closed_walks, norm_bound, weights_bound
from kingpost.core.solvers.quadrature import Quadrature
from kingpost.core.watch import Watch


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, SubgraphSettings(**chosen), watch)


def truth(graph, factor):
    """``diag e^{cA}`` in 60 digits: Taylor's sum of a small multiple, squared."""
    with mpmath.workdps(60):
        a = dense(graph)
        halvings = max(0, int(np.ceil(np.log2(1 + a.sum() * factor))))
        b = np.array([[mpmath.mpf(float(w)) for w in row] for row in a], dtype=object)
        b = b * (mpmath.mpf(factor) / 2**halvings)
        total = term = np.array(
            [[mpmath.mpf(int(i == j)) for j in range(graph.n)] for i in range(graph.n)]
        )
        for k in range(1, 45):
            term = term.dot(b) / k
            total = total + term
        for _ in range(halvings):
            total = total.dot(total)
        return [total[k, k] for k in range(graph.n)]


@settings(max_examples=60, deadline=None)
@given(
    graphs(most=8),
    st.sampled_from(["rho", "none"]),
    st.sampled_from([0.2, 1.0, 4.0]),
    st.sampled_from(["along", "against"]),
)
def test_every_claim_holds_in_sixty_digits(graph, scale, t, flow):
    assume(scale == "rho" or graph.outward.weights is None or graph.outward.weights.max() < 20)
    result = rank(graph, scale=scale, inverse_temperature=t, flow=flow)
    assert result.stop in (Stop.CONVERGED, Stop.STALLED), result.reason
    right = truth(graph, result.facts["factor"])
    exact.confirm(result, right)
    assert result.bound.value < 1e-10
    off_cycle = [
        k for k in range(graph.n) if graph.structure.component[k] not in graph.structure.cyclic
    ]
    assert (result.scores[off_cycle] == 1.0).all()


@pytest.mark.parametrize("name", ["karate", "les miserables", "florentine", "davis"])
def test_networkx_subgraph_centrality(name):
    graph = classics()[name]
    other = nx.from_numpy_array(np.minimum(dense(graph), 1.0))  # networkx leaves weights out
    plain = from_networkx(other)
    right = nx.subgraph_centrality_exp(other)
    found = rank(plain, scale="none")
    np.testing.assert_allclose(found.scores, [right[k] for k in range(plain.n)], rtol=1e-9)


@pytest.mark.parametrize("scale", ["rho", "none"])
def test_scipys_exponential_of_a_directed_weighted_graph(scale):
    rng = np.random.default_rng(4)
    pairs = np.unique(rng.integers(0, 220, (1_400, 2)), axis=0)
    graph = from_arrays(220, pairs[:, 0], pairs[:, 1], rng.uniform(0.1, 1.0, len(pairs)))
    found = rank(graph, scale=scale, inverse_temperature=2.0)
    right = np.diag(expm(dense(graph) * found.facts["factor"]))
    np.testing.assert_allclose(found.scores, right, rtol=1e-9)
    assert found.bound.kind is BoundKind.COMPONENTWISE


def test_a_thousand_small_components_are_one_after_the_other():
    copies = 1_000
    base = np.arange(copies)[:, None] * 5
    ring = np.arange(3)
    source = np.concatenate((base + ring, base + 3), axis=1).ravel()
    target = np.concatenate((base + (ring + 1) % 3, base + 4), axis=1).ravel()
    graph = from_arrays(5 * copies, source, target)
    found = rank(graph)
    # diag of e^C for a directed ring of three: sum over k of 1/(3k)!.
    ring_value = sum(mpmath.mpf(1) / mpmath.factorial(3 * k) for k in range(20))
    assert found.scores[0] == pytest.approx(float(ring_value), rel=1e-10)
    assert (found.scores.reshape(copies, 5)[:, :3] == found.scores[0]).all()
    assert (found.scores.reshape(copies, 5)[:, 3:] == 1.0).all()


def test_a_hub_of_many_leaves_is_counted_once_for_all_twins():
    """Closed form of the star: centre cosh(sqrt m), leaf 1 + (cosh(sqrt m) - 1)/m; here scaled."""
    m = 200_000
    graph = from_arrays(m + 1, np.zeros(m, int), np.arange(1, m + 1), directed=False)
    found = rank(graph)
    assert found.facts["nodes counted"] == 2
    c = float(np.sqrt(m)) * found.facts["factor"]
    assert found.scores[0] == pytest.approx(np.cosh(c), rel=1e-10)
    assert found.scores[5] == pytest.approx(1 + (np.cosh(c) - 1) / m, rel=1e-12)
    assert found.standing.range_of(7) == (2, m + 1)
    assert found.proven_order == m + 1


def test_a_regular_graph_whose_nodes_differ():
    """Estrada and Rodriguez-Velazquez 2005, fig. 1a: degrees and all spectral centralities tie."""
    edges = [(1, 2), (1, 5), (1, 8), (2, 3), (2, 8), (3, 4), (3, 6), (4, 5), (4, 7), (5, 6)]
    edges += [(6, 7), (7, 8)]
    graph = build(8, [(u - 1, v - 1) for u, v in edges], directed=False)
    found = rank(graph, scale="none")
    assert np.round(found.scores, 2).tolist() == [3.9, 3.9, 3.64, 3.71, 3.64, 3.71, 3.64, 3.9]
    exact.confirm(found, truth(graph, 1.0))


def test_acyclic_empty_and_single_graphs():
    chain = rank(of(gallery.path(6)))
    assert chain.scores.tolist() == [1.0] * 6
    assert chain.bound.kind is BoundKind.EXACT
    assert chain.proven_order == 6
    assert "no node lies on a cycle" in chain.reason
    assert "no nodes" in rank(build(0, [])).refusal.reason
    assert rank(build(1, [])).scores.tolist() == [1.0]
    loop = rank(build(1, [(0, 0, 2.0)]), scale="none")
    assert loop.scores[0] == pytest.approx(np.exp(2.0), rel=1e-10)


def test_beyond_double_precision_it_says_so():
    clique = build(12, [(u, v, 100.0) for u in range(12) for v in range(12) if u != v])
    found = rank(clique, scale="none")
    assert found.stop is Stop.REFUSED
    assert "1100" in found.refusal.reason
    assert "--scale rho" in found.refusal.instead
    huge = build(2, [(0, 1, 1e300), (1, 0, 1e300)])
    assert rank(huge, scale="none").stop is Stop.REFUSED
    assert rank(huge).scores == pytest.approx([np.cosh(1.0)] * 2, rel=1e-9)


def test_beyond_the_budget_it_names_what_it_would_cost_and_the_nearest_question():
    graph = of(gallery.rmat(9, 4_000, seed=3))
    found = rank(graph, budget=1e5)
    assert found.stop is Stop.REFUSED
    assert "beyond the budget of 1e+05" in found.refusal.reason
    assert "communicability" in found.refusal.instead
    with pytest.raises(SettingsError):
        SubgraphSettings(budget=-1.0)


def test_weights_that_differ_along_a_cycle():
    """Far from normal: the 2-norm is 12,000 times the spectral radius; closed form of a 2-cycle."""
    graph = build(2, [(0, 1, 100.0), (1, 0, 1e-5)])
    found = rank(graph, inverse_temperature=4.0)
    assert found.stop is Stop.CONVERGED
    assert found.scores == pytest.approx([np.cosh(4.0)] * 2, rel=1e-9)
    w, top = weights_bound(Sides(graph.inward, graph.outward, 1.0), Watch())
    assert (dense(graph).T @ w <= top * w).all()
    assert top == pytest.approx(1e-1**1.5, rel=0.01)


@pytest.mark.parametrize("seed", range(3))
def test_the_norm_is_bounded_from_above(seed):
    graph = from_networkx(nx.gnp_random_graph(60, 0.08, seed=seed, directed=True))
    right = np.linalg.norm(dense(graph), 2)
    found = norm_bound(Sides(graph.inward, graph.outward, 0.5), Watch())
    assert 0.5 * right <= found <= 0.5 * right * 1.1


def test_rounding_is_bounded_where_long_walks_count():
    """t = 60: some 100 products; against 60 digits on a graph far from normal."""
    graph = build(7, [(k, k + 1, 9.0) for k in range(6)] + [(6, 0, 0.01), (3, 0, 1.0)])
    found = rank(graph, inverse_temperature=60.0)
    assert found.stop in (Stop.CONVERGED, Stop.STALLED)
    exact.confirm(found, truth(graph, found.facts["factor"]))


@pytest.mark.parametrize("line", [0, 1, "nodes"])
def test_cancelled_it_keeps_what_it_has(line):
    graph, watch, seen = of(gallery.rmat(9, 4_000, seed=3)), Watch(), []

    def halt(news):
        seen.append(news)
        if len(seen) == line or (line == "nodes" and news.part.startswith("nodes 65")):
            watch.cancel()

    if line == 0:
        watch.cancel()
    found = MEASURE.rank(graph, SubgraphSettings(), watch, halt)
    assert found.stop is Stop.CANCELLED
    assert np.isfinite(found.scores).all()
    if line == "nodes":  # what was not counted yet has ends too: 1 and e to the norm
        right = np.diag(expm(dense(graph) * found.facts["factor"]))
        low, high = found.bound.interval(found.scores)
        assert ((low <= right * (1 + 1e-12)) & (right <= high * (1 + 1e-12))).all()
        assert np.isfinite(high).all()


def test_the_same_bits_for_one_thread_and_two():
    graph = of(gallery.rmat(9, 4_000, seed=3))
    one, two = rank(graph, Watch(threads=1)), rank(graph, Watch(threads=2))
    assert (one.scores == two.scores).all()
    assert (one.bound.absolute == two.bound.absolute).all()


def test_a_long_row_is_added_up_within_its_bound():
    """A hub of 3,000 weights over twelve decades; e^B of a weighted star in closed form."""
    m = 3_000
    weights = 10.0 ** np.random.default_rng(6).uniform(-6, 6, m)
    graph = from_arrays(m + 1, np.zeros(m, int), np.arange(1, m + 1), weights, directed=False)
    sides = Sides(graph.inward, graph.inward, 2.0**-24)
    work = closed_walks(sides, np.arange(3), 1e-13, Watch())
    found = finish(work)
    with mpmath.workdps(50):
        taken = [mpmath.mpf(float(w)) * mpmath.mpf(2) ** -24 for w in weights]
        size = mpmath.sqrt(mpmath.fsum(w * w for w in taken))
        right = [mpmath.cosh(size)]
        right += [1 + (mpmath.cosh(size) - 1) * (w / size) ** 2 for w in taken[:2]]
        for value, error, true in zip(found.value, found.error, right, strict=True):
            assert abs(mpmath.mpf(float(value)) - true) <= mpmath.mpf(float(error))
            assert error < 1e-12 * value


@settings(max_examples=40, deadline=None)
@given(graphs(most=9, directed=False), st.sampled_from([0.3, 1.0, 5.0]))
def test_quadrature_encloses_it_too(graph, t):
    result = rank(graph, method="quadrature", inverse_temperature=t)
    assert result.stop in (Stop.CONVERGED, Stop.STALLED), result.reason
    exact.confirm(result, truth(graph, result.facts["factor"]))
    assert result.bound.value < 1e-9


@pytest.mark.parametrize("scale", ["rho", "none"])
def test_both_ways_agree(scale):
    graph = classics()["les miserables" if scale == "rho" else "karate"]
    one, two = rank(graph, scale=scale), rank(graph, scale=scale, method="quadrature")
    low, high = one.bound.interval(one.scores)
    under, over = two.bound.interval(two.scores)
    assert (low <= over).all()
    assert (under <= high).all()
    np.testing.assert_allclose(one.scores, two.scores, rtol=1e-9 if scale == "rho" else 1e-7)
    assert "Gauss-Radau" in two.conventions["method"]


def test_gauss_is_below_and_radau_above_at_every_step():
    """Golub and Meurant 2010, theorems 6.4 and 6.5; steps cut short on purpose."""
    graph = classics()["karate"]
    c = 0.5
    right = truth(graph, c)
    norm = float(np.linalg.norm(dense(graph), 2)) * c * (1 + 1e-12)
    for most in (3, 4, 6, 12):
        work = Quadrature(graph.inward, c, norm, Watch())
        work.most = min(most, work.most)
        for node in (0, 5, 11, 33):
            found = work.ends(node, 1e-15)
            assert mpmath.mpf(found.low) <= right[node] <= mpmath.mpf(found.high)
    assert found.high - found.low < 1e-9 * found.low


def test_quadrature_of_a_directed_graph_is_refused_with_the_way_out():
    found = rank(build(3, [(0, 1), (1, 2), (2, 0)]), method="quadrature")
    assert found.stop is Stop.REFUSED
    assert "method=walks" in found.refusal.instead


def test_quadrature_cancels_and_does_not_depend_on_threads():
    graph = from_networkx(nx.gnp_random_graph(150, 0.05, seed=3))
    one, two = (rank(graph, Watch(threads=t), method="quadrature") for t in (1, 2))
    assert (one.scores == two.scores).all()
    watch = Watch()
    lines = []

    def halt(line):
        lines.append(line)
        if line.part.startswith("nodes"):
            watch.cancel()

    found = MEASURE.rank(graph, SubgraphSettings(method="quadrature"), watch, halt)
    assert found.stop is Stop.CANCELLED
    low, high = found.bound.interval(found.scores)
    assert ((low <= one.scores) & (one.scores <= high)).all()
