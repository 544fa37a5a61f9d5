"""Trials: every claim held against 60-digit solves of the graph that is left, built anew.

The changed graph of the references is made from a dictionary of edges and never by the code
under test; searches are checked against networkx.
"""

from __future__ import annotations

from pathlib import Path

import exact
import networkx as nx
import numpy as np
import pytest
from graphs import build, dense, graphs, of, to_networkx
from hypothesis import assume, event, given, settings
from hypothesis import strategies as st

from kingpost.core.errors import Interrupted, NodeNotFound, SettingsError
from kingpost.core.gallery import recipe
from kingpost.core.graph import Graph
from kingpost.core.ingest import load
from kingpost.core.insight.drift import FALLEN, RISEN, SAME
from kingpost.core.insight.edit import Edit, edit_named, edit_of, edited
from kingpost.core.insight.loss import losses, ways
from kingpost.core.insight.near import COLD, WARM
from kingpost.core.insight.trial import trial
from kingpost.core.insight.update import Updates
from kingpost.core.measures import measure
from kingpost.core.measures.degree import DegreeSettings
from kingpost.core.measures.eigenvector import EigenvectorSettings
from kingpost.core.measures.katz import KatzSettings
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.result import Stop
from kingpost.core.watch import Watch

SAMPLES = Path(__file__).parents[3] / "sample_graphs"

flows = st.sampled_from(["along", "against"])
tolerances = st.sampled_from([1e-2, 1e-6, 1e-10, 1e-13])
examples = settings(deadline=None, max_examples=120)


def arcs(graph: Graph) -> dict[tuple[int, int], float]:
    """Every edge once, with its weight."""
    matrix = dense(graph)
    found = {
        (int(u), int(v)): float(matrix[u, v]) for u, v in zip(*np.nonzero(matrix), strict=True)
    }
    if not graph.directed:
        found = {(u, v): w for (u, v), w in found.items() if u <= v}
    return found


@st.composite
def changed(draw: st.DrawFn, **kinds) -> tuple[Graph, Edit, Graph, list[int]]:
    """A graph, an edit, the graph after it built anew, and the old numbers of its nodes."""
    graph = draw(graphs(**kinds))
    assume(graph.n > 1)
    held = arcs(graph)
    gone = draw(st.sets(st.integers(0, graph.n - 1), max_size=min(2, graph.n - 1)))
    some = draw(st.lists(st.sampled_from(sorted(held)), max_size=3, unique=True)) if held else []
    factors = {edge: draw(st.sampled_from([0.0, 0.0, 0.5, 3.0, 1.0])) for edge in some}
    edit = edit_of(graph, gone, [(*edge, factor) for edge, factor in factors.items()])
    left = [node for node in range(graph.n) if node not in gone]
    number = {node: place for place, node in enumerate(left)}
    kept = {edge: weight * factors.get(edge, 1.0) for edge, weight in held.items()}
    after = [
        (number[u], number[v], weight)
        for (u, v), weight in kept.items()
        if u in number and v in number and weight > 0
    ]
    return graph, edit, build(len(left), after, graph.directed), left


@given(changed())
@examples
def test_the_changed_graph(case):
    graph, edit, expected, left = case
    made, old = edited(graph, edit)
    assert old.tolist() == left
    assert np.array_equal(dense(made), dense(expected))
    assert np.array_equal(dense(Graph(made.labels, made.inward, made.outward)), dense(expected).T)
    assert made.labels.to_pylist() == [graph.labels[node].as_py() for node in left]
    assert made.directed == graph.directed
    assert edit.stay(graph.n).tolist() == left


@given(changed(), flows, tolerances, st.sampled_from([0.0, 0.3, 0.85, 0.99]), st.booleans())
@examples
def test_surfer(case, flow, tol, d, leak):
    graph, edit, expected, _ = case
    chosen = SurferSettings(flow=flow, tol=tol, damping=d, dangling="leak" if leak else "teleport")
    found = trial(graph, measure("surfer").rank(graph, chosen), edit)
    event(found.method)
    exact.confirm(found.result, exact.surfer(expected, flow, d))
    if tol >= 1e-10:
        assert found.result.stop is Stop.CONVERGED
        assert found.result.bound.value <= 16 * tol  # the error before the change included


@given(st.data(), changed(), flows, tolerances, st.sampled_from([0.3, 0.85]))
@examples
def test_surfer_with_jumps_of_its_own(data, case, flow, tol, d):
    graph, edit, expected, left = case
    value = st.sampled_from([0.0, 0.0, 1.0, 2.0, 0.3, 1e-6])
    own = st.lists(value, min_size=graph.n, max_size=graph.n).filter(any)
    teleport = np.array(data.draw(own))
    mode = data.draw(st.sampled_from(["teleport", "uniform", "own"]))
    hop: object = np.array(data.draw(own)) if mode == "own" else mode
    chosen = SurferSettings(flow=flow, tol=tol, damping=d, teleport=teleport, dangling=hop)
    result = measure("surfer").rank(graph, chosen)
    jumps = {"teleport": teleport, "uniform": np.ones(graph.n), "own": hop}[mode][left]
    if not teleport[left].any() or not jumps.any():
        with pytest.raises(SettingsError, match="every node that --"):
            trial(graph, result, edit)
        return
    found = trial(graph, result, edit)
    event(found.method)
    exact.confirm(found.result, exact.surfer(expected, flow, d, teleport[left], jumps))


@given(st.data(), changed(weights=("plain", "tame")), flows, tolerances)
@examples
def test_katz_keeps_its_alpha(data, case, flow, tol):
    graph, edit, expected, left = case
    fraction = data.draw(st.sampled_from([0.2, 0.85, -0.5]))
    beta = data.draw(st.sampled_from(["one", "own", "zeros"]))
    size = st.floats(0.1, 3.0) if beta == "own" else st.sampled_from([0.0, 1.0])
    own = np.array(data.draw(st.lists(size, min_size=graph.n, max_size=graph.n)))
    alpha = None if not graph.structure.acyclic else 0.3
    chosen = KatzSettings(
        flow=flow, tol=tol, alpha=alpha, alpha_fraction=None if alpha else fraction,
        beta=1.0 if beta == "one" else own,
    )  # fmt: skip
    result = measure("katz").rank(graph, chosen)
    found = trial(graph, result, edit)
    event(f"{found.method} {found.result.refusal is None}")
    alpha = result.facts["alpha"]
    radii = exact.radii(expected, flow)
    if found.result.refusal is not None:
        assert float(abs(alpha) * radii[0][0]) >= 1 - 1e-9
        return
    value = 1.0 if beta == "one" else own[left]
    exact.confirm(found.result, exact.katz(expected, flow, alpha, value), informative=False)


@given(changed(weights=("plain", "tame")), flows, st.sampled_from([1e-3, 1e-9]))
@settings(deadline=None, max_examples=60)
def test_eigenvector_starts_from_the_scores_before(case, flow, tol):
    graph, edit, expected, _ = case
    result = measure("eigenvector").rank(graph, EigenvectorSettings(flow=flow, tol=tol))
    assume(result.refusal is None)
    found = trial(graph, result, edit)
    truth = exact.eigenvector(expected, flow)
    if found.result.refusal is not None:
        assert truth is None
        assert (found.after == -1).all()
        return
    assert found.method == WARM
    exact.confirm(found.result, truth)


@given(changed(), flows)
@settings(deadline=None, max_examples=40)
def test_degree_is_counted_anew(case, flow):
    graph, edit, expected, _ = case
    found = trial(graph, measure("degree").rank(graph, DegreeSettings(flow=flow)), edit)
    assert found.method == COLD
    exact.confirm(found.result, exact.degree(expected, flow))


@given(changed(), st.sampled_from([0.3, 1e-2, 1e-6]), st.sampled_from(["surfer", "katz", "degree"]))
@examples
def test_no_claim_goes_beyond_the_bound(case, tol, name):
    """What rises or falls in a rough trial does so in nearly exact solves."""
    graph, edit, expected, left = case
    rough = measure(name).settings(tol=tol)
    result = measure(name).rank(graph, rough)
    found = trial(graph, result, edit)
    assume(found.result.refusal is None)
    fine = {"alpha": result.facts["alpha"]} if name == "katz" else {}
    tight = [
        measure(name).rank(g, measure(name).settings(tol=1e-13, **fine)) for g in (graph, expected)
    ]
    low, high = tight[0].bound.interval(tight[0].scores)
    p, q = tight[0].scores[left], tight[1].scores
    for place, node in enumerate(left):
        was = 1 + sum(low[other] > high[node] for other in left)
        was_last = len(left) - sum(high[other] < low[node] for other in left)
        now = tight[1].standing.range_of(place)
        assert found.before[place, 0] <= was <= was_last <= found.before[place, 1]
        if found.kind[place] == RISEN:
            assert now[1] < was
            assert 1 < found.factor[place] <= was / now[1] * (1 + 1e-12)
        elif found.kind[place] == FALLEN:
            assert now[0] > was_last
    if p.sum() > 0 and q.sum() > 0:
        moved = 0.5 * np.abs(p / p.sum() - q / q.sum()).sum()
        assert abs(moved - found.moved) <= found.moved_error + 1e-9


def test_nothing_changed_nothing_moves():
    graph = of(recipe("rmat", 3000, seed=3, nodes=256).whole())
    result = measure("surfer").rank(graph)
    found = trial(graph, result, edit_of(graph))
    assert (found.kind == SAME).all()
    assert found.moved <= found.moved_error < 1e-9
    assert found.share == 0.0


@pytest.mark.parametrize("name", ["surfer", "katz"])
@pytest.mark.parametrize("shape", ["rmat", "citation", "layered"])
def test_many_trials_share_what_is_prepared(name, shape):
    """A hundred updates one after the other, each within its bound of a solve of what is left."""
    graph = of(recipe(shape, 4000, seed=5).whole())
    result = measure(name).rank(graph)
    updates = Updates(graph, result)
    fine = {"alpha": result.facts["alpha"]} if name == "katz" else {}
    chance = np.random.default_rng(8)
    for node in [*result.standing.order[:10].tolist(), *chance.integers(0, graph.n, 15).tolist()]:
        edit = edit_of(graph, [node])
        found = updates.after(edit, Watch())
        assert found is not None
        left, old = edited(graph, edit)
        truth = measure(name).rank(left, measure(name).settings(tol=1e-12, **fine))
        allowed = found.bound.absolute[old] + truth.scores * 1e-11 + 1e-14
        assert (np.abs(found.scores[old] - truth.scores) <= allowed).all()
        assert found.bound.value <= 1.6e-9  # the error before included
        assert found.scores[node] == 0.0


def test_an_update_that_was_given_up_leaves_nothing_behind():
    graph = of(recipe("rmat", 3000, seed=3, nodes=256).whole())
    updates = Updates(graph, measure("surfer").rank(graph))
    first = updates.after(edit_of(graph, [7]), Watch())
    stopped = Watch()
    stopped.cancel()
    with pytest.raises(Interrupted):
        updates.after(edit_of(graph, [9]), stopped)
    again = updates.after(edit_of(graph, [7]), Watch())
    assert np.array_equal(first.scores, again.scores)
    assert np.array_equal(first.bound.absolute, again.bound.absolute)


@given(graphs(directed=True))
@settings(deadline=None, max_examples=80)
def test_ways_are_those_of_networkx(graph):
    shape = to_networkx(graph)
    for node in range(graph.n):
        found = ways(graph, node)
        up, down = nx.ancestors(shape, node), nx.descendants(shape, node)
        left = shape.subgraph(set(shape) - {node})
        reach = {a: nx.descendants(left, a) | {a} for a in left}
        assert (found.upstream, found.downstream) == (len(up), len(down))
        if not up or not down:
            assert (found.cut_upstream, found.cut_downstream) == (0, 0)
            continue
        assert found.cut_upstream == sum(not reach[a] & down for a in up)
        assert found.cut_downstream == sum(not any(b in reach[a] for a in up) for b in down)


def test_losses_on_a_sample():
    """sample_graphs/harbour_calls.parquet: every row against a trial of its own."""
    graph = load(SAMPLES / "harbour_calls.parquet", weight="calls_per_min")
    result = measure("surfer").rank(graph)
    rows = losses(graph, result, 4)
    assert [row.node for row in rows] == result.standing.order[:4].tolist()
    for row in rows:
        found = trial(graph, result, edit_of(graph, [row.node]))
        assert row.share == pytest.approx(result.scores[row.node], rel=1e-12)
        assert (row.risen, row.fallen) == (
            (found.kind == RISEN).sum(),
            (found.kind == FALLEN).sum(),
        )
        assert row.moved == found.moved > 0
        for riser in row.risers:
            assert riser.after[1] < riser.before[0]
    assert rows[0].ways.upstream > 200


def test_a_bridge_cuts_off_both_ends():
    """Two triangles joined by one node: all above lose all below."""
    edges = [(0, 1), (1, 2), (2, 0), (2, 3), (3, 4), (4, 5), (5, 6), (6, 4)]
    found = ways(build(7, edges), 3)
    assert (found.upstream, found.downstream) == (3, 3)
    assert (found.cut_upstream, found.cut_downstream) == (3, 3)
    beside = ways(build(7, [*edges, (0, 6)]), 3)
    assert (beside.cut_upstream, beside.cut_downstream) == (0, 0)


def test_words_that_cannot_be_tried():
    graph = build(3, [(0, 1), (1, 2), (2, 0)])
    with pytest.raises(NodeNotFound, match="no node is called 'x'"):
        edit_named(graph, ["x"])
    with pytest.raises(SettingsError, match="from 0 to 2 is not in the graph"):
        edit_named(graph, [], [("0", "2")])
    with pytest.raises(SettingsError, match="named twice"):
        edit_named(graph, [], [("0", "1")], [("0", "1", 2.0)])
    with pytest.raises(SettingsError, match="a number from 0"):
        edit_named(graph, [], [], [("0", "1", -1.0)])
    with pytest.raises(SettingsError, match="beyond double precision"):
        edit_named(build(2, [(0, 1, 1e300)]), [], [], [("0", "1", 1e300)])
    with pytest.raises(SettingsError, match="leave at least one"):
        edit_named(graph, ["0", "1", "2"])
    result = measure("eigenvector").rank(graph, EigenvectorSettings(component="1"))
    with pytest.raises(SettingsError, match="--component names"):
        trial(graph, result, edit_named(graph, ["1"]))
    chain = build(3, [(0, 1), (1, 2)])
    with pytest.raises(SettingsError, match="has no answer here"):
        trial(chain, measure("eigenvector").rank(chain), edit_of(chain, [0]))


def test_an_undirected_edge_is_one_edge():
    graph = build(4, [(0, 1), (1, 2), (2, 3)], directed=False)
    edit = edit_named(graph, [], [("2", "1")])
    assert edit.sources == (1, 2)
    made, _ = edited(graph, edit)
    assert made.m == 2
    with pytest.raises(SettingsError, match="named twice"):
        edit_named(graph, [], [("2", "1"), ("1", "2")])
