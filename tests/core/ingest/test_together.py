"""Tables of the same system on one numbering of ids."""

import tempfile
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference import assert_sound, edges_of

from kingpost.core.errors import InputError, RowsError
from kingpost.core.ingest import load, load_together

IDS = st.integers(0, 9)
ROWS = st.lists(st.tuples(IDS, IDS), min_size=1, max_size=8)


@settings(max_examples=30, deadline=None)
@given(st.lists(ROWS, min_size=2, max_size=3), st.data())
def test_one_numbering_of_all_ids(tables, data):
    kinds = [data.draw(st.sampled_from([pa.int16(), pa.int64(), pa.uint32()])) for _ in tables]
    with tempfile.TemporaryDirectory() as folder:
        paths = []
        for at, (rows, kind) in enumerate(zip(tables, kinds, strict=True)):
            paths.append(Path(folder) / f"{at}.parquet")
            columns = {"source": [u for u, _ in rows], "target": [v for _, v in rows]}
            table = pa.table({name: pa.array(ids, kind) for name, ids in columns.items()})
            pq.write_table(table, paths[-1])
        found = load_together(*paths)
        alone = [load(path) for path in paths]
    everyone = sorted({node for rows in tables for row in rows for node in row})
    assert found.labels.to_pylist() == everyone
    assert len({graph.labels.type for graph in found.graphs}) == 1
    parts = zip(found.graphs, found.places, found.nodes, alone, strict=True)
    for graph, place, nodes, own in parts:
        assert_sound(graph)
        assert edges_of(graph) == edges_of(own)
        names = graph.labels.to_pylist()
        assert [everyone[i] for i in place] == names
        assert [names[i] if i >= 0 else None for i in nodes] == [
            name if name in names else None for name in everyone
        ]


def test_numbers_and_text_of_text_files_meet(tmp_path):
    (tmp_path / "a.csv").write_text("source,target\n1,2\n")
    (tmp_path / "b.csv").write_text("source,target\n2,x7\n")
    found = load_together(tmp_path / "a.csv", tmp_path / "b.csv")
    assert found.labels.to_pylist() == ["1", "2", "x7"]
    assert [graph.labels.to_pylist() for graph in found.graphs] == [["1", "2"], ["2", "x7"]]


def test_tables_that_do_not_go_together(tmp_path):
    pq.write_table(pa.table({"source": [1], "target": [2]}), tmp_path / "a.parquet")
    pq.write_table(pa.table({"source": ["1"], "target": ["2"]}), tmp_path / "b.parquet")
    pq.write_table(pa.table({"caller": [1], "target": [2]}), tmp_path / "c.parquet")
    with pytest.raises(InputError, match="which do not go together"):
        load_together(tmp_path / "a.parquet", tmp_path / "b.parquet")
    with pytest.raises(InputError, match=r"'source' of \S*a.parquet is missing from \S*c.parquet"):
        load_together(tmp_path / "a.parquet", tmp_path / "c.parquet")
    with pytest.raises(InputError, match="two tables at least"):
        load_together(tmp_path / "a.parquet")


def test_options_hold_for_all(tmp_path):
    for name, weights in (("a", [1.0, 5.0]), ("b", [6.0, 2.0])):
        columns = {"source": ["x", "y"], "target": ["y", "z"], "weight": weights}
        pq.write_table(pa.table(columns), tmp_path / f"{name}.parquet")
    paths = [tmp_path / "a.parquet", tmp_path / "b.parquet"]
    found = load_together(*paths, where="weight > 4")
    assert [edges_of(graph) for graph in found.graphs] == [{("y", "z"): 5.0}, {("x", "y"): 6.0}]
    assert [nodes.tolist() for nodes in found.nodes] == [[-1, 0, 1], [0, 1, -1]]
    with pytest.raises(RowsError, match="true for none"):
        load_together(*paths, where="weight > 5.5")
