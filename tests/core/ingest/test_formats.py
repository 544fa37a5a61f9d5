"""Arrow IPC, Matrix Market and GraphML: the same graph and account, one sentence for trouble."""

import bz2
import contextlib
import gzip
import io
import tempfile
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
import scipy.io
import scipy.sparse as sp
from hypothesis import given, settings
from hypothesis import strategies as st
from reference import Refused, agree, assert_sound, edges_of, expected
from test_against_reference import POLICIES, tables

from kingpost.core.errors import InputError, RowsError
from kingpost.core.ingest import from_table, graphml, load, matrix_market

EDGES = pa.table({"source": ["a", "b", "b"], "target": ["b", "c", "c"], "weight": [1.0, 2.0, 4.0]})


def ipc(table, new=pa.ipc.new_file, **options):
    sink = io.BytesIO()
    with new(sink, table.schema, options=pa.ipc.IpcWriteOptions(**options)) as writer:
        writer.write_table(table, max_chunksize=2)
    return sink.getvalue()


def sentence(call, kind=InputError):
    with pytest.raises(kind) as caught:
        call()
    text = caught.value.sentence
    assert "\n" not in text
    assert not text.endswith(".")
    return text


@settings(max_examples=40, deadline=None)
@given(tables(), POLICIES, st.sampled_from(["file", "stream"]), st.sampled_from([None, "zstd"]))
def test_arrow_files_give_what_the_reference_gives(made, policies, form, packing):
    rows, pieces, weighted = made
    new = pa.ipc.new_file if form == "file" else pa.ipc.new_stream
    with tempfile.TemporaryDirectory() as folder:
        for at, piece in enumerate(pieces):
            data = ipc(piece, new, compression=packing)
            (Path(folder) / f"{at}.arrow").write_bytes(data)
        try:
            want = expected(rows, weighted=weighted, **policies)
        except Refused:
            with pytest.raises(RowsError):
                load(folder, **policies)
            return
        agree(load(folder, **policies), want)


@pytest.mark.parametrize("name", ["x.arrow", "x.feather", "x.arrows", "x.arrow.gz", "x", "x.dat"])
@pytest.mark.parametrize("new", [pa.ipc.new_file, pa.ipc.new_stream])
def test_arrow_by_name_and_by_first_bytes(tmp_path, name, new):
    data = ipc(EDGES, new)
    (tmp_path / name).write_bytes(gzip.compress(data) if name.endswith("gz") else data)
    assert load(tmp_path / name).fingerprint == from_table(EDGES).fingerprint


@pytest.mark.parametrize("new", [pa.ipc.new_file, pa.ipc.new_stream])
def test_an_arrow_file_cut_off_anywhere_is_noticed(tmp_path, new):
    data = ipc(EDGES, new)
    path = tmp_path / "x.arrow"
    for size in range(1, len(data), 37):
        path.write_bytes(data[:size])
        with contextlib.suppress(InputError):
            graph = load(path)
            # A stream may lawfully end between two batches; then it is said.
            assert any("no end mark" in note for note in graph.account.notes)
    path.write_bytes(data)
    assert not any("end mark" in note for note in load(path).account.notes)


def test_arrow_offsets_that_point_elsewhere(tmp_path):
    bad = pa.Array.from_buffers(
        pa.string(), 2, [None, pa.py_buffer(np.array([0, 900, 1], np.int32)), pa.py_buffer(b"ab")]
    )
    table = pa.Table.from_arrays([bad, bad], names=["source", "target"])
    (tmp_path / "x.arrow").write_bytes(ipc(table))
    assert "damaged" in sentence(lambda: load(tmp_path / "x.arrow"))


def test_first_version_feather(tmp_path):
    (tmp_path / "x.feather").write_bytes(b"FEA1" + b"\0" * 40)
    assert "version 1" in sentence(lambda: load(tmp_path / "x.feather"))


def test_filters_and_nodes_on_arrow(tmp_path):
    (tmp_path / "x.arrow").write_bytes(ipc(EDGES))
    (tmp_path / "n.arrow").write_bytes(ipc(pa.table({"id": ["b", "c"], "team": ["x", "x"]})))
    graph = load(
        tmp_path / "x.arrow", where="weight > 1.5", nodes=str(tmp_path / "n.arrow"),
        node_where="team = 'x'",
    )  # fmt: skip
    assert edges_of(graph) == {("b", "c"): 6.0}


def test_a_folder_of_one_format_or_another(tmp_path):
    (tmp_path / "a.arrow").write_bytes(ipc(EDGES))
    assert load(tmp_path).m == 2
    (tmp_path / "b.csv").write_text("source,target\na,z\n")
    assert "several formats (a.arrow, b.csv)" in sentence(lambda: load(tmp_path))
    pq.write_table(EDGES, tmp_path / "c.parquet")
    assert load(tmp_path).n == 3


def test_what_a_file_is_told_to_be(tmp_path):
    (tmp_path / "x.parquet").write_text("source,target\na,b\n")
    assert load(tmp_path / "x.parquet", read_as="csv").m == 1
    assert "no Parquet file" in sentence(lambda: load(tmp_path / "x.parquet"))


# Matrix Market: read by scipy, compared with what scipy wrote.


@settings(max_examples=25, deadline=None)
@given(st.data())
def test_a_matrix_that_scipy_wrote(data):
    n = data.draw(st.integers(1, 5))
    places = st.tuples(st.integers(0, n - 1), st.integers(0, n - 1))
    entries = data.draw(st.dictionaries(places, st.sampled_from([0.5, 1.0, 3.0]), min_size=1))
    symmetry = data.draw(st.sampled_from(["general", "symmetric"]))
    pattern = data.draw(st.booleans())
    directed = data.draw(st.booleans())
    if symmetry == "symmetric":
        entries = {(max(pair), min(pair)): w for pair, w in entries.items()}
        entries |= {(v, u): w for (u, v), w in entries.items()}
    rows, columns = zip(*entries, strict=True)
    matrix = sp.coo_array((list(entries.values()), (rows, columns)), shape=(n, n))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "x.mtx"
        field = "pattern" if pattern else "real"
        scipy.io.mmwrite(path, matrix, field=field, symmetry=symmetry)
        graph = load(path, directed=directed)
    assert_sound(graph)
    want = {}
    for (u, v), w in entries.items():
        if not directed:
            if symmetry == "symmetric" and u > v:
                continue  # the same entry seen from the other side
            u, v = min(u, v), max(u, v)
        want[u + 1, v + 1] = want.get((u + 1, v + 1), 0) + (1 if pattern else w)
    assert edges_of(graph) == want
    notes = " ".join(graph.account.notes)
    assert ("read both ways" in notes) == (symmetry == "symmetric" and directed)
    silent = n - graph.n
    assert (f"{silent:,} of {n:,} rows and columns hold no entry" in notes) == (silent > 0)


HEAD = "%%MatrixMarket matrix coordinate real general\n"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("hello\n", "line 1 is 'hello'"),
        (HEAD, "ends within its header"),
        (HEAD + "3 3\n1 1 1\n", "line 2 is '3 3'"),
        (HEAD + "3 4 1\n1 1 1\n", "3 rows and 4 columns"),
        (HEAD + "3 3 0\n", "holds no entries"),
        (HEAD + "3 3 2\n1 1 1\n", "Truncated"),
        (HEAD + "3 3 1\n1 9 1\n", "Line 3"),
        (HEAD + "3 3 1\n1 x 1\n", "Line 3"),
        (HEAD + "3 3 900000000000\n1 1 1\n", "900,000,000,000 entries"),
        (HEAD.replace("real", "complex") + "1 1 1\n1 1 1 0\n", "complex values"),
        (HEAD.replace("coordinate", "array") + "1 1\n1\n", "dense matrix"),
        (HEAD.replace("general", "skew-symmetric") + "2 2 1\n2 1 1\n", "skew-symmetric"),
    ],
)
def test_a_matrix_that_cannot_be_a_graph(tmp_path, text, words):
    (tmp_path / "x.mtx").write_text(text)
    assert words in sentence(lambda: load(tmp_path / "x.mtx"))


def test_matrices_packed_negative_zero_and_repeated(tmp_path):
    text = HEAD + "3 3 4\n1 2 1\n1 2 2\n2 3 0\n3 1 -1\n"
    for name, pack in (("x.mtx.gz", gzip.compress), ("x.mtx.bz2", bz2.compress), ("x", bytes)):
        (tmp_path / name).write_bytes(pack(text.encode()))
        graph = load(tmp_path / name, bad_rows="skip")
        assert edges_of(graph) == {(1, 2): 3.0}
        account = graph.account
        assert (account.merged, account.zero_weight) == (1, 1)
        assert account.skipped == {"negative weight": 1}


def test_the_limit_of_entries_is_stated(monkeypatch, tmp_path):
    monkeypatch.setattr(matrix_market, "MOST_ENTRIES", 2)
    (tmp_path / "x.mtx").write_text(HEAD + "3 3 3\n1 2 1\n1 3 1\n2 3 1\n")
    assert "up to 2 entries only" in sentence(lambda: load(tmp_path / "x.mtx"))


# GraphML: read by networkx, compared with what networkx wrote.


@settings(max_examples=20, deadline=None)
@given(st.data())
def test_a_graph_that_networkx_wrote(data):
    directed = data.draw(st.booleans())
    graph = (nx.MultiDiGraph if directed else nx.MultiGraph)()
    names = data.draw(st.lists(st.sampled_from(["a", "b", "ü", "7"]), min_size=1, unique=True))
    for at, name in enumerate(names):
        graph.add_node(name, team="red" if at % 2 else "blue", size=at)
    ends = st.tuples(st.sampled_from(names), st.sampled_from(names), st.sampled_from([0.5, 2.0]))
    edges = data.draw(st.lists(ends, min_size=1, max_size=6))
    for u, v, w in edges:
        graph.add_edge(u, v, weight=w)
    read_directed = data.draw(st.booleans())
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "x.graphml"
        nx.write_graphml(graph, path)
        found = load(path, directed=read_directed)
    assert_sound(found)
    rows = list(edges)
    if not directed and read_directed:
        rows += [(v, u, w) for u, v, w in edges if u != v]
    want = expected(
        rows, weighted=True, directed=read_directed, parallel="sum", loops="keep",
        bad_rows="refuse", weight_as="asis",
    )  # fmt: skip
    agree(found, want)
    at = {name: i for i, name in enumerate(names)}
    assert found.attributes.column("size").to_pylist() == [at[n] for n in want.labels]
    assert found.account.nodes_unknown == len(names) - found.n


XML = """<?xml version="1.0"?>
{}<graphml xmlns="http://graphml.graphdrawing.org/xmlns">
<graph edgedefault="directed"><node id="a"/><node id="b"/><edge source="a" target="b"/>
</graph></graphml>
"""
BOMB = '<!DOCTYPE x [<!ENTITY a "ha"><!ENTITY b "&a;&a;&a;&a;">]>\n'


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (XML.format(BOMB), "line 2 declares a document type"),
        (XML.format('<!DOCTYPE x SYSTEM "file:///etc/passwd">\n'), "line 2 declares"),
        (XML.format("")[:120], "no well-formed XML"),
        ("<html></html>", "which is no GraphML"),
        ("", "is empty"),
        (XML.format("").replace('<edge source="a" target="b"/>', ""), "holds no edges"),
        (XML.format("").replace(' target="b"', ""), "cannot be read as GraphML"),
    ],
)
def test_graphml_that_cannot_be_read(tmp_path, text, words):
    (tmp_path / "x.graphml").write_text(text)
    assert words in sentence(lambda: load(tmp_path / "x.graphml"))


def test_the_limit_of_graphml_holds_for_what_is_unpacked(tmp_path, monkeypatch):
    monkeypatch.setattr(graphml, "MOST_BYTES", 5_000_000)
    data = gzip.compress(b"<graphml>" + b" " * 6_000_000)
    assert len(data) < 10_000
    (tmp_path / "x.graphml.gz").write_bytes(data)
    assert "more than 5,000,000 bytes" in sentence(lambda: load(tmp_path / "x.graphml.gz"))


def test_graphml_nodes_serve_the_filter(tmp_path):
    graph = nx.DiGraph()
    graph.add_node("a", team="red")
    graph.add_node("b", team="blue")
    graph.add_node("c", team="red")
    graph.add_edges_from([("a", "b"), ("a", "c"), ("c", "a")])
    nx.write_graphml(graph, tmp_path / "x.graphml")
    found = load(tmp_path / "x.graphml", node_where="team = 'red' AND id < 'z'")
    assert edges_of(found) == {("a", "c"): 1.0, ("c", "a"): 1.0}
