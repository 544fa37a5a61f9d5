"""The library as a notebook uses it: every example in its pages runs, and other forms agree."""

from __future__ import annotations

import doctest
import subprocess
import sys
from importlib import import_module
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow as pa
import pytest
from graphs import classics, dense
from scipy import sparse

import kingpost.core as kp
from kingpost.core.errors import InputError, RowsError, SettingsError

ROOT = Path(__file__).parents[2]


@pytest.mark.parametrize("name", ["library", "ingest.memory"])
def test_the_examples_in_docstrings_run(name: str) -> None:
    done = doctest.testmod(import_module(f"kingpost.core.{name}"), raise_on_error=False)
    assert done.attempted >= 5
    assert done.failed == 0


def test_the_examples_in_the_readme_run(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)  # they name the sample tables as a reader of the page would
    done = doctest.testfile(str(ROOT / "README.md"), module_relative=False)
    assert done.attempted >= 8
    assert done.failed == 0


def test_importing_the_library_stays_cheap() -> None:
    program = (
        "import sys, kingpost.core as kp; kp.Watch; assert 'load' in dir(kp);"
        "print({'numba', 'networkx', 'duckdb', 'pyarrow', 'scipy'} & set(sys.modules))"
    )
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, timeout=60, check=True
    )
    assert done.stdout.strip() == "set()"


def test_every_public_name_exists() -> None:
    for name in kp.__all__:
        assert callable(getattr(kp, name)), name
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        _ = kp.nothing


@pytest.mark.parametrize("weight", [None, "weight"])
@pytest.mark.parametrize("name", ["karate", "miserables"])
def test_a_networkx_graph_becomes_its_own_matrix(name: str, weight: str | None) -> None:
    make = {"karate": nx.karate_club_graph, "miserables": nx.les_miserables_graph}[name]
    other = make()
    graph = kp.from_networkx(other, weight=weight)
    order = [graph.label(i) for i in range(graph.n)]
    assert order == sorted(order)
    assert np.array_equal(dense(graph), nx.to_numpy_array(other, order, weight=weight))


@pytest.mark.parametrize("kind", [nx.Graph, nx.DiGraph, nx.MultiGraph, nx.MultiDiGraph])
def test_all_four_kinds_of_networkx_graphs(kind: type) -> None:
    other = kind()
    other.add_weighted_edges_from(
        [("b", "a", 2.0), ("a", "b", 3.0), ("c", "c", 1.5), ("b", "a", 1)]
    )
    other.add_edge("a", "c")
    other.add_node("alone")
    graph = kp.from_networkx(other)
    order = sorted(other)
    assert [graph.label(i) for i in range(graph.n)] == order
    assert np.array_equal(dense(graph), nx.to_numpy_array(other, order))
    assert graph.directed == other.is_directed()
    assert kp.from_networkx(nx.DiGraph()).n == 0


@pytest.mark.parametrize("form", ["csr", "csc", "coo", "lil"])
def test_a_sparse_matrix_of_any_format(form: str) -> None:
    rng = np.random.default_rng(3)
    matrix = sparse.random_array((30, 30), density=0.1, rng=rng, format=form)
    graph = kp.from_scipy(matrix)
    assert np.array_equal(dense(graph), matrix.toarray())
    shuffled = rng.permutation(30)
    again = kp.from_scipy(matrix, labels=[f"n{i:02}" for i in shuffled])
    back = np.argsort(shuffled)
    assert np.array_equal(dense(again), matrix.toarray()[np.ix_(back, back)])


def test_symmetric_matrices_and_stored_zeros() -> None:
    a = np.array([[2.0, 1, 0], [1, 0, 0], [0, 0, 0]])
    graph = kp.from_scipy(sparse.csr_array(a), directed=False)
    assert np.array_equal(dense(graph), a)
    assert (graph.n, graph.m, graph.loop_count) == (3, 2, 1)
    stored = sparse.coo_array(([1.0, 0.0, 2.0], ([0, 1, 0], [1, 0, 1])), (2, 2))
    graph = kp.from_scipy(stored)
    assert (graph.m, graph.account.zero_weight, graph.account.merged) == (1, 1, 1)
    assert dense(graph)[0, 1] == 3.0


def test_what_is_no_graph_is_refused_in_a_sentence() -> None:
    square = sparse.csr_array((2, 2))
    for call, words in [
        (lambda: kp.from_scipy(np.eye(2)), "scipy.sparse"),
        (lambda: kp.from_scipy(sparse.csr_array((2, 3))), "square"),
        (lambda: kp.from_scipy(square, labels=["a"]), "1 label for 2 rows"),
        (lambda: kp.from_scipy(square, labels=["a", "a"]), "not distinct, for example a"),
        (lambda: kp.from_scipy(square, labels=[1, "1"]), "all text or all whole numbers"),
        (lambda: kp.from_scipy(sparse.csr_array([[0, 1], [0, 0]]), directed=False), "symmetric"),
        (lambda: kp.from_networkx(nx.relabel_nodes(nx.path_graph(2), {0: "a"})), "int, str"),
        (lambda: kp.from_networkx(nx.grid_2d_graph(2, 2)), "tuple"),
        (lambda: kp.from_edges([(1, 2), (1, 2, 3.0)]), "weight"),
    ]:
        with pytest.raises(InputError, match=words):
            call()
    for weight in (-1.0, float("nan"), float("inf")):
        with pytest.raises(RowsError, match=r"1 weight is negative, NaN or infinite.* a -> b"):
            kp.from_edges([("a", "b", weight)])
    with pytest.raises(RowsError, match="no number"):
        kp.from_edges([("a", "b", "heavy")])


def test_settings_by_name_are_checked() -> None:
    graph = kp.from_edges([(1, 2), (2, 1)])
    with pytest.raises(SettingsError, match="did you mean damping"):
        graph.rank("surfer", dampng=0.5)
    with pytest.raises(SettingsError, match="at most 1"):
        graph.rank("surfer", damping=1.5)
    with pytest.raises(SettingsError, match="no measure is called 'fame'"):
        graph.rank("fame")


def test_a_result_as_a_table() -> None:
    graph = classics()["davis"]
    result = graph.rank("surfer", tol=1e-12)
    table = result.to_arrow()
    assert table.column_names == ["rank", "rank_low", "rank_high", "node", "score", "bound", "rail"]
    scores = nx.pagerank(nx.from_numpy_array(dense(graph)), tol=1e-14, max_iter=2000)
    for row in table.to_pylist():
        assert abs(row["score"] - scores[row["node"]]) <= row["bound"] + 1e-12
        assert row["rank_low"] <= row["rank"] <= row["rank_high"]
    assert result.top(3).equals(table.slice(0, 3))
    assert "davis" not in repr(result)
    assert repr(result).startswith("<Result surfer: 32 nodes, converged")
    tied = kp.from_edges([("a", "b"), ("a", "c")]).rank("degree").to_arrow()
    assert tied["rail"].to_pylist() == ["tied", "proven", "proven"]
    assert tied["rank_high"].to_pylist() == [2, 2, 3]


def test_a_refused_result_says_why_instead_of_showing_nothing() -> None:
    result = kp.from_edges([("a", "b")]).rank("eigenvector")
    assert repr(result).startswith("<Result eigenvector: refused, the graph has no cycle")
    with pytest.raises(SettingsError, match="no cycle"):
        result.to_arrow()


def test_an_arrow_table_is_read_like_a_file() -> None:
    table = pa.table({"caller": ["a", "b"], "callee": ["b", "c"]})
    graph = kp.from_arrow(table, source="caller", target="callee")
    assert (graph.n, graph.m) == (3, 2)
    assert repr(graph) == "<Graph table: 3 nodes, 2 edges, directed>"
