"""Total communicability and subgraph centrality against mpmath, scipy, networkx, closed forms."""

from __future__ import annotations

import mpmath
import networkx as nx
import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.sparse.linalg import expm_multiply

from kingpost.core.graph import Adjacency, Graph
from kingpost.core.ingest import from_table
from kingpost.core.measures.communicability import MEASURE, CommunicabilitySettings
from kingpost.core.result import BoundKind, Stop
from kingpost.core.watch import Watch


def graph_of(edges, directed=True, extra=()):
    """A graph of (source, target, weight) triples; ``extra`` nodes come in by dropped loops."""
    rows = [*edges, *((node, node, 1.0) for node in extra)]
    table = pa.table(
        {
            "source": pa.array([u for u, _, _ in rows], pa.int64()),
            "target": pa.array([v for _, v, _ in rows], pa.int64()),
            "weight": pa.array([w for _, _, w in rows], pa.float64()),
        }
    )
    return from_table(table, directed=directed, loops="drop" if extra else "keep")


def dense(graph):
    matrix = np.zeros((graph.n, graph.n))
    for node in range(graph.n):
        near, weights = graph.outward.row(node)
        matrix[node, near] = weights
    return matrix


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, CommunicabilitySettings(**chosen), watch)


def exact(matrix, factor, flow):
    """``e^{c A^T} 1`` in 60 digits, by mpmath's own exponential (scaling and squaring of Pade)."""
    with mpmath.workdps(60):
        taken = mpmath.matrix((matrix.T if flow == "along" else matrix).tolist())
        return [mpmath.fsum(row) for row in mpmath.expm(taken * factor, method="pade").tolist()]


EDGES = st.lists(
    st.tuples(
        st.integers(0, 5), st.integers(0, 5), st.sampled_from([1e-6, 0.25, 1.0, 1.0, 3.0, 40.0])
    ),
    min_size=1,
    max_size=14,
    unique_by=lambda e: e[:2],
)

FLOWS = st.sampled_from(["along", "against"])


@settings(max_examples=60, deadline=None)
@given(
    EDGES, st.booleans(), st.sampled_from(["along", "against"]), st.sampled_from([0.1, 1.0, 3.0])
)
def test_every_bound_holds_in_sixty_digits(edges, directed, flow, t):
    graph = graph_of(edges, directed)
    for scale in ("rho", "none"):
        found = rank(graph, flow=flow, inverse_temperature=t, scale=scale)
        truth = exact(dense(graph), found.facts["factor"], flow)
        assert found.stop in (Stop.CONVERGED, Stop.STALLED)
        assert found.bound.kind is BoundKind.COMPONENTWISE
        for score, error, right in zip(found.scores, found.bound.absolute, truth, strict=True):
            assert abs(mpmath.mpf(float(score)) - right) <= mpmath.mpf(float(error))
        assert found.bound.value <= 1e-10


def test_the_scaled_one_does_not_depend_on_the_unit_of_the_weights():
    edges = [(0, 1, 2.0), (1, 2, 3.0), (2, 0, 1.0), (2, 3, 5.0), (1, 0, 0.5)]
    one = rank(graph_of(edges)).scores
    other = rank(graph_of([(u, v, w * 2.0**40) for u, v, w in edges])).scores
    np.testing.assert_allclose(one, other, rtol=1e-9)


@pytest.mark.parametrize("flow", ["along", "against"])
def test_scipys_action_of_the_exponential(flow):
    rng = np.random.default_rng(3)
    edges = {(int(u), int(v)) for u, v in rng.integers(0, 400, (3000, 2))}
    graph = graph_of([(u, v, 1.0 + (u * v) % 3) for u, v in sorted(edges)])
    matrix = dense(graph)
    taken = matrix.T if flow == "along" else matrix
    for chosen in ({"scale": "none"}, {"scale": "rho", "inverse_temperature": 5.0}):
        found = rank(graph, flow=flow, **chosen)
        right = expm_multiply(taken * found.facts["factor"], np.ones(graph.n))
        np.testing.assert_allclose(found.scores, right, rtol=1e-8)
        assert found.stop is Stop.CONVERGED


def test_networkx_communicability_adds_up_to_it():
    club = nx.karate_club_graph()
    graph = graph_of([(u, v, 1.0) for u, v in club.edges], directed=False)
    every = nx.communicability_exp(nx.Graph(club.edges))
    found = rank(graph, scale="none")
    right = [sum(every[node].values()) for node in range(34)]
    np.testing.assert_allclose(found.scores, right, rtol=1e-9)
    assert "rho" not in found.facts  # nothing was divided by it, so it had not to be known


def test_an_acyclic_graph_is_summed_to_its_end():
    graph = graph_of([(k, k + 1, 3.0) for k in range(6)])
    found = rank(graph)
    right = [sum(3.0**j / float(mpmath.factorial(j)) for j in range(k + 1)) for k in range(7)]
    np.testing.assert_allclose(found.scores, right, rtol=1e-14)
    assert "no walk is longer than 6 steps" in found.reason
    assert "rho is 0" in found.conventions["c"]
    assert found.bound.value < 1e-12


def test_beyond_double_precision_it_says_so():
    clique = [(u, v, 100.0) for u in range(12) for v in range(12) if u != v]
    found = rank(graph_of(clique), scale="none")
    assert found.stop is Stop.REFUSED
    assert "1100" in found.refusal.reason
    assert "--scale rho" in found.refusal.instead
    chain = rank(graph_of([(k, k + 1, 1e40) for k in range(40)]))
    assert chain.stop is Stop.REFUSED
    assert "log1p" in chain.refusal.instead


def test_ties_are_proven_and_singles_count_one():
    leaves = graph_of([(0, k, 1.0) for k in range(1, 6)], directed=False, extra=[9])
    found = rank(leaves, scale="none")
    assert found.proven_order == leaves.n
    assert found.scores[-1] == 1.0
    assert found.standing.range_of(1) == (2, 6)
    assert not found.exact_zero.any()


def test_one_node_and_none():
    assert rank(graph_of([], extra=[4])).scores.tolist() == [1.0]
    assert rank(graph_of([(4, 4, 2.0)])).scores[0] == pytest.approx(np.e, rel=1e-9)
    nobody = Adjacency(np.zeros(1, np.int64), np.empty(0, np.uint32))
    empty = rank(Graph(pa.array([], pa.int64()), nobody, nobody))
    assert empty.stop is Stop.REFUSED
    assert "no nodes" in empty.reason


def test_stops_early_at_a_proven_order_and_at_the_limit():
    edges = [(u, v, 1.0) for u in range(30) for v in range(30) if u != v and v % (u % 5 + 1) == 0]
    graph = graph_of(edges)
    whole = rank(graph, scale="none", tol=1e-12)
    early = rank(graph, scale="none", tol=1e-12, stop="order:1")
    assert early.stop is Stop.ORDER_PROVEN
    assert early.sweeps < whole.sweeps
    short = rank(graph, scale="none", max_sweeps=3)
    assert short.stop is Stop.LIMIT
    assert (short.scores <= whole.scores).all()
    assert [line.index for line in whole.log] == list(range(1, whole.sweeps + 1))


def test_cancelled_it_keeps_what_it_has():
    graph = graph_of([(u, (u + 1) % 50, 9.0) for u in range(50)])
    watch = Watch()
    lines = []

    def stop(line):
        lines.append(line)
        if len(lines) == 30:
            watch.cancel()

    found = MEASURE.rank(graph, CommunicabilitySettings(scale="none"), watch, stop)
    assert found.stop is Stop.CANCELLED
    assert (found.scores <= np.exp(9.0)).all()
    assert (found.scores + found.bound.absolute >= np.exp(9.0)).all()
    watch = Watch()
    watch.cancel()
    found = rank(graph, watch)
    assert found.stop is Stop.CANCELLED
    assert found.bound.kind is BoundKind.NONE


def test_the_same_bits_for_one_thread_and_two():
    rng = np.random.default_rng(5)
    graph = graph_of(
        [(int(u), int(v), 1.0) for u, v in set(map(tuple, rng.integers(0, 90, (900, 2))))]
    )
    one, two = rank(graph, Watch(threads=1)), rank(graph, Watch(threads=2))
    assert (one.scores == two.scores).all()
    assert (one.bound.absolute == two.bound.absolute).all()
