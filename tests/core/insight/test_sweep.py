"""Sweeps: every rank range against 60-digit solves, leader changes against closed forms."""

from __future__ import annotations

import exact
import networkx as nx
import numpy as np
import pytest
from graphs import build, from_networkx, graphs, of
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import InputError, Interrupted, SettingsError
from kingpost.core.gallery import cycle, recipe
from kingpost.core.graph import Graph
from kingpost.core.insight.near import COLD, WARM
from kingpost.core.insight.over import Over, parse_over
from kingpost.core.insight.sweep import sweep
from kingpost.core.measures import measure
from kingpost.core.measures.katz import KatzSettings
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.watch import Watch


def true_span(scores: list, node: int) -> tuple[int, int]:
    """Ranks a node truly has: ties share theirs."""
    room = exact.TINY * max(scores)
    above = sum(score > scores[node] + room for score in scores)
    below = sum(score < scores[node] - room for score in scores)
    return above + 1, len(scores) - below


@given(graphs(), st.sampled_from(["along", "against"]), st.sampled_from([1e-2, 1e-6, 1e-10]))
@settings(deadline=None, max_examples=60)
def test_ranks_along_damping(graph, flow, tol):
    over = Over("damping", (0.2, 0.5, 0.9))
    found = sweep(graph, "surfer", SurferSettings(flow=flow, tol=tol), over, top=3)
    for index, d in enumerate(over.values):
        truth = exact.surfer(graph, flow, d)
        for place, node in enumerate(found.nodes.tolist()):
            first, last = true_span(truth, node)
            low, high = found.ranks[index, place]
            assert low <= first <= last <= high
        leader = found.points[index].leader
        if leader >= 0:
            assert true_span(truth, leader) == (1, 1)
        assert found.points[index].error <= tol
    for change in found.changes:
        # From one leader to none, the stretch without, and from none to the next: one change.
        assert change.high - change.low <= 3 * found.interval * (1 + 1e-9) or found.cut
        for value, node in ((change.low, change.before), (change.high, change.after)):
            if node >= 0:
                assert true_span(exact.surfer(graph, flow, value), node) == (1, 1)


@given(graphs(weights=("plain", "tame")), st.sampled_from([1e-4, 1e-10]))
@settings(deadline=None, max_examples=50)
def test_ranks_along_alpha(graph, tol):
    if graph.structure.acyclic:
        over = Over("alpha", (0.01, 0.3, 2.0))
    else:
        over = Over("alpha_fraction", (0.1, 0.6, 0.9))
    found = sweep(graph, "katz", KatzSettings(tol=tol, alpha_fraction=None), over, top=2)
    for index, value in enumerate(over.values):
        chosen = KatzSettings(tol=tol, **{over.name: value})
        alpha = measure("katz").rank(graph, chosen).facts["alpha"]
        truth = exact.katz(graph, "along", alpha)
        for place, node in enumerate(found.nodes.tolist()):
            first, last = true_span(truth, node)
            low, high = found.ranks[index, place]
            assert low <= first <= last <= high


def rivals() -> tuple[Graph, float]:
    """Two chains that feed two nodes, and the alpha at which Katz changes its mind.

    Node 0 has three feeders: 1 + 3 a.  Node 1 has two feeders of three feeders each:
    1 + 2 a (1 + 3 a) = 1 + 2 a + 6 a^2.  Equal where 6 a^2 = a, so at a = 1/6.
    """
    edges = [(2, 0), (3, 0), (4, 0), (5, 1), (6, 1)]
    edges += [(7 + k, 5) for k in range(3)] + [(10 + k, 6) for k in range(3)]
    return build(13, edges), 1 / 6


@pytest.mark.parametrize("log", [False, True])
@pytest.mark.parametrize("interval", [None, 1e-3, 1e-7])
def test_where_the_leader_changes_in_closed_form(log, interval):
    graph, alpha = rivals()
    over = parse_over("alpha=0.01:0.9:5" + (":log" if log else ""))
    # Below alpha = 1/6 three direct feeders win; the feeders 5 and 6 tie with node 0 throughout.
    more = build(14, [*((u, v) for u, v in _edges(graph)), (13, 0)])
    found = sweep(more, "katz", KatzSettings(), over, interval=interval)
    # With a fourth feeder: 1 + 4 a = 1 + 2 a + 6 a^2 at a = 1/3.
    (change,) = found.changes
    assert (change.before, change.after) == (0, 1)
    assert change.low <= 1 / 3 <= change.high
    assert over.width(change.low, change.high) <= found.interval * (1 + 1e-9)
    if interval is not None:
        assert found.interval == interval
    assert found.halvings > 0
    assert not found.cut
    again = sweep(graph, "katz", KatzSettings(), Over("alpha", (alpha / 2, alpha * 1.5)))
    assert [point.leader for point in again.points] == [-1, 1]  # a tie has no leader
    (change,) = again.changes
    assert change.low <= alpha * (1 + 1e-9)  # half way lies on the tie itself, to rounding
    assert alpha <= change.high


def _edges(graph: Graph) -> list[tuple[int, int]]:
    return [(u, int(v)) for u in range(graph.n) for v in graph.outward.row(u)[0]]


def test_karate_is_led_as_networkx_says():
    club = nx.karate_club_graph()
    graph = from_networkx(club)
    found = sweep(graph, "surfer", SurferSettings(), parse_over("damping=0.1:0.95:6"), top=4)
    for index, point in enumerate(found.points):
        theirs = nx.pagerank(club, alpha=point.value, weight=None, tol=1e-12, max_iter=1000)
        ordered = sorted(theirs, key=lambda node: -theirs[node])
        assert point.leader == ordered[0]
        mine = found.nodes[np.argsort(found.ranks[index, :, 0], kind="stable")].tolist()
        assert mine[:4] == ordered[:4]
    assert found.changes == ()  # node 33 leads throughout
    assert found.always.sum() >= 2
    assert found.same_order >= 1
    assert found.points[0].method == COLD
    assert {point.method for point in found.points[1:]} == {WARM}


def test_choices_are_compared_and_not_halved():
    graph = of(recipe("citation", 400, seed=2).whole())
    chosen = SurferSettings(teleport={"3": 1.0, "5": 2.0})
    found = sweep(graph, "surfer", chosen, parse_over("dangling=teleport,uniform,leak"))
    assert [point.value for point in found.points] == ["teleport", "uniform", "leak"]
    assert found.changes == ()
    assert np.isnan(found.interval)
    assert np.array_equal(found.ranks[0], found.ranks[2])  # leaking is jumping by teleport
    assert not np.array_equal(found.scores[0], found.scores[1])


def test_ways_of_reading_are_graphs():
    light = build(4, [(0, 1, 9.0), (2, 3, 1.0), (1, 3, 1.0)])
    plain = build(4, [(0, 1), (2, 3), (1, 3)])
    graphs_ = {"asis": light, "none": plain}
    found = sweep(light, "degree", measure("degree").settings(), parse_over("weight_as=asis,none"),
                  graphs=graphs_)  # fmt: skip
    assert [point.leader for point in found.points] == [1, 3]
    graphs_["none"] = build(3, [(0, 1)])
    with pytest.raises(InputError, match="another weight-as changes which nodes"):
        sweep(light, "degree", measure("degree").settings(), parse_over("weight_as=asis,none"),
              graphs=graphs_)  # fmt: skip


def test_ties_lead_nowhere():
    graph = of(cycle(5))
    found = sweep(graph, "surfer", SurferSettings(), parse_over("damping=0.1:0.9:4"))
    assert {point.leader for point in found.points} == {-1}
    assert found.changes == ()
    assert found.same_order == 0


def test_values_without_an_answer_are_told():
    graph = build(4, [(0, 1), (1, 0), (2, 3), (3, 2), (0, 2)])
    # At damping 1 all ends on 2 and 3, which swing: one closed class; without it there are two.
    apart = build(4, [(0, 1), (1, 0), (2, 3), (3, 2)])
    over = Over("damping", (0.5, 1.0))
    assert sweep(graph, "surfer", SurferSettings(), over).points[1].refusal is None
    found = sweep(apart, "surfer", SurferSettings(), over)
    assert "closed classes" in found.points[1].refusal
    assert (found.ranks[1] == -1).all()
    assert np.isnan(found.scores[1]).all()
    with pytest.raises(SettingsError, match="no answer at any of the values"):
        sweep(apart, "surfer", SurferSettings(), Over("damping", (1.0,)))


@pytest.mark.parametrize(
    ("text", "values"),
    [
        ("damping=0.5:0.9:3", (0.5, 0.7, 0.9)),
        ("alpha=0.001:0.1:3:log", (0.001, 0.01, 0.1)),
        ("--alpha-fraction=0.9,0.1", (0.1, 0.9)),
        ("dangling=leak,teleport", ("leak", "teleport")),
        ("component=1,2", ("1", "2")),
        ("beta=2", (2.0,)),
    ],
)
def test_words_of_a_sweep(text, values):
    found = parse_over(text)
    assert found.values == pytest.approx(values) if found.numeric else found.values == values
    assert found.name == text.split("=")[0].strip("-").replace("-", "_")


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("damping", "it takes NAME="),
        ("=1:2:3", "it takes NAME="),
        ("damping=", "it takes NAME="),
        ("damping=1:2", "it takes NAME="),
        ("damping=0.1:nan:4", "it takes NAME="),
        ("damping=0.1:0.9:4:cubic", "it takes NAME="),
        ("damping=0.9:0.1:4", "the first must be the smaller"),
        ("damping=0.1:0.9:1", "it takes 2 to 1,000"),
        ("damping=0.1:0.9:1001", "it takes 2 to 1,000"),
        ("alpha=0:0.9:4:log", "starts above 0"),
        ("damping=0.5,0.5", "names a value twice"),
        ("dangling=leak,leak", "names a value twice"),
        ("dangling=leak,", "an empty value"),
    ],
)
def test_words_that_are_no_sweep(text, told):
    with pytest.raises(SettingsError, match=told):
        parse_over(text)


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("speed=1:2:3", "no setting speed to sweep; there are"),
        ("damping=0.5:1.5:3", "damping"),
        ("damping=low,high", "takes numbers, not 'low'"),
        ("dangling=1,2", "takes words, not 1"),
        ("dangling=leak,stay", "dangling"),
        ("max-sweeps=10.5,20", "whole numbers, not 10.5"),
    ],
)
def test_sweeps_that_a_measure_does_not_take(text, told):
    graph = of(cycle(3))
    with pytest.raises(SettingsError, match=told):
        sweep(graph, "surfer", SurferSettings(), parse_over(text))


def test_sweeps_too_large_or_stopped():
    graph = of(cycle(3))
    over = parse_over("damping=0.1:0.9:4")
    with pytest.raises(SettingsError, match="no nodes"):
        sweep(build(0, []), "surfer", SurferSettings(), over)
    with pytest.raises(SettingsError, match="a number above 0"):
        sweep(graph, "surfer", SurferSettings(), over, interval=0.0)
    stopped = Watch()
    stopped.cancel()
    with pytest.raises(Interrupted):
        sweep(graph, "surfer", SurferSettings(), over, watch=stopped)
