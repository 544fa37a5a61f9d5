"""Walks: held against dense matrix powers, closed forms, and the eigenvalues of known chains."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from graphs import build, dense, from_networkx, graphs, of
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.gallery import complete, cycle, path
from kingpost.core.graph import Graph
from kingpost.core.insight.modes import decompose, dense_chain
from kingpost.core.insight.walk import steps_at_most, walk
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.watch import Watch


def at(graph: Graph, *nodes: int) -> np.ndarray:
    start = np.zeros(graph.n)
    start[list(nodes)] = 1.0
    return start


def chain_of(
    graph: Graph, flow: str, d: float, mode: str, teleport: np.ndarray | None
) -> np.ndarray:
    """Columns: where a walker goes next; from the definition, by dense algebra."""
    matrix = dense(graph) if flow == "along" else dense(graph).T
    n = graph.n
    v = np.full(n, 1 / n) if teleport is None else teleport / teleport.sum()
    w = {"teleport": v, "uniform": np.full(n, 1 / n), "leak": np.zeros(n)}[mode]
    out = matrix.sum(axis=1)
    rows = np.where(out[:, None] > 0, matrix / np.where(out > 0, out, 1)[:, None], w)
    return d * rows.T + (1 - d) * np.outer(v, np.ones(n))


@given(
    st.data(),
    graphs(),
    st.sampled_from(["along", "against"]),
    st.sampled_from([0.0, 0.5, 0.85, 1.0]),
    st.sampled_from(["teleport", "uniform", "leak"]),
)
@settings(deadline=None, max_examples=150)
def test_distributions_are_matrix_powers(data, graph, flow, d, mode):
    value = st.sampled_from([0.0, 1.0, 2.5])
    vector = st.lists(value, min_size=graph.n, max_size=graph.n).filter(any).map(np.array)
    start = data.draw(vector)
    teleport = data.draw(st.none() | vector)
    chosen = SurferSettings(flow=flow, damping=d, dangling=mode, teleport=teleport)
    found = walk(graph, start, chosen, steps=6, places=graph.n, most=0)
    matrix = chain_of(graph, flow, d, mode, teleport)
    lasting = None if found.stationary.refusal else found.stationary.scores
    ever = np.zeros(graph.n, dtype=bool)
    for step in found.steps:
        p = np.linalg.matrix_power(matrix, step.step) @ (start / start.sum())
        ever |= p > 0
        told = np.zeros(graph.n)
        told[[place.node for place in step.places]] = [place.mass for place in step.places]
        assert np.abs(told - p).sum() <= step.error + 1e-13
        assert step.lost == pytest.approx(1 - p.sum(), abs=1e-12)
        assert step.home == pytest.approx(p[start > 0].sum(), abs=1e-12)
        assert step.reached == ever.sum()
        assert step.holding == np.count_nonzero(p)
        held = np.cumsum(np.sort(p)[::-1])
        if p.sum() > 0:
            assert held[step.half - 1] >= held[-1] / 2 * (1 - 1e-9)
            assert step.half == 1 or held[step.half - 2] < held[-1] / 2
        if lasting is not None:
            assert step.distance == pytest.approx(np.abs(p - lasting).sum() / 2, abs=1e-12)
    assert np.array_equal(found.last, told) or np.abs(found.last - told).sum() < 1e-12
    if lasting is not None:
        distances = [step.distance for step in found.steps]
        assert all(b <= a + 1e-9 for a, b in pairwise(distances))
        assert np.abs(matrix @ lasting - lasting).sum() < 1e-8


@pytest.mark.parametrize("n", [3, 5, 12])
@pytest.mark.parametrize("eps", [0.19, 1e-3, 1e-6])
def test_complete_graph_in_closed_form(n, eps):
    """K_n: the eigenvalues are 1 and -1/(n - 1), so the distance is (1 - 1/n) / (n - 1)^t."""
    graph = of(complete(n))
    found = walk(graph, at(graph, 0), steps=4, eps=eps)
    for step in found.steps:
        assert step.distance == pytest.approx((1 - 1 / n) / (n - 1) ** step.step, abs=1e-9)
    assert found.mixed == math.ceil(math.log((1 - 1 / n) / eps) / math.log(n - 1) - 1e-9)
    values = sorted(mode.real for mode in found.modes)
    assert values[-1] == pytest.approx(1)
    assert np.allclose(values[:-1], -1 / (n - 1))


def test_a_cycle_goes_round_for_good():
    """Eigenvalues of the directed cycle are the roots of unity; its period is its length."""
    graph = of(cycle(6))
    found = walk(graph, at(graph, 0), steps=9)
    assert found.period == 6
    assert found.mixed is None
    assert found.searched == 9
    assert [step.places[0].node for step in found.steps] == [0, 1, 2, 3, 4, 5, 0, 1, 2, 3]
    assert all(step.distance == pytest.approx(5 / 6) for step in found.steps)
    assert np.allclose([mode.modulus for mode in found.modes], 1)
    assert sorted(round(mode.period, 6) for mode in found.modes if mode.period == mode.period) == [
        2, 3, 3, 6, 6,
    ]  # fmt: skip
    jumping = walk(graph, at(graph, 0), SurferSettings(damping=0.5), steps=2)
    assert jumping.period is None
    assert jumping.mixed is not None
    assert jumping.mixed <= steps_at_most(0.5, 0.01)


def test_karate_mixes_as_its_second_eigenvalue_says():
    """Zachary's club as networkx carries it; eigenvalues by numpy of the symmetric form."""
    import networkx as nx

    graph = from_networkx(nx.karate_club_graph())
    found = walk(graph, at(graph, 16), steps=3, eps=1e-3)
    matrix = dense(graph)
    root = np.sqrt(matrix.sum(axis=1))
    values = np.linalg.eigvalsh(matrix / np.outer(root, root))
    second = sorted(np.abs(values))[-2]
    assert found.modes[1].modulus == pytest.approx(second, rel=1e-9)
    chain, p = chain_of(graph, "along", 1.0, "teleport", None), at(graph, 16)
    x = matrix.sum(axis=1) / matrix.sum()
    expected = 0
    while np.abs(p - x).sum() / 2 > 1e-3:
        p, expected = chain @ p, expected + 1
    assert found.mixed == expected


@given(graphs(), st.sampled_from([0.3, 0.85, 1.0]), st.integers(0, 8))
@settings(deadline=None, max_examples=80)
def test_the_decomposition_is_the_walk(graph, d, t):
    n = graph.n
    jump = np.full(n, 1 / n)
    chain = dense_chain(graph, "along", d, jump, jump)
    assert np.allclose(chain, chain_of(graph, "along", d, "teleport", None), atol=1e-14)
    start = at(graph, 0)
    values, vectors, parts = decompose(chain, start)
    assert (np.diff(np.abs(values)) <= 1e-9).all()
    if n > 1 and d < 1:  # Haveliwala and Kamvar 2003: the second eigenvalue is at most d
        assert abs(values[1]) <= d + 1e-6
    if parts is not None:
        p = (vectors * values**t) @ parts
        assert np.allclose(p, np.linalg.matrix_power(chain, t) @ start, atol=1e-6)


def test_walkers_that_leak_have_nowhere_to_settle():
    graph = of(path(4))
    found = walk(graph, at(graph, 0), SurferSettings(damping=1.0, dangling="leak"), steps=5)
    assert "lost at nodes without out-edges" in found.stationary.refusal.sentence
    assert [step.lost for step in found.steps] == [0, 0, 0, 0, 1, 1]
    assert found.mixed is None
    assert math.isnan(found.steps[0].distance)
    assert found.steps[-1].places == ()


def test_two_closed_classes_have_no_one_distribution():
    graph = build(4, [(0, 1), (1, 0), (2, 3), (3, 2)])
    found = walk(graph, at(graph, 0), steps=3)
    assert "2 closed classes" in found.stationary.refusal.sentence
    assert found.mixed is None
    assert found.steps[-1].places[0].mass == 1.0


def test_what_cannot_be_walked():
    graph = of(path(3))
    with pytest.raises(SettingsError, match="zero everywhere"):
        walk(graph, np.zeros(3))
    with pytest.raises(SettingsError, match="eps is 1"):
        walk(graph, at(graph, 0), eps=1.0)
    with pytest.raises(SettingsError, match="number of steps"):
        walk(graph, at(graph, 0), steps=-1)
    with pytest.raises(SettingsError, match="no nodes"):
        walk(build(0, []), np.zeros(0))
    stopped = Watch()
    stopped.cancel()
    with pytest.raises(Interrupted):
        walk(graph, at(graph, 0), watch=stopped)


def test_one_node():
    found = walk(build(1, []), np.ones(1), steps=2)
    assert found.mixed == 0
    assert [step.home for step in found.steps] == [1.0, 1.0, 1.0]
