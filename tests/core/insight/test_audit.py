"""The structure of a graph, against networkx, numpy and small graphs counted by hand."""

from __future__ import annotations

import json
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import Interrupted
from kingpost.core.export.audit_report import audit_json, audit_text
from kingpost.core.export.jsonable import dumps
from kingpost.core.graph import Graph
from kingpost.core.ingest import describe, from_table, load
from kingpost.core.insight.audit import QUANTILES, density, examine, quantiles
from kingpost.core.watch import Watch


def graph_of(edges: list[tuple[int, int]], **options: object) -> Graph:
    source, target = zip(*edges, strict=True)
    return from_table(pa.table({"source": source, "target": target}), **options)


def random_edges(seed: int, n: int, m: int) -> list[tuple[int, int]]:
    rng = np.random.default_rng(seed)
    return [(int(u), int(v)) for u, v in rng.integers(0, n, (m, 2))]


@pytest.mark.parametrize("seed", range(12))
def test_a_random_directed_graph_as_networkx_sees_it(seed: int) -> None:
    edges = random_edges(seed, 40, 20 + 12 * seed)
    graph, other = graph_of(edges), nx.DiGraph(edges)
    found = examine(graph)
    assert (found.nodes, found.edges) == (len(other), other.number_of_edges())
    assert found.self_loops == nx.number_of_selfloops(other)
    assert found.dangling == sum(d == 0 for _, d in other.out_degree())
    assert found.sources == sum(d == 0 for _, d in other.in_degree())
    assert found.isolated == 0
    weak = list(nx.weakly_connected_components(other))
    assert (found.weak, found.weak_largest) == (len(weak), max(map(len, weak)))
    strong = list(nx.strongly_connected_components(other))
    assert (found.strong, found.strong_largest) == (len(strong), max(map(len, strong)))
    holds = [c for c in strong if other.subgraph(c).number_of_edges()]
    inside = sum(other.subgraph(c).number_of_edges() for c in holds)
    assert found.cyclic == len(holds)
    assert found.cyclic_share == pytest.approx(inside / other.number_of_edges(), rel=1e-15)
    plain = nx.DiGraph((u, v) for u, v in other.edges if u != v)
    plain.add_nodes_from(other)
    assert found.density == pytest.approx(nx.density(plain), rel=1e-15)
    if not holds:
        assert found.period is None
        return
    most = max(other.subgraph(c).number_of_edges() for c in holds)
    main = [other.subgraph(c) for c in holds if other.subgraph(c).number_of_edges() == most]
    assert (found.period_nodes, found.period == 1) in [(len(c), nx.is_aperiodic(c)) for c in main]


@pytest.mark.parametrize("seed", range(12))
def test_the_spectral_radius_is_inside_its_bracket(seed: int) -> None:
    # numpy's dense eigenvalues; they are exact to about n * eps * norm, well inside 1e-6 for the
    # matrices here unless an eigenvalue is defective, as a nilpotent part may be.
    edges = random_edges(seed, 30, 15 + 10 * seed)
    graph = graph_of(edges, parallel="sum")
    matrix = np.zeros((graph.n, graph.n))
    for node in range(graph.n):
        near, weights = graph.outward.row(node)
        matrix[node, near] = weights
    low, high = examine(graph).radius
    if graph.structure.acyclic:
        assert (low, high) == (0.0, 0.0)
        return
    rho = max(abs(np.linalg.eigvals(matrix)))
    slack = 1e-6 * rho
    assert low - slack <= rho <= high + slack
    assert high - low <= 1e-3 * high


@pytest.mark.parametrize(
    ("edges", "period", "rho"),
    [
        ([(0, 1), (1, 2), (2, 0)], 3, 1.0),
        ([(0, 1), (1, 0)], 2, 1.0),
        ([(0, 1), (1, 0), (0, 0)], 1, (1 + 5**0.5) / 2),
        # Two cycles of 4 and 6 through one node: period gcd(4, 6) = 2.
        ([(0, 1), (1, 2), (2, 3), (3, 0), (0, 4), (4, 5), (5, 6), (6, 7), (7, 8), (8, 0)], 2, None),
        # Complete graph on 4 nodes without loops: rho = 3.
        ([(u, v) for u in range(4) for v in range(4) if u != v], 1, 3.0),
        ([(5, 5)], 1, 1.0),
    ],
)
def test_periods_and_radii_in_closed_form(
    edges: list[tuple[int, int]], period: int, rho: float | None
) -> None:
    found = examine(graph_of(edges))
    assert found.period == period
    low, high = found.radius
    assert low <= high
    if rho is not None:
        assert low <= rho * (1 + 1e-12)
        assert rho <= high * (1 + 1e-12)


def test_the_radius_is_that_of_the_greatest_component() -> None:
    # A 2-cycle feeding a complete graph on 3 nodes: 1 and 2.
    edges = [(0, 1), (1, 0), (1, 2)] + [(u, v) for u in (2, 3, 4) for v in (2, 3, 4) if u != v]
    low, high = examine(graph_of(edges)).radius
    assert low <= 2.0 * (1 + 1e-12)
    assert high * (1 + 1e-12) >= 2.0
    assert low > 1.9


def test_an_acyclic_graph_is_told_as_such() -> None:
    found = examine(graph_of([(0, 1), (1, 2), (0, 2)]))
    assert (found.cyclic, found.cyclic_share, found.period) == (0, 0.0, None)
    assert found.radius == (0.0, 0.0)
    assert (found.dangling, found.sources) == (1, 1)


def test_undirected_edges_count_once() -> None:
    found = examine(graph_of([(0, 1), (1, 2), (2, 2)], directed=False))
    assert (found.edges, found.self_loops) == (3, 1)
    # Two of the three possible pairs.
    assert found.density == pytest.approx(2 / 3)
    assert found.in_degrees == found.out_degrees


def test_quantiles_are_degrees_that_occur() -> None:
    degrees = np.array([0] * 50 + [1] * 40 + [7] * 9 + [400], dtype=np.int64)
    # Least value with at least that share of the 100 nodes at or below it, by hand.
    assert dict(zip(QUANTILES, quantiles(degrees), strict=True)) == {
        0.0: 0,
        0.25: 0,
        0.5: 0,
        0.75: 1,
        0.9: 1,
        0.99: 7,
        1.0: 400,
    }
    assert quantiles(np.array([], dtype=np.int64)) == (0,) * len(QUANTILES)


def test_one_node_has_no_density() -> None:
    assert density(graph_of([(1, 1)])) == 0.0


def test_weights_and_edges_of_weight_zero() -> None:
    table = pa.table({"source": [1, 2, 3], "target": [2, 3, 4], "weight": [0.5, 2.0, 0.0]})
    found = examine(from_table(table))
    assert found.weights is not None
    assert (found.weights.least, found.weights.greatest, found.weights.total) == (0.5, 2.0, 2.5)
    assert (found.zero_weight, found.isolated, found.nodes) == (1, 1, 4)


def test_a_cancelled_watch_stops_it() -> None:
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        examine(graph_of([(0, 1), (1, 0)]), watch)


@pytest.fixture
def file(tmp_path: Path) -> str:
    path = tmp_path / "hostile.parquet"
    table = pa.table(
        {
            "source": ["\x1b[31m", "b", None, "b"],
            "target": ["b", "c", "d", "c"],
            "weight": [1.0, 2.0, 3.0, 4.0],
            "note \x1b[0m": ["x", "y", "z", "z"],
        }
    )
    pq.write_table(table, path)
    return str(path)


def test_report_as_text_and_json(file: str) -> None:
    graph, table = load(file, bad_rows="skip"), describe(file)
    found = examine(graph)
    text = audit_text(graph, found, table, 80)
    assert "\x1b" not in text
    assert max(map(len, text.splitlines())) <= 80
    for words in ("4 rows in", "source", "note \\e[0m", "skipped", "merged", "strong components"):
        assert words in text, words
    answer = json.loads(dumps(audit_json(graph, found, table)))
    assert list(answer) == ["table", "input", "account", "memory", "structure"]
    assert answer["table"]["rows"] == 4
    assert answer["account"]["rows_read"] == 4
    assert sum(answer["account"]["skipped"].values()) == 1
    structure = answer["structure"]
    assert (structure["nodes"], structure["edges"], structure["period"]) == (3, 2, None)
    assert structure["out_degrees"]["1.0"] == 1
    assert structure["fingerprint"] == graph.fingerprint
    assert audit_text(graph, found, table, 80, ascii_only=True).isascii()
