"""Harmonic centrality against sums of fractions over breadth-first searches, and networkx."""

from __future__ import annotations

from fractions import Fraction

import networkx as nx
import numpy as np
import pytest
from graphs import build, classics, from_arrays, from_networkx, graphs, of, to_networkx
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import gallery
from kingpost.core.errors import SettingsError
from kingpost.core.measures.base import finish
from kingpost.core.measures.harmonic import MEASURE, HarmonicSettings
from kingpost.core.result import BoundKind, Stop
from kingpost.core.solvers.sketch import ball_error, grow_balls
from kingpost.core.watch import Watch


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, HarmonicSettings(**chosen), watch)


def truth(graph, flow="along"):
    """Exact sums of 1/distance, from networkx's own searches."""
    other = to_networkx(graph)
    if graph.directed and flow == "along":
        other = other.reverse()
    found = []
    for node in range(graph.n):
        away = nx.single_source_shortest_path_length(other, node)
        found.append(sum((Fraction(1, d) for d in away.values() if d), Fraction(0)))
    return found


def confirm(result, right):
    low, high = result.bound.interval(result.scores)
    for node, value in enumerate(right):
        assert Fraction(float(low[node])) <= value <= Fraction(float(high[node])), node
    assert all(right[node] == 0 for node in np.flatnonzero(result.exact_zero))
    ranked = [right[node] for node in result.standing.order]
    for k in range(result.proven_order - 1):
        assert ranked[k] >= max(ranked[k + 1 :])
    for k in np.flatnonzero(result.standing.rail == 2):
        assert ranked[k] == ranked[k + 1]


@settings(max_examples=80, deadline=None)
@given(graphs(most=12), st.sampled_from(["along", "against"]))
def test_sums_are_exact_but_for_rounding_and_equal_ones_are_tied(graph, flow):
    result = rank(graph, flow=flow)
    right = truth(graph, flow)
    assert result.stop is Stop.CONVERGED
    assert result.bound.kind is BoundKind.EXACT
    assert result.exact_zero.tolist() == [value == 0 for value in right]
    confirm(result, right)
    # Sums are told apart to the last unit: everything is proven.
    assert result.proven_order == graph.n


@pytest.mark.parametrize("name", ["karate", "les miserables", "florentine", "davis"])
def test_networkx_harmonic_centrality(name):
    graph = classics()[name]
    right = nx.harmonic_centrality(to_networkx(graph))
    np.testing.assert_allclose(rank(graph).scores, [right[k] for k in range(graph.n)], rtol=1e-14)


def test_networkx_on_a_directed_graph_of_several_blocks():
    other = nx.gnp_random_graph(1_300, 0.0016, seed=6, directed=True)
    graph = from_networkx(other)
    for flow, taken in (("along", other), ("against", other.reverse())):
        right = nx.harmonic_centrality(taken)  # over paths that end at the node; plain sums
        found = rank(graph, flow=flow)
        assert found.facts["method"] == "searches from every node"
        np.testing.assert_allclose(found.scores, list(right.values()), rtol=1e-12)
        assert "3 searches" in found.reason


def test_closed_forms():
    """A path, a cycle, a star: sums of 1/k; distances beyond those for which sums are told apart
    by their residue (46)."""
    chain = of(gallery.path(120))
    right = [sum((Fraction(1, d) for d in range(1, k + 1)), Fraction(0)) for k in range(120)]
    found = rank(chain)
    confirm(found, right)
    assert found.facts["greatest distance"] == 119
    assert found.proven_order == 120
    ring = rank(of(gallery.cycle(100)))
    confirm(ring, [sum(Fraction(1, d) for d in range(1, 100))] * 100)
    small = rank(of(gallery.cycle(40)))
    assert small.proven_order == 40  # told to be equal
    star = rank(from_arrays(6, np.zeros(5, int), np.arange(1, 6), directed=False))
    assert star.scores.tolist() == [5.0, 3.0, 3.0, 3.0, 3.0, 3.0]


def test_weights_loops_and_the_node_itself_play_no_part():
    plain = build(4, [(0, 1), (1, 2), (2, 3), (3, 0)])
    heavy = build(4, [(0, 1, 5.0), (1, 2, 1e-6), (2, 3, 7.0), (3, 0, 2.0), (1, 1, 9.0)])
    assert rank(heavy).scores.tolist() == rank(plain).scores.tolist()
    alone = rank(build(1, [(0, 0)]))
    assert alone.scores.tolist() == [0.0]
    assert alone.exact_zero.tolist() == [True]
    assert rank(build(3, [])).proven_order == 3
    assert "strengths, never distances" in rank(plain).conventions["distance"]


def test_the_empty_graph_is_refused_in_words():
    assert "no nodes" in rank(build(0, [])).refusal.reason


def test_a_wide_star_within_and_beyond_the_budget():
    graph = of(gallery.hub(300_000))  # one hub: leaves point at it, it points at one of them
    found = rank(graph)
    assert found.scores[0] == pytest.approx(300_000, rel=0.5)
    assert found.scores[2] == 0.0
    assert found.exact_zero[2]


def sampled(graph, log2m, draws):
    """Scores and balls over independent hashes, shape (draws, n) each."""
    scores, balls = [], []
    for seed in range(1, draws + 1):
        work = grow_balls(graph.pull("along"), log2m, seed, 10_000, Watch())
        end = finish(work)
        assert end.settled
        scores.append(end.score)
        balls.append(end.ball)
    return np.array(scores), np.array(balls)


@pytest.mark.parametrize("log2m", [5, 7])
def test_balls_err_as_much_as_they_are_said_to(log2m):
    """1.04 / sqrt(registers) for the size of a ball (Flajolet et al. 2007), and no more for sums.

    One node's ball is drawn anew by every hash: 300 of them put the sample's deviation within a
    fifth of the stated one.
    """
    draws, n = 300, 1_500
    rng = np.random.default_rng(3)
    pairs = np.unique(rng.integers(0, n, (3_600, 2)), axis=0)
    graph = from_arrays(n, pairs[:, 0], pairs[:, 1])
    exact = rank(graph)
    other = to_networkx(graph).reverse()
    reached = max(nx.strongly_connected_components(other), key=len)
    node = min(reached)
    right = len(nx.descendants(other, node) | {node})
    assert right > 800
    scores, balls = sampled(graph, log2m, draws)
    stated = ball_error(log2m)
    off = np.minimum(balls[:, node], n) / right - 1
    assert abs(off.mean()) < 5 * stated / draws**0.5 + 0.01
    assert off.std() < 1.2 * stated
    spread = scores[:, node] / exact.scores[node] - 1
    assert abs(spread.mean()) < 5 * stated / draws**0.5 + 0.01
    assert spread.std() < 1.1 * stated


def test_an_unclamped_ball_has_the_stated_error():
    """The same where no ball comes near the number of nodes, so that nothing is cut off."""
    n, inside = 20_000, 700
    source = np.arange(1, inside)
    chain = from_arrays(n, source, np.zeros(inside - 1, dtype=int))
    # A second step, so that a ball is estimated: node 0 gives to the last node.
    graph = from_arrays(
        n, np.append(chain_source(chain), 0), np.append(np.zeros(inside - 1, dtype=int), n - 1)
    )
    _, balls = sampled(graph, 6, 200)
    off = balls[:, n - 1] / (inside + 1) - 1
    assert off.std() == pytest.approx(ball_error(6), rel=0.2)
    assert abs(off.mean()) < 5 * ball_error(6) / 200**0.5


def chain_source(graph):
    return np.flatnonzero(graph.outward.degrees)


def test_what_is_estimated_says_so():
    graph = of(gallery.rmat(10, 6_000, seed=2))
    exact, found = rank(graph), rank(graph, budget=0.0, log2m=10)
    assert found.stop is Stop.CONVERGED
    assert found.bound.kind is BoundKind.STATISTICAL
    assert found.bound.value == pytest.approx(1.04 / 32)
    assert "estimated" in found.conventions["scores"]
    assert "no order is proven" in found.conventions["confidence"]
    assert found.facts["registers"] == 1024
    inside = exact.scores > 0
    assert np.abs(found.scores[inside] / exact.scores[inside] - 1).max() < 6 * found.bound.value
    assert (found.exact_zero == exact.exact_zero).all()
    assert not found.scores[found.exact_zero].any()
    assert (rank(graph, budget=0.0, log2m=10).scores == found.scores).all()
    assert (rank(graph, budget=0.0, log2m=10, seed=2).scores != found.scores).any()


def test_the_first_ball_is_exact():
    graph = of(gallery.star(30))  # nothing but distances of 1
    found = rank(graph, budget=0.0, log2m=4)
    assert found.scores.tolist() == [29.0] + [0.0] * 29


def test_a_limit_on_the_distance_is_said():
    graph = of(gallery.path(50))
    found = rank(graph, budget=0.0, max_sweeps=3)
    assert found.stop is Stop.LIMIT
    assert found.bound.kind is BoundKind.NONE
    assert "within distance 3" in found.reason


@pytest.mark.parametrize("budget", [2e9, 0.0])
@pytest.mark.parametrize("line", [0, 1])
def test_cancelled_it_keeps_what_it_has(budget, line):
    graph = of(gallery.rmat(12, 30_000, seed=2))
    watch, seen = Watch(), []

    def halt(news):
        seen.append(news)
        if len(seen) == line:
            watch.cancel()

    if line == 0:
        watch.cancel()
    found = MEASURE.rank(graph, HarmonicSettings(budget=budget), watch, halt)
    assert found.stop is Stop.CANCELLED
    assert "cancelled" in found.reason
    assert found.bound.kind is BoundKind.NONE
    assert np.isfinite(found.scores).all()
    if budget:
        assert (found.scores <= rank(graph).scores * (1 + 1e-12)).all()


@pytest.mark.parametrize("budget", [2e9, 0.0])
def test_the_same_bits_for_one_thread_and_two(budget):
    graph = of(gallery.rmat(11, 12_000, seed=7))
    one, two = (rank(graph, Watch(threads=t), budget=budget) for t in (1, 2))
    assert (one.scores == two.scores).all()


def test_settings_out_of_range():
    for wrong in ({"log2m": 3}, {"log2m": 8.5}, {"budget": -1.0}, {"seed": -1}):
        with pytest.raises(SettingsError):
            HarmonicSettings(**wrong)
