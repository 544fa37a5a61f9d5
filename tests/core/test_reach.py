"""Reach against sets built by networkx, and the sketch against the error it states."""

from __future__ import annotations

import threading
from dataclasses import replace
from fractions import Fraction

import networkx as nx
import numpy as np
import pyarrow as pa
import pytest
from graphs import build, from_arrays, graphs, of, to_networkx
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import gallery
from kingpost.core.errors import SettingsError
from kingpost.core.measures.base import finish
from kingpost.core.measures.reach import MEASURE, ReachSettings
from kingpost.core.result import BoundKind, Stop
from kingpost.core.solvers.sets import condense, gather, gather_visits
from kingpost.core.solvers.sketch import between, least_ranks, rank_error
from kingpost.core.watch import Watch


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, ReachSettings(**chosen), watch)


def holding(graph, amounts, name="worth"):
    return replace(graph, attributes=pa.table({name: amounts}))


def truth(graph, flow, itself, amounts=None):
    """Exact sums over networkx's own ancestor sets, as fractions."""
    held = [Fraction(1)] * graph.n if amounts is None else [Fraction(a) for a in amounts]
    other = to_networkx(graph)
    found = []
    for node in range(graph.n):
        # networkx leaves the node itself out, even where it lies on a cycle.
        if not graph.directed:
            lead = nx.node_connected_component(other, node) - {node}
        else:
            lead = (nx.ancestors if flow == "along" else nx.descendants)(other, node)
        lead = lead | {node} if itself == "counted" else lead
        found.append(sum((held[u] for u in lead), Fraction(0)))
    return found


def confirm(result, right):
    """Intervals, ties, rails and exact zeros against exact sums."""
    low, high = result.bound.interval(result.scores)
    for node, value in enumerate(right):
        assert Fraction(float(low[node])) <= value <= Fraction(float(high[node])), node
    assert all(right[node] == 0 for node in np.flatnonzero(result.exact_zero))
    standing = result.standing
    ranked = [right[node] for node in standing.order]
    for k in range(result.proven_order - 1):
        assert ranked[k] >= max(ranked[k + 1 :])
    for k in np.flatnonzero(standing.rail == 2):
        assert ranked[k] == ranked[k + 1]


FLOWS = st.sampled_from(["along", "against"])
ITSELF = st.sampled_from(["apart", "counted"])


@settings(max_examples=80, deadline=None)
@given(graphs(most=12), FLOWS, ITSELF)
def test_numbers_of_nodes_are_exact(graph, flow, itself):
    result = rank(graph, flow=flow, itself=itself)
    right = truth(graph, flow, itself)
    assert result.stop is Stop.CONVERGED
    assert result.bound.kind is BoundKind.EXACT
    assert result.bound.value == 0.0
    assert [Fraction(float(score)) for score in result.scores] == right
    assert result.exact_zero.tolist() == [value == 0 for value in right]
    confirm(result, right)
    assert result.proven_order == graph.n


AMOUNTS = st.one_of(
    st.just(0.0),
    st.integers(0, 9).map(float),
    st.floats(0, 1e6),
    st.floats(-9, 9).map(lambda p: float(10.0**p)),
)


@settings(max_examples=80, deadline=None)
@given(graphs(most=10), st.data(), FLOWS, ITSELF)
def test_sums_of_an_attribute_are_within_their_bounds(graph, data, flow, itself):
    amounts = data.draw(st.lists(AMOUNTS, min_size=graph.n, max_size=graph.n))
    result = rank(holding(graph, amounts), flow=flow, itself=itself, attribute="worth")
    right = truth(graph, flow, itself, amounts)
    assert result.stop is Stop.CONVERGED
    confirm(result, right)
    if all(a == int(a) for a in amounts):
        assert [Fraction(float(score)) for score in result.scores] == right
    whole = sum(right)
    off = sum(abs(Fraction(float(s)) - r) for s, r in zip(result.scores, right, strict=True))
    assert off <= Fraction(result.bound.value if np.isfinite(result.bound.value) else 1e300) * (
        whole + 1
    )


def test_more_members_than_one_row_of_bits_holds():
    # A random acyclic graph: three blocks of 512 members.
    rng = np.random.default_rng(8)
    n = 1_700
    source = rng.integers(0, n, 5_000)
    target = rng.integers(0, n, 5_000)
    ends = np.unique(np.sort(np.column_stack((source, target))[source != target], axis=1), axis=0)
    graph = from_arrays(n, ends[:, 0], ends[:, 1])
    amounts = rng.uniform(0, 1, n)
    for flow in ("along", "against"):
        joined = condense(graph, flow, Watch())
        assert np.count_nonzero(joined.feeds) > 1_100
        assert rank(graph, flow=flow).scores.tolist() == truth(graph, flow, "apart")
        held = rank(holding(graph, amounts), flow=flow, attribute="worth")
        assert held.facts["method"] == "sets of bits"
        confirm(held, truth(graph, flow, "apart", amounts.tolist()))
        assert held.bound.value < 1e-12


def test_a_ring_a_path_and_what_they_count_of_themselves():
    ring, chain = of(gallery.cycle(7)), of(gallery.path(6))
    assert rank(ring).scores.tolist() == [6.0] * 7
    assert rank(ring, itself="counted").scores.tolist() == [7.0] * 7
    assert rank(chain).scores.tolist() == [0, 1, 2, 3, 4, 5]
    assert rank(chain, flow="against").scores.tolist() == [5, 4, 3, 2, 1, 0]
    assert rank(chain).exact_zero.tolist() == [True] + [False] * 5
    alone = build(1, [(0, 0)])
    assert rank(alone).scores.tolist() == [0.0]
    assert rank(alone).exact_zero.tolist() == [True]
    assert rank(alone, itself="counted").scores.tolist() == [1.0]
    assert rank(build(3, [])).proven_order == 3


def test_the_empty_graph_is_refused_in_words():
    found = rank(build(0, []))
    assert found.stop is Stop.REFUSED
    assert "no nodes" in found.reason


def test_a_wide_star_and_a_deep_chain():
    star, chain = of(gallery.hub(200_000)), of(gallery.path(200_000))
    found = rank(star)
    assert found.scores[:3].tolist() == [200_000.0, 200_000.0, 0.0]
    deep = rank(chain)
    assert (deep.scores == np.arange(200_000)).all()
    assert deep.facts["method"] == "condensation"


def knotted(n=500, edges=1_500, seed=4):
    """An acyclic graph in which nothing but the counting itself settles the sums."""
    rng = np.random.default_rng(seed)
    pairs = np.sort(rng.integers(0, n, (edges, 2)), axis=1)
    pairs = np.unique(pairs[pairs[:, 0] != pairs[:, 1]], axis=0)
    return from_arrays(n, pairs[:, 0], pairs[:, 1])


@pytest.mark.parametrize("log2m", [5, 7])
def test_the_sketch_errs_as_much_as_it_says(log2m):
    """Over independent draws: no bias, the stated standard error, and the stated shares.

    (k - 1)/S is unbiased with relative variance 1/(k - 2), S gamma of shape k (Cohen 1997): 400
    draws put the sample's standard deviation within 15% of it with room to spare.
    """
    graph, draws, wanted = knotted(), 400, 1 << log2m
    joined = condense(graph, "along", Watch())
    weights = np.diff(joined.begins).astype(float)
    known = between(joined, weights, float(weights.sum()))
    right = np.array([float(x) for x in truth(graph, "along", "apart")])
    # Component g holds one node here; the node whose certain ends are furthest apart is watched.
    assert joined.count == graph.n
    node = int(np.argmax(known.high - known.low))
    at = int(joined.order[joined.begins[node]])
    assert known.low[node] < right[at] / 3
    assert known.high[node] > min(graph.n - 1, 2 * right[at]) - 1
    known.high[:] = np.inf  # what is certain must not hide what is drawn
    known.low[:] = 0.0
    errors = []
    for seed in range(1, draws + 1):
        work = least_ranks(joined, weights, known, wanted, seed, Watch())
        errors.append(finish(work).found[node] / right[at] - 1)
    stated = rank_error(wanted)
    assert stated == pytest.approx((wanted - 2) ** -0.5)
    assert np.std(errors) == pytest.approx(stated, rel=0.15)
    assert abs(np.mean(errors)) < 4 * stated / draws**0.5
    assert 0.60 < np.mean(np.abs(errors) < stated) < 0.76
    assert np.mean(np.abs(errors) < 2 * stated) > 0.92


def test_ranks_have_the_distribution_they_are_said_to_have():
    """Weights 1, 3 and 6 upstream of one node: the least of the ranks is exponential, rate 10."""
    graph = build(4, [(0, 3), (1, 3), (2, 3)])
    joined = condense(graph, "along", Watch())
    weights = np.array([1.0, 3.0, 6.0, 0.0])[joined.order]
    known = between(joined, weights, 10.0)
    node = int(joined.group[3])
    known.low[:], known.high[:] = 0.0, np.inf
    found = []
    for seed in range(300):
        work = least_ranks(joined, weights, known, 64, seed, Watch())
        found.append(float(finish(work).found[node]))
    error = rank_error(64)
    assert np.mean(found) == pytest.approx(10.0, rel=4 * error / 300**0.5)
    assert np.std(found) / 10 == pytest.approx(error, rel=0.2)


def test_what_is_estimated_says_so_and_keeps_to_what_is_certain():
    graph = knotted()
    right = np.array([float(x) for x in truth(graph, "along", "apart")])
    found = rank(graph, budget=0.0, seed=3)
    assert found.stop is Stop.CONVERGED
    assert found.bound.kind is BoundKind.STATISTICAL
    assert found.bound.value == pytest.approx((1024 - 2) ** -0.5)
    assert found.facts["standard error"] == found.bound.value
    assert found.facts["edge visits of an exact count"] > 0
    assert "3.13%" in found.conventions["confidence"]
    assert "estimated" in found.conventions["scores"]
    assert "budget of 0" in found.reason
    assert found.exact_zero.tolist() == (right == 0).tolist()
    inside = right > 0
    off = found.scores[inside] / right[inside] - 1
    assert np.abs(off).max() < 6 * found.bound.value
    assert found.proven_order <= np.count_nonzero(right == 0)
    joined = condense(graph, "along", Watch())
    known = between(joined, np.diff(joined.begins).astype(float), float(graph.n))
    assert (found.scores >= known.low[joined.group]).all()
    assert (found.scores <= known.high[joined.group]).all()
    assert (known.low[joined.group] <= right).all()
    assert (right <= known.high[joined.group]).all()
    again, other = rank(graph, budget=0.0, seed=3), rank(graph, budget=0.0, seed=4)
    assert (again.scores == found.scores).all()
    assert (other.scores != found.scores).any()


def test_a_forest_needs_no_estimate_however_small_the_budget():
    found = rank(of(gallery.star(9)), budget=0.0)
    assert found.bound.kind is BoundKind.EXACT
    assert found.facts["method"] == "condensation"


def test_estimated_amounts_follow_the_attribute():
    graph = knotted()
    amounts = np.random.default_rng(2).pareto(1.5, graph.n) + 0.01
    right = np.array([float(x) for x in truth(graph, "along", "apart", amounts.tolist())])
    found = rank(holding(graph, amounts), budget=0.0, attribute="worth", log2m=12)
    inside = right > 0
    assert np.abs(found.scores[inside] / right[inside] - 1).max() < 6 * found.bound.value
    nothing = rank(holding(graph, np.zeros(graph.n)), budget=0.0, attribute="worth")
    assert not nothing.scores.any()


@pytest.mark.parametrize(
    ("column", "told"),
    [
        (pa.array([1.0, None, 3.0]), "empty for 1 of 3 nodes"),
        (pa.array(["a", "b", "c"]), "not a number"),
        (pa.array(["1", "2", "3"]), "not a number"),
        (pa.array(["1", "2", "3"]).dictionary_encode(), "not a number"),
        (pa.array([1.0, -2.0, 3.0]), "negative, NaN or infinite"),
        (pa.array([1.0, float("nan"), 3.0]), "negative, NaN or infinite"),
        (pa.array([1.0, float("inf"), 3.0]), "negative, NaN or infinite"),
        (pa.array([1e308, 1e308, 3.0]), "more than double precision holds"),
        (pa.array([[1], [2], [3]]), "not a number"),
    ],
)
def test_attributes_that_cannot_be_added_up(column, told):
    graph = replace(build(3, [(0, 1), (1, 2)]), attributes=pa.table({"worth": column}))
    with pytest.raises(SettingsError, match=told):
        rank(graph, attribute="worth")


def test_kinds_of_numbers_that_can_be_added_up():
    graph = build(3, [(0, 1), (1, 2)])
    for column in (
        pa.array([1, 2, 4], pa.uint8()),
        pa.array([1, 2, 4], pa.int64()),
        pa.array([1, 2, 4], pa.decimal128(9, 2)),
        pa.chunked_array([pa.array([1.0]), pa.array([2.0, 4.0])]),
    ):
        found = rank(replace(graph, attributes=pa.table({"worth": column})), attribute="worth")
        assert found.scores.tolist() == [0.0, 1.0, 3.0]
    flags = replace(graph, attributes=pa.table({"worth": pa.array([True, False, True])}))
    assert rank(flags, attribute="worth").scores.tolist() == [0.0, 1.0, 1.0]


def test_an_attribute_that_is_not_there():
    with pytest.raises(SettingsError, match="there are none"):
        rank(build(2, [(0, 1)]), attribute="worth")
    graph = holding(build(2, [(0, 1)]), [1.0, 2.0], "worth\x1b[31m")
    with pytest.raises(SettingsError) as refused:
        rank(graph, attribute="worht")
    assert "\x1b" not in str(refused.value)
    for wrong in ({"log2m": 4}, {"log2m": 6.5}, {"budget": -1.0}, {"itself": "perhaps"}):
        with pytest.raises(SettingsError):
            ReachSettings(**wrong)


@pytest.mark.parametrize("budget", [2e9, 0.0])
@pytest.mark.parametrize("line", [0, 1, 2])
def test_cancelled_it_keeps_what_it_has(budget, line):
    graph = knotted(4_000, 9_000)
    watch, seen = Watch(), []

    def halt(news):
        seen.append(news)
        if len(seen) == line:
            watch.cancel()

    if line == 0:
        watch.cancel()
    found = MEASURE.rank(graph, ReachSettings(budget=budget), watch, halt)
    right = rank(graph).scores
    assert found.stop is Stop.CANCELLED
    assert np.isfinite(found.scores).all()
    assert "cancelled" in found.reason
    if budget:
        assert (found.scores <= right).all()
        if line == 2:  # after one turn of blocks: what the others could add bounds the error
            low, high = found.bound.interval(found.scores)
            assert ((low <= right) & (right <= high)).all()
            assert found.bound.kind is BoundKind.COMPONENTWISE


def test_a_cancel_comes_through_while_it_works():
    """From another thread, once work is known to be under way."""
    under_way = threading.Event()
    watch = Watch(lambda report: under_way.set())

    def cancel():
        under_way.wait(60)
        watch.cancel()

    thread = threading.Thread(target=cancel)
    thread.start()
    found = rank(knotted(120_000, 400_000), watch, budget=1e18)
    thread.join()
    assert found.stop is Stop.CANCELLED


@pytest.mark.parametrize("budget", [2e9, 0.0])
def test_the_same_bits_for_one_thread_and_two(budget):
    graph = knotted(2_000, 6_000)
    graph = holding(graph, np.random.default_rng(1).uniform(0, 1, graph.n))
    one, two = (rank(graph, Watch(threads=t), budget=budget, attribute="worth") for t in (1, 2))
    assert (one.scores == two.scores).all()
    assert one.bound.value == two.bound.value


def test_the_cost_of_an_exact_count_is_told_beforehand():
    graph = knotted(2_000, 6_000)
    joined = condense(graph, "along", Watch())
    work = gather(joined, np.ones(joined.count), Watch())
    assert finish(work).visits == gather_visits(joined)
