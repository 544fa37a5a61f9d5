"""Where the mathematics has no answer: words that say so, and the degenerate graphs around them."""

from __future__ import annotations

import exact
import numpy as np
import pytest
from exact import mpf
from graphs import build, graphs, of, to_networkx
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from kingpost.core import gallery
from kingpost.core.errors import NodeNotFound, SettingsError
from kingpost.core.graph import Graph
from kingpost.core.measures import measure
from kingpost.core.measures.base import Settings
from kingpost.core.measures.eigenvector import EigenvectorSettings
from kingpost.core.measures.katz import DEFAULT_FRACTION, KatzSettings
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.result import Result, Stop

MEASURES = ("surfer", "eigenvector", "katz", "degree")


def solve(name: str, graph: Graph, **chosen: object) -> Result:
    """The measure's answer under these settings."""
    return measure(name).rank(graph, measure(name).settings(**chosen))


def refused(result: Result, *words: str) -> None:
    """The result is a refusal that holds these words, and nothing that looks like scores."""
    assert result.stop is Stop.REFUSED
    assert result.refusal is not None
    assert result.reason == result.refusal.sentence
    for word in words:
        assert word in result.reason, result.reason
    assert np.isnan(result.scores).all()
    assert result.proven_order == 0


@pytest.mark.parametrize("name", MEASURES)
def test_the_empty_graph(name: str) -> None:
    refused(solve(name, build(0, [])), "no nodes")


def test_a_single_node() -> None:
    graph = build(1, [])
    assert solve("surfer", graph).scores.tolist() == [1.0]
    assert solve("surfer", graph, damping=1.0).scores.tolist() == [1.0]
    assert solve("katz", graph).scores.tolist() == [1.0]
    assert solve("degree", graph).scores.tolist() == [0.0]
    refused(solve("eigenvector", graph), "no cycle", "katz")
    for name in ("surfer", "katz", "degree"):
        assert solve(name, graph).proven_order == 1


@pytest.mark.parametrize("weight", [1.0, 2.5, 1e-6])
def test_a_single_self_loop(weight: float) -> None:
    graph = build(1, [(0, 0, weight)])
    for damping in (0.0, 0.85, 1.0):
        assert solve("surfer", graph, damping=damping).scores.tolist() == [1.0]
    result = solve("eigenvector", graph)
    assert result.scores.tolist() == [1.0]
    assert result.facts["rho"][0] <= weight <= result.facts["rho"][1]
    result = solve("katz", graph, alpha_fraction=0.5)
    exact.confirm(result, [1 / (1 - mpf(result.facts["alpha"]) * mpf(weight))])
    assert result.scores[0] == pytest.approx(2.0, rel=1e-8)


@pytest.mark.parametrize("directed", [True, False])
def test_isolated_nodes_alone(directed: bool) -> None:
    graph = build(5, [], directed)
    for damping in (0.5, 1.0):
        exact.confirm(solve("surfer", graph, damping=damping), [mpf(1) / 5] * 5)
    exact.confirm(solve("katz", graph), [mpf(1)] * 5)
    exact.confirm(solve("degree", graph), [mpf(0)] * 5)
    refused(solve("eigenvector", graph), "no cycle")
    for name in ("surfer", "katz", "degree"):
        result = solve(name, graph)
        assert result.proven_order == 5  # all tied
        assert result.standing.first.tolist() == [1] * 5
        assert result.standing.last.tolist() == [5] * 5


@pytest.mark.parametrize(
    "edges",
    [gallery.path(6), gallery.star(5), gallery.layered_dag(4, 5, 2), gallery.bipartite(3, 4)],
)
@pytest.mark.parametrize("flow", ["along", "against"])
def test_acyclic_graphs(edges: gallery.EdgeList, flow: str) -> None:
    graph = of(edges)
    refused(solve("eigenvector", graph, flow=flow), "no cycle", "spectral radius is 0", "katz")
    refused(solve("katz", graph, flow=flow, alpha_fraction=0.5), "no cycle", "--alpha")
    default = solve("katz", graph, flow=flow)  # a default of its own, and it says which
    strengths = [float(x) for x in exact.degree(graph, flow)]
    mean = np.mean([x for x in strengths if x > 0])
    assert default.facts["alpha"] == pytest.approx(DEFAULT_FRACTION / mean, rel=1e-14)
    assert "no cycle" in default.conventions["alpha"]
    for alpha in (1.0, 40.0, -3.0):  # any alpha is legal, and one pass is exact
        result = solve("katz", graph, flow=flow, alpha=alpha)
        exact.confirm(result, exact.katz(graph, flow, alpha))
        assert result.stop is Stop.CONVERGED
    assert solve("katz", graph, flow=flow, alpha=1.0).edge_visits <= 1.2 * graph.stored
    assert solve("surfer", graph, flow=flow).edge_visits <= 1.2 * graph.stored


@settings(deadline=None, max_examples=80)
@given(
    graphs(most=8), st.sampled_from(["along", "against"]), st.sampled_from([1e-6, 0.01, 0.5, 9.0])
)
def test_alpha_beyond_the_limit_is_refused(graph: Graph, flow: str, beyond: float) -> None:
    assume(not graph.structure.acyclic)
    rho = exact.radii(graph, flow)[0][0]
    alpha = float((1 + mpf(beyond)) / rho)
    for sign in (1.0, -1.0):
        result = solve("katz", graph, flow=flow, alpha=sign * alpha)
        refused(result, "1/rho", "--alpha-fraction")


def test_alpha_at_the_limit_itself_has_no_answer() -> None:
    # rho of a complete graph of five is exactly 4: alpha = 1/4 is the limit.
    result = solve("katz", of(gallery.complete(5)), alpha=0.25)
    assert result.refusal is not None or not np.isfinite(result.bound.value)
    assert not result.stop.accurate


@pytest.mark.parametrize(
    ("edges", "classes"),
    [
        ([(0, 1), (1, 0), (2, 3), (3, 2), (4, 0), (4, 2)], 2),
        ([(0, 0), (1, 1), (2, 2)], 3),
        ([(0, 1), (1, 0), (0, 2), (2, 2), (1, 3), (3, 3)], 2),
    ],
)
def test_several_closed_classes_have_no_one_distribution(
    edges: list[tuple[int, int]], classes: int
) -> None:
    graph = build(1 + max(max(edge) for edge in edges), edges)
    result = solve("surfer", graph, damping=1.0)
    refused(result, f"{classes} closed classes", "damping below 1")


def stationary(graph: Graph, landing: np.ndarray) -> list[exact.mpf] | None:
    """The one stationary vector of the walk with jumps from dangling nodes, or None if several."""
    import networkx as nx

    chain = to_networkx(graph).to_directed()
    hang = [i for i in range(graph.n) if not graph.outward.degrees[i]]
    chain.add_edges_from((i, int(j)) for i in hang for j in np.flatnonzero(landing))
    closed = [
        sorted(part)
        for part in nx.strongly_connected_components(chain)
        if all(v in part for u in part for v in chain.successors(u))
    ]
    if len(closed) != 1:
        return None
    nodes = closed[0]
    rows = exact.pull_rows(graph, "along")
    strength = [sum((row.get(i, mpf(0)) for row in rows), mpf(0)) for i in range(graph.n)]
    share = [mpf(float(x)) for x in landing]
    share = [x / sum(share) for x in share]

    def step(i: int, j: int) -> mpf:  # probability of j -> i
        return share[i] if strength[j] == 0 else rows[i].get(j, mpf(0)) / strength[j]

    matrix = [[mpf(int(i == j)) - step(i, j) for j in nodes] for i in nodes]
    matrix[-1] = [mpf(1)] * len(nodes)  # one equation is redundant: the sum takes its place
    x = exact.eliminate(matrix, [mpf(0)] * (len(nodes) - 1) + [mpf(1)])
    whole = [mpf(0)] * graph.n
    for node, value in zip(nodes, x, strict=True):
        whole[node] = value
    return whole


@settings(deadline=None, max_examples=150)
@given(graphs(most=7, directed=True), st.data())
def test_damping_one_against_the_chain_itself(graph: Graph, data: st.DataObject) -> None:
    kind = data.draw(st.sampled_from(["uniform", "teleport"]))
    landing = np.ones(graph.n)
    chosen: dict[str, object] = {"dangling": kind}
    if kind == "teleport":
        landing[data.draw(st.integers(0, graph.n - 1)) :] = 0.0
        landing[0] = data.draw(st.sampled_from([1.0, 1e-17, 0.25]))
        landing[-1] = max(landing[-1], 0.5) if graph.n > 1 else landing[-1]
        chosen["teleport"] = landing
    truth = stationary(graph, landing)
    result = solve("surfer", graph, damping=1.0, **chosen)
    if truth is None:
        refused(result, "closed classes")
    else:
        exact.confirm(result, truth)


def test_damping_one_leaks_dry_where_mass_is_lost() -> None:
    refused(solve("surfer", of(gallery.path(3)), damping=1.0, dangling="leak"), "leaks away")


def test_tied_triangles_and_the_answer_within_one() -> None:
    graph = of(gallery.two_tied_components(3))
    refused(solve("eigenvector", graph), "2 strong components", "tie", "--component")
    result = solve("eigenvector", graph, component="4")
    third = 1 / exact.mpmath.sqrt(3)
    exact.confirm(result, [mpf(0)] * 3 + [third] * 3)
    bridged = solve("eigenvector", of(gallery.two_tied_components(3, bridge=True)))
    truth = exact.eigenvector(of(gallery.two_tied_components(3, bridge=True)), "along")
    assert truth is not None
    exact.confirm(bridged, truth)
    # Equal cycles of different lengths tie as well: rho = 1 both.
    cycles = build(7, [*((i, (i + 1) % 3) for i in range(3)), (3, 4), (4, 5), (5, 6), (6, 3)])
    refused(solve("eigenvector", cycles), "tie")


def test_a_chain_of_tied_cliques_answers_for_the_last() -> None:
    graph = of(gallery.clique_chain(4, 3))
    for flow, nodes in (("along", range(9, 12)), ("against", range(3))):
        result = solve("eigenvector", graph, flow=flow)
        assert np.flatnonzero(result.scores).tolist() == list(nodes)
        truth = exact.eigenvector(graph, flow)
        assert truth is not None
        exact.confirm(result, truth)
    # Two that both feed a third: fine; one that feeds two others: two vectors.
    cliques = [
        (3 * c + i, 3 * c + j) for c in range(3) for i in range(3) for j in range(3) if i != j
    ]
    assert solve("eigenvector", build(9, [*cliques, (0, 6), (3, 6)])).refusal is None
    refused(solve("eigenvector", build(9, [*cliques, (0, 3), (0, 6)])), "tie")


def test_a_node_off_every_cycle_has_no_component() -> None:
    graph = build(3, [(0, 1), (1, 0), (1, 2)])
    refused(solve("eigenvector", graph, component="2"), "no cycle")
    with pytest.raises(NodeNotFound):
        solve("eigenvector", graph, component="9")


@pytest.mark.parametrize(
    "make",
    [
        lambda: SurferSettings(damping=1.5),
        lambda: SurferSettings(damping=-0.1),
        lambda: SurferSettings(damping=float("nan")),
        lambda: SurferSettings(dangling="nowhere"),
        lambda: KatzSettings(alpha=0.1, alpha_fraction=0.5),
        lambda: KatzSettings(alpha_fraction=1.0),
        lambda: EigenvectorSettings(certificate="none"),
        lambda: Settings(tol=0.0),
        lambda: Settings(tol=1.0),
        lambda: Settings(stop="order:0"),
        lambda: Settings(stop="soon"),
        lambda: Settings(max_sweeps=0),
        lambda: Settings(flow="sideways"),
    ],
)
def test_settings_out_of_range(make: object) -> None:
    with pytest.raises(SettingsError):
        make()


@pytest.mark.parametrize(
    ("name", "chosen"),
    [
        ("surfer", {"teleport": [1.0]}),
        ("surfer", {"teleport": [0.0, 0.0, 0.0]}),
        ("surfer", {"teleport": [1.0, -1.0, 0.0]}),
        ("surfer", {"dangling": [1.0, np.nan, 0.0]}),
        ("katz", {"alpha": 0.1, "beta": [1.0, np.inf, 0.0]}),
        ("katz", {"alpha": 0.1, "beta": float("nan")}),
        ("katz", {"alpha": float("nan")}),
        ("katz", {"alpha": float("inf")}),
    ],
)
def test_numbers_that_are_none(name: str, chosen: dict[str, object]) -> None:
    graph = build(3, [(0, 1), (1, 0)])
    with pytest.raises(SettingsError):
        solve(name, graph, **chosen)
