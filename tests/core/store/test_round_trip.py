"""A graph or result from the store is, bit for bit, the one that was read or solved."""

import datetime as dt
import gc
import os
import tempfile
import tracemalloc
from decimal import Decimal
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from keeping import bits, graph_facts, result_facts

from kingpost.core.ingest import load
from kingpost.core.measures import NAMES, measure
from kingpost.core.measures.base import finish
from kingpost.core.measures.radius import spectral_radius
from kingpost.core.open import open_graph
from kingpost.core.result import Stop
from kingpost.core.store.results import keep_result, result_key, solve
from kingpost.core.watch import Watch

TEXT = st.text(st.characters(exclude_categories=["Cs"]), max_size=4)
KINDS = {
    "int8": (pa.int8(), st.integers(-128, 127)),
    "uint64": (pa.uint64(), st.integers(0, 2**64 - 1)),
    "string": (pa.string(), TEXT),
    "large string": (pa.large_string(), TEXT),
    "dictionary": (pa.dictionary(pa.int16(), pa.string()), TEXT),
    "binary": (pa.binary(), st.binary(max_size=3)),
    "decimal": (pa.decimal128(9, 2), st.integers(0, 9).map(Decimal)),
    "timestamp": (pa.timestamp("us"), st.datetimes(dt.datetime(1900, 1, 1))),
    "bool": (pa.bool_(), st.booleans()),
}
# Bringing hundreds of small files to a disk takes longer than everything else here.
IN_MEMORY = "/dev/shm" if os.access("/dev/shm", os.W_OK) else None
WEIGHTS = st.sampled_from([1.0, 1.0, 0.1, 2.5, 1e16, 1e-300])


@st.composite
def tables(draw):
    kind, values = KINDS[draw(st.sampled_from(sorted(KINDS)))]
    pool = st.sampled_from(draw(st.lists(values, min_size=1, max_size=7)))
    size = draw(st.integers(1, 24))
    columns = {
        name: pa.array(draw(st.lists(pool, min_size=size, max_size=size)), kind)
        for name in ("source", "target")
    }
    if draw(st.booleans()):
        columns["weight"] = pa.array(draw(st.lists(WEIGHTS, min_size=size, max_size=size)))
    return pa.table(columns)


def node_table(draw, labels):
    """Attributes of several types, nulls among them, for some of the nodes."""
    known = labels.take(
        pa.array(draw(st.lists(st.integers(0, len(labels) - 1), max_size=5)), pa.int64())
    )
    size = len(known)
    return pa.table(
        {
            "id": known,
            "team": pa.array(draw(st.lists(st.none() | TEXT, min_size=size, max_size=size)))
            .cast(pa.string())
            .dictionary_encode(),
            "load": pa.array(
                draw(st.lists(st.none() | st.floats(), min_size=size, max_size=size)), pa.float64()
            ),
            "tags": pa.array([["x"]] * size, pa.list_(pa.string())),
        }
    )


@given(st.data())
@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_graph_and_its_results_come_back_as_they_were(data):
    table = data.draw(tables())
    directed = data.draw(st.booleans())
    options = {"directed": directed, "parallel": data.draw(st.sampled_from(["sum", "first"]))}
    with tempfile.TemporaryDirectory(dir=IN_MEMORY) as name:
        folder = Path(name)
        path = folder / "edges.parquet"
        pq.write_table(table, path)
        if data.draw(st.booleans()):
            ids = load(path, **options).labels
            pq.write_table(node_table(data.draw, ids), folder / "nodes.parquet")
            options |= {"nodes": str(folder / "nodes.parquet"), "node_id": "id"}
        plain = load(path, **options)
        first = open_graph(path, store=folder / "shelf", tell=pytest.fail, **options)
        again = open_graph(path, store=folder / "shelf", tell=pytest.fail, **options)
        assert graph_facts(first) == graph_facts(again) == graph_facts(plain)
        name = data.draw(st.sampled_from(sorted(NAMES)))
        solved = finish(measure(name).solve(plain, measure(name).settings()))
        if solved.refusal is not None:
            return
        for graph, fresh in ((first, True), (again, False)):
            result = finish(solve(measure(name), graph))
            assert result_facts(result) == result_facts(solved)
            assert (result.solved_on is None) == fresh
            assert keep_result(measure(name), graph, result, Watch()) is None


@pytest.fixture
def knot(tmp_path):
    """Two strong components, dangling nodes, and twins whose scores tie."""
    edges = [(0, 1), (1, 2), (2, 0), (2, 3), (3, 4), (4, 3), (4, 5), (4, 6), (0, 7), (7, 1)]
    path = tmp_path / "knot.parquet"
    source, target = zip(*edges, strict=True)
    pq.write_table(pa.table({"source": source, "target": target}), path)
    return path


@pytest.mark.parametrize("name", NAMES)
def test_every_measure_comes_back_and_says_so(desk, knot, name):
    solved = desk.rank(desk.open(knot), name)
    assert desk.told == []
    kept = desk.rank(desk.open(knot), name)
    assert solved.solved_on is None
    assert kept.solved_on.endswith("Z")
    assert result_facts(kept) == result_facts(solved)
    assert kept.seconds == solved.seconds
    assert [line.seconds for line in kept.log] == [line.seconds for line in solved.log]


def test_what_is_kept_is_mapped_and_cannot_be_written_to(desk, knot):
    for graph in (desk.open(knot), desk.open(knot)):
        for array in (graph.outward.offsets, graph.outward.neighbours, graph.structure.order):
            assert not array.flags.writeable
            assert not array.flags.owndata


def test_a_solve_over_the_files_makes_no_copy_of_the_edges(desk, tmp_path, monkeypatch):
    """So that a graph larger than memory can be ranked with only vectors over its nodes in it.

    Smaller graphs are laid out anew in memory to be swept faster; every graph is a large one here.
    """
    monkeypatch.setattr("kingpost.core.layout._MOST", 0)
    rng = np.random.default_rng(1)
    columns = dict(zip(("source", "target"), rng.integers(0, 1_000, (2, 800_000)), strict=True))
    path = tmp_path / "dense.parquet"
    pq.write_table(pa.table(columns | {"weight": rng.random(800_000)}), path)
    for options in ({}, {"parallel": "first", "weight_as": "none"}):
        graph = desk.open(path, **options)
        assert graph.weighted != bool(options)
        edges = graph.outward.neighbours.nbytes
        assert edges > 200 * 8 * graph.n
        for name in ("surfer", "eigenvector", "katz", "degree"):
            chosen = measure(name)
            _ = finish(chosen.solve(graph)).standing  # loads code, which takes memory too
            graph = desk.open(path, **options)
            gc.collect()
            tracemalloc.start()
            assert finish(chosen.solve(graph)).standing.proven >= 0
            peak = tracemalloc.get_traced_memory()[1]
            tracemalloc.stop()
            assert peak < edges, (name, peak, edges)


SETTINGS = [
    {},
    {"damping": 0.5},
    {"damping": np.nextafter(0.5, 1)},
    {"flow": "against"},
    {"tol": 1e-6},
    {"stop": "order:1"},
    {"teleport": {"a": 1.0}},
    {"teleport": {"a": 1.0, "b": 1.0}},
    {"teleport": {"b": 1.0, "a": 1.0}},
    {"teleport": np.array([1.0, 0, 0, 0, 0, 0, 0])},
    {"teleport": np.array([2.0, 0, 0, 0, 0, 0, 0])},
    {"dangling": "uniform"},
    {"max_sweeps": 9},
]


def test_settings_that_differ_have_keys_that_differ():
    surfer = measure("surfer")
    keys = [result_key(surfer, surfer.settings(**given)) for given in SETTINGS]
    assert None not in keys
    assert len(set(keys)) == len(SETTINGS)
    again = [result_key(surfer, surfer.settings(**given)) for given in SETTINGS]
    assert again == keys
    assert result_key(measure("katz"), measure("katz").settings()) not in keys


def test_each_of_them_finds_its_own_result(desk, edges):
    for chosen in SETTINGS:
        desk.rank(desk.open(edges), **chosen)
    for chosen in SETTINGS:
        kept = desk.rank(desk.open(edges), **chosen)
        assert kept.solved_on is not None
        assert result_facts(kept) == result_facts(load(edges).rank("surfer", **chosen))


@pytest.mark.parametrize("name", ["katz", "communicability"])
def test_a_result_does_not_depend_on_what_was_asked_before(tmp_path, name):
    """Else one that is kept would not be the one that is solved."""
    rng = np.random.default_rng(3)
    source, target = rng.integers(0, 60, (2, 400))
    path = tmp_path / "random.parquet"
    pq.write_table(pa.table({"source": source, "target": target}), path)
    fresh, asked = load(path), load(path)
    narrow = finish(spectral_radius(asked, 1e-15, Watch()))
    wide = finish(spectral_radius(asked, 1e-9, Watch()))
    assert narrow != wide
    assert bits(asked.rank(name).scores) == bits(fresh.rank(name).scores)


def test_code_that_differs_is_another_solver(desk, edges, monkeypatch):
    desk.rank(desk.open(edges))
    assert desk.rank(desk.open(edges)).solved_on is not None
    monkeypatch.setattr("kingpost.core.store.results.code_of", lambda *parts: "another")
    assert desk.rank(desk.open(edges)).solved_on is None
    monkeypatch.undo()
    monkeypatch.setattr("kingpost.core.store.results.libraries", lambda: {"numpy": "9.9"})
    assert desk.rank(desk.open(edges)).solved_on is None


def test_what_is_unfinished_or_foreign_is_not_kept(desk, edges):
    graph = desk.open(edges)
    surfer, watch = measure("surfer"), Watch()
    watch.cancel()
    cancelled = finish(surfer.solve(graph, None, watch))
    assert cancelled.stop is Stop.CANCELLED
    _ = cancelled.standing
    keep_result(surfer, graph, cancelled, Watch())
    solved = finish(surfer.solve(graph))
    keep_result(surfer, graph, solved, Watch())  # its order is not known yet
    _ = solved.standing
    keep_result(surfer, graph, solved, watch)  # ties may be missing
    foreign = type(surfer)("surfer", "S", "", surfer.settings, lambda *given: surfer.solver(*given))
    keep_result(foreign, graph, solved, Watch())
    assert desk.results == []
    keep_result(surfer, graph, solved, Watch())
    assert len(desk.results) == 1


def test_results_go_with_the_content_of_a_graph_and_no_other(desk, edges, tmp_path):
    desk.rank(desk.open(edges))
    copy = tmp_path / "copy.parquet"
    copy.write_bytes(edges.read_bytes())
    graph = desk.open(copy)
    assert graph.origin.name == "copy.parquet"
    assert desk.rank(graph).solved_on is not None
    assert desk.rank(desk.open(edges, directed=False)).solved_on is None
    assert desk.rank(desk.open(edges, weight_as="none")).solved_on is None


def test_a_changed_copy_of_a_graph_has_no_results(desk, edges):
    import dataclasses

    graph = desk.open(edges)
    desk.rank(graph)
    other = dataclasses.replace(graph, outward=graph.inward, inward=graph.outward)
    assert other.drawer is None
    assert desk.rank(other).solved_on is None


def test_empty_and_edgeless_graphs(desk, tmp_path):
    path = tmp_path / "loop.parquet"
    pq.write_table(pa.table({"source": [1], "target": [1]}), path)
    first, again = (desk.open(path, loops="drop") for _ in range(2))
    assert (again.n, again.m) == (1, 0)
    assert graph_facts(first) == graph_facts(again)
