"""The references of these tests agree with networkx and with closed forms before they judge."""

from __future__ import annotations

import exact
import networkx as nx
import numpy as np
import pytest
from graphs import build, classics, dense, to_networkx
from mpmath import mpf


@pytest.mark.parametrize("name", ["florentine", "davis"])
def test_the_exact_references_agree_with_networkx(name: str) -> None:
    graph = classics()[name]
    other = to_networkx(graph)
    ranks = nx.pagerank(other, tol=1e-13, max_iter=1000)
    assert [float(x) for x in exact.surfer(graph, "along", 0.85)] == pytest.approx(
        [ranks[i] for i in range(graph.n)], abs=1e-11
    )
    rho = max(np.linalg.eigvalsh(dense(graph)))
    walks = nx.katz_centrality_numpy(other, alpha=0.5 / rho, normalized=False)
    assert [float(x) for x in exact.katz(graph, "along", 0.5 / rho)] == pytest.approx(
        [walks[i] for i in range(graph.n)], rel=1e-11
    )
    if nx.is_connected(other):
        vector = nx.eigenvector_centrality_numpy(other)
        found = exact.eigenvector(graph, "along")
        assert found is not None
        assert [float(x) for x in found] == pytest.approx(
            [abs(vector[i]) for i in range(graph.n)], abs=1e-11
        )


def test_the_exact_perron_vector_of_a_path() -> None:
    # lambda = 2 cos(pi / (n + 1)), x_j proportional to sin(j pi / (n + 1)): textbook.
    graph = build(6, [(i, i + 1) for i in range(5)], directed=False)
    (rho, nodes, y), *rest = exact.radii(graph, "along")
    assert rest == []
    assert nodes == list(range(6))
    assert abs(rho - 2 * exact.mpmath.cos(exact.mpmath.pi / 7)) < mpf(10) ** -50
    sines = [exact.mpmath.sin(k * exact.mpmath.pi / 7) for k in range(1, 7)]
    assert max(abs(a / b - y[0] / sines[0]) for a, b in zip(y, sines, strict=True)) < mpf(10) ** -45
