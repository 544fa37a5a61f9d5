"""Scores made elsewhere: what they solve is found, named and bounded; what solves nothing is not.

``foreign.json`` holds one graph and its scores by networkx 3.6.1, igraph 1.0.0, NetworKit 11.3 and
scikit-network 0.33.0 under their own defaults (``tests/bench/foreign.py`` writes it).
"""

from __future__ import annotations

import json
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import kingpost.core as kp
from kingpost.core.errors import InputError, Interrupted
from kingpost.core.graph import Graph
from kingpost.core.ingest.again import rereadings
from kingpost.core.ingest.scores import Rounding, of_values, read_scores, rounding_of
from kingpost.core.insight.verify import CLOSE, EXACT, NONE, verify

HELD = json.loads((Path(__file__).parent / "foreign.json").read_text())

# library and function -> equation, flow, weights, parameter, what the tool calls it
WANTED = {
    "networkx pagerank": ("surfer", "along", "asis", 0.85, "networkx.pagerank"),
    "networkx eigenvector_centrality": (
        "eigenvector", "along", "none", None, "networkx.eigenvector_centrality",
    ),
    "networkx katz_centrality alpha=0.05": ("katz", "along", "none", 0.05, None),
    "networkx hits hubs": ("authorities", "against", "asis", None, "networkx.hits (hubs)"),
    "networkx hits authorities": (
        "authorities", "along", "asis", None, "networkx.hits (authorities)",
    ),
    "networkx in_degree_centrality": (
        "degree", "along", "none", None, "networkx.in_degree_centrality",
    ),
    "networkx degree_centrality": (
        "total degree", "along", "none", None, "networkx.degree_centrality",
    ),
    "igraph pagerank": ("surfer", "along", "none", 0.85, "igraph pagerank"),
    "igraph pagerank weighted": ("surfer", "along", "asis", 0.85, None),
    "igraph pagerank undirected": ("surfer", "along", "count", 0.85, "igraph pagerank"),
    "igraph eigenvector_centrality": (
        "eigenvector", "along", "none", None, "igraph eigenvector_centrality",
    ),
    "igraph hub_score": ("authorities", "against", "none", None, "igraph hub_score"),
    "igraph authority_score": ("authorities", "along", "none", None, "igraph authority_score"),
    "igraph strength in": ("degree", "along", "asis", None, None),
    "networkit PageRank": ("surfer", "along", "asis", 0.85, "NetworKit PageRank"),
    "networkit PageRank unweighted": ("surfer", "along", "none", 0.85, "NetworKit PageRank"),
    "networkit EigenvectorCentrality": (
        "eigenvector", "along", "asis", None, "NetworKit EigenvectorCentrality",
    ),
    "networkit EigenvectorCentrality unweighted": (
        "eigenvector", "along", "none", None, "NetworKit EigenvectorCentrality",
    ),
    "networkit KatzCentrality unweighted": (
        "katz shifted", "along", "none", 1 / 15, "NetworKit KatzCentrality",
    ),
    "scikit-network PageRank": (
        "surfer, landing on dangling", "along", "asis", 0.85, "scikit-network PageRank",
    ),
    "scikit-network Katz": (
        "katz without beta in steps", "along", "none", 0.5, "scikit-network Katz",
    ),
    "scikit-network HITS row": (
        "authorities", "against", "asis", None, "scikit-network HITS (rows)",
    ),
    "scikit-network HITS col": (
        "authorities", "along", "asis", None, "scikit-network HITS (columns)",
    ),
}  # fmt: skip


@pytest.fixture(scope="module")
def graph() -> Graph:
    return kp.from_edges([tuple(edge) for edge in HELD["edges"]])


def held(name: str) -> np.ndarray:
    library, _, function = name.partition(" ")
    for key, scores in HELD["scores"].items():
        if key.startswith(library):
            return np.array(scores[function])
    raise KeyError(name)


@pytest.mark.parametrize("name", WANTED)
def test_defaults_of_other_libraries_are_recognised(graph: Graph, name: str) -> None:
    form, flow, weights, parameter, library = WANTED[name]
    found = verify(graph, held(name))
    best = found.best
    assert found.verdict in (EXACT, CLOSE)
    assert (best.fit.form, best.flow, best.choice.weights) == (form, flow, weights)
    assert best.choice.undirected == ("undirected" in name)
    if parameter is not None:
        (one,) = best.parameters.values()
        assert one.value == pytest.approx(parameter, rel=1e-12)
    if library is not None:
        assert library in found.libraries
    if form != "surfer, landing on dangling":
        assert best.error is not None
        assert best.error < 2e-5
    assert found.alike == ()


def test_the_error_bound_holds_against_a_finer_solve(graph: Graph) -> None:
    """networkx stops at 1e-6 a node: how far that is, against numpy's dense solution."""
    other = nx.DiGraph()
    other.add_nodes_from(range(graph.n))
    other.add_weighted_edges_from(map(tuple, HELD["edges"]))
    a = nx.to_numpy_array(other)
    out = a.sum(axis=1)
    p = np.divide(a, out[:, None], out=np.full_like(a, 1 / len(a)), where=out[:, None] > 0)
    exact = np.linalg.solve(np.eye(len(a)) - 0.85 * p.T, np.full(len(a), 0.15 / len(a)))
    scores = held("networkx pagerank")
    found = verify(graph, scores)
    true = np.abs(scores - exact).sum()
    assert found.best.error is not None
    assert 0.5 * true <= found.best.error <= 1.01 * true + 1e-9


def test_a_graph_that_was_folded_otherwise_fits_nothing_and_the_miss_is_said(graph: Graph) -> None:
    # networkx keeps one of the two weights where edges meet: no policy of ours.
    found = verify(graph, held("networkx pagerank undirected"))
    assert found.verdict == NONE
    assert found.best.fit.form.startswith("surfer")
    assert found.best.choice.undirected
    assert 0.05 < found.best.fit.unexplained < 0.5
    assert found.libraries == ()
    noise = np.random.default_rng(1).random(graph.n)
    assert verify(graph, noise).verdict == NONE


@settings(max_examples=12, deadline=None)
@given(
    st.sampled_from([("surfer", "damping", 0.3, 0.95), ("katz", "alpha_fraction", 0.2, 0.9)]),
    st.integers(0, 99),
    st.sampled_from(["along", "against"]),
    st.integers(0, 10**6),
)
def test_any_parameter_is_recovered(kind: tuple, step: int, flow: str, seed: int) -> None:
    name, setting, low, high = kind
    rng = np.random.default_rng(seed)
    rows = [(i, (i + 1) % 30, 1.0) for i in range(30)]
    rows += [(int(u), int(v), float(w)) for u, v, w in rng.integers(1, 30, (90, 3)) if u != v]
    graph = kp.from_edges(rows)
    value = low + (high - low) * step / 99
    result = graph.rank(name, flow=flow, tol=1e-13, **{setting: value})
    found = verify(graph, result.scores * 17.5)
    wanted = value if name == "surfer" else result.facts["alpha"]
    assert found.verdict in (EXACT, CLOSE)
    assert (found.best.fit.form, found.best.flow) == (name, flow)
    (one,) = found.best.parameters.values()
    assert one.value == pytest.approx(wanted, rel=1e-6)
    assert found.best.error is not None
    assert found.best.error < 1e-6


@pytest.mark.parametrize(("digits", "words"), [(4, "4 decimals"), (6, "6 decimals")])
def test_printed_digits_are_seen_and_explain_the_residual(
    graph: Graph, digits: int, words: str
) -> None:
    scores = np.round(graph.rank("surfer", damping=0.8).scores, digits)
    found = verify(graph, scores)
    assert found.foreign.rounding.words == f"rounded to {words}"
    assert found.best.fit.within_rounding
    assert found.verdict == EXACT
    assert found.best.parameters["damping"].value == 0.8


def test_rounding_is_told_by_the_digits() -> None:
    values = np.random.default_rng(5).random(200) * 10.0 ** np.random.default_rng(6).integers(
        -9, 3, 200
    )
    assert rounding_of(values) == Rounding()
    assert rounding_of(np.round(values + 1, 3)) == Rounding(decimals=3)
    assert rounding_of(np.array([float(f"{v:.4e}") for v in values])) == Rounding(digits=5)
    assert rounding_of(values.astype(np.float32).astype(float)).single
    assert rounding_of(np.array([1.0, 2, 7])) == Rounding()
    for rounding, rounded in [
        (Rounding(decimals=3), np.round(values, 3)),
        (Rounding(digits=5), np.array([float(f"{v:.4e}") for v in values])),
        (Rounding(single=True), values.astype(np.float32).astype(float)),
    ]:
        assert (np.abs(values - rounded) <= rounding.reach(rounded)).all()


def test_missing_nodes_set_rows_aside(graph: Graph) -> None:
    scores = graph.rank("surfer", tol=1e-13).scores.copy()
    scores[[50, 55, 59]] = np.nan  # they feed nobody
    found = verify(graph, scores)
    assert (found.verdict, found.foreign.missing, found.best.fit.rows) == (EXACT, 3, graph.n - 3)
    scores[:55] = np.nan
    with pytest.raises(InputError, match="too few nodes"):
        verify(graph, scores)


def test_signs_scales_and_what_tells_nothing(graph: Graph) -> None:
    vector = graph.rank("eigenvector").scores
    found = verify(graph, -3 * vector)
    assert found.negated
    assert found.best.fit.form == "eigenvector"
    assert found.scale.startswith("sum ")
    with pytest.raises(InputError, match=r"all 60 scores .* equal 0.25"):
        verify(graph, np.full(60, 0.25))
    with pytest.raises(InputError, match="ranks 1 to 60"):
        verify(graph, np.argsort(vector) + 1.0)
    with pytest.raises(InputError, match="shape"):
        verify(graph, np.ones(3))
    with pytest.raises(InputError, match="infinite"):
        verify(graph, np.where(vector > vector.mean(), np.inf, vector))


def test_on_a_regular_graph_several_equations_fit_alike() -> None:
    # One hub and a ring: all spokes are alike, so any two-parameter equation fits.
    rows = [("hub", f"n{i}") for i in range(8)] + [(f"n{i}", "hub") for i in range(8)]
    graph = kp.from_edges(rows)
    found = verify(graph, graph.rank("surfer").scores)
    assert found.verdict == EXACT
    assert len(found.alike) >= 2


def test_parallel_rows_are_read_again_as_other_software_reads_them(tmp_path: Path) -> None:
    rng = np.random.default_rng(8)
    rows = [(f"n{i}", f"n{(i + 1) % 40}", 1.0) for i in range(40)]
    rows += [(f"n{u}", f"n{v}", float(w)) for u, v, w in rng.integers(1, 40, (400, 3))]
    source, target, weight = zip(*rows, strict=True)
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": source, "target": target, "weight": weight}), path)
    graph = kp.load(path)
    again = rereadings([str(path)], kp.LoadOptions(), graph, kp.Watch())
    assert set(again) == {"count", "last", "first"}
    simple, multi = nx.DiGraph(), nx.MultiDiGraph()
    for u, v, w in rows:
        simple.add_edge(u, v, weight=w)  # the last row of an edge stays
        multi.add_edge(u, v)
    for other, policy in [(simple, "last"), (multi, "count")]:
        scores = nx.pagerank(other, tol=1e-12, max_iter=500)
        values = np.array([scores[graph.label(i)] for i in range(graph.n)])
        found = verify(graph, values, reload=again)
        assert (found.verdict, found.best.fit.form) in ((EXACT, "surfer"), (CLOSE, "surfer"))
        assert found.best.choice.weights == policy
        assert verify(graph, values).verdict == NONE
    assert rereadings([str(path)], kp.LoadOptions(), kp.load(path, parallel="first"), kp.Watch())
    assert rereadings([], kp.LoadOptions(), kp.from_edges([(1, 2)]), kp.Watch()) == {}
    plain = kp.from_edges([(1, 2), (1, 2)])  # the sum of rows without weights is their number
    assert rereadings([], kp.LoadOptions(), plain, kp.Watch()) == {}


def test_a_file_of_scores_is_matched_by_id(tmp_path: Path, graph: Graph) -> None:
    scores = graph.rank("surfer").scores

    def read(text: str, **columns: str):
        path = tmp_path / "scores.csv"
        path.write_text(text)
        return read_scores(path, graph, **columns)

    lines = [f"{i},{float(scores[i])!r}" for i in range(graph.n)]
    found = read("\n".join(["node,score", *lines[1:], "1000,0.5", lines[1], "2000,"]))
    assert (found.missing, found.extra, found.repeated, found.empty) == (1, 2, 1, 1)
    assert found.examples == {"missing": ("0",), "extra": ("1000", "2000")}
    assert np.array_equal(found.scores[1:], scores[1:])
    ranked = [f"{i + 1},{line},{i % 7}" for i, line in enumerate(lines)]
    found = read("\n".join(["rank,node,pagerank,in_degree", *ranked]))
    assert (found.column, found.missing) == ("pagerank", 0)
    for text, words, columns in [
        ("node,rank\n1,1\n2,2\n", "ranks .* and no scores", {}),
        ("node,a,b\n1,1.5,2\n2,2,3\n", "--score-column", {}),
        ("node,score\n1,0.5\n1,0.6\n", "1 two different scores", {}),
        ("node,score\n77,0.5\n", "none of the 60 nodes", {}),
        ("node,score\n1,inf\n", "infinite score in row 1", {}),
        ("node,score\n1,x\n", "of type string", {"score_column": "score"}),
        ("node,score\n1,2\n", "nowhere", {"score_column": "nowhere"}),
    ]:
        with pytest.raises(InputError, match=words):
            read(text, **columns)


def test_a_cancelled_watch_stops_it(graph: Graph) -> None:
    watch = kp.Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        verify(graph, held("networkx pagerank"), watch=watch)


def test_values_in_the_graphs_own_numbering_may_lack_some(graph: Graph) -> None:
    values = np.linspace(0.1, 1, graph.n)
    values[3] = np.nan
    assert of_values(graph, values).missing == 1


LIVE = [("igraph", "pagerank"), ("igraph", "eigenvector_centrality"), ("networkit", "PageRank"),
        ("networkit", "KatzCentrality"), ("sknetwork", "Katz")]  # fmt: skip


@pytest.mark.parametrize(("library", "function"), LIVE)
def test_installed_libraries_still_do_what_they_did(
    graph: Graph, library: str, function: str
) -> None:
    """The fixture's libraries, where installed: a new default shows here."""
    module = pytest.importorskip(library)
    rows = HELD["edges"]
    if library == "igraph":
        other = module.Graph(n=graph.n, edges=[row[:2] for row in rows], directed=True)
        scores = getattr(other, function)()
    elif library == "networkit":
        other = module.Graph(graph.n, weighted=False, directed=True)
        for u, v, _ in rows:
            other.addEdge(u, v)
        scores = getattr(module.centrality, function)(other).run().scores()
    else:
        ranking = pytest.importorskip("sknetwork.ranking")
        from scipy import sparse

        source, target, weight = zip(*rows, strict=True)
        matrix = sparse.csr_matrix((weight, (source, target)), shape=(graph.n, graph.n))
        scores = getattr(ranking, function)().fit_predict(matrix)
    found = verify(graph, np.array(scores, dtype=float))
    assert any(function in name for name in found.libraries)
