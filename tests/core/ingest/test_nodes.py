"""Node attributes joined by id, and vectors of node values read from files."""

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from reference import assert_sound

from kingpost.core.errors import InputError
from kingpost.core.ingest import from_table, load, read_node_values

EDGES = pa.table({"source": ["a", "b", "c"], "target": ["b", "c", "d"]})


def write(path, columns):
    pq.write_table(pa.table(columns), path)
    return str(path)


def test_attributes_come_in_node_order(tmp_path):
    path = write(
        tmp_path / "nodes.parquet",
        {
            "tier": [1, 2, 3, 4, 5, 6],
            "node": ["c", "a", "z", "c", None, "b"],
            "team": ["x", "y", "x", "w", "w", None],
        },
    )
    graph = from_table(EDGES, nodes=path)
    assert_sound(graph)
    assert graph.attributes.to_pydict() == {
        "tier": [2, 6, 1, None],
        "team": ["y", None, "x", None],
    }
    a = graph.account
    assert (a.nodes_rows, a.nodes_joined, a.nodes_unknown, a.nodes_repeated, a.nodes_missing) == (
        6, 3, 2, 1, 1,
    )  # fmt: skip
    assert graph.origin.nodes_file == path
    assert graph.origin.node_id == "node"
    assert f"took node of {path} as the node id (name it with --node-id)" in a.notes


def test_types_of_ids_meet(tmp_path):
    edges = pa.table(
        {"source": pa.array([1, 2], pa.int32()), "target": pa.array([2, 3], pa.int32())}
    )
    path = write(tmp_path / "nodes.parquet", {"id": pa.array([3, 2**40, 1]), "x": ["c", "-", "a"]})
    graph = from_table(edges, nodes=path)
    assert graph.labels.type == pa.int32()
    assert graph.attributes["x"].to_pylist() == ["a", None, "c"]
    assert graph.account.nodes_unknown == 1


def test_dictionary_ids_and_attributes(tmp_path):
    path = write(
        tmp_path / "nodes.parquet",
        {
            "id": pa.array(["d", "a"]).dictionary_encode(),
            "team": pa.array(["x", "x"]).dictionary_encode(),
        },
    )
    graph = from_table(EDGES, nodes=path)
    assert graph.attributes["team"].to_pylist() == ["x", None, None, "x"]


@pytest.mark.parametrize(
    "columns", [{"who": ["a"], "tier": [1]}, {"tier": [1], "Name": ["a"], "t": ["x"]}]
)
def test_the_id_column_is_guessed(columns, tmp_path):
    graph = from_table(EDGES, nodes=write(tmp_path / "nodes.parquet", columns))
    assert graph.origin.node_id in ("who", "Name")
    assert graph.account.nodes_joined == 1


def test_the_id_column_is_the_one_whose_values_match(tmp_path):
    path = write(tmp_path / "nodes.parquet", {"team": ["x", "y"], "service": ["a", "b"]})
    graph = from_table(EDGES, nodes=path)
    assert graph.origin.node_id == "service"
    assert graph.account.nodes_joined == 2


def test_an_unclear_id_column(tmp_path):
    path = write(tmp_path / "nodes.parquet", {"team": ["x"], "service": ["y"]})
    with pytest.raises(InputError, match=r"not clear which column of .* name it with --node-id"):
        from_table(EDGES, nodes=path)
    with pytest.raises(InputError, match="no column 'servic'; did you mean service"):
        from_table(EDGES, nodes=path, node_id="servic")
    assert from_table(EDGES, nodes=path, node_id="service").account.nodes_joined == 0


def test_ids_of_another_sort(tmp_path):
    path = write(tmp_path / "nodes.parquet", {"id": [1], "x": ["a"]})
    with pytest.raises(InputError, match="of type int64, the ids of the edges are of type string"):
        from_table(EDGES, nodes=path, node_id="id")


def test_a_nodes_table_without_rows(tmp_path):
    path = write(
        tmp_path / "nodes.parquet", {"id": pa.array([], pa.string()), "x": pa.array([], pa.int8())}
    )
    graph = from_table(EDGES, nodes=path)
    assert graph.attributes["x"].to_pylist() == [None] * 4
    assert graph.account.nodes_missing == 4


def test_a_nodes_table_in_text(tmp_path):
    path = tmp_path / "nodes.csv"
    path.write_text("id,team\n01,x\n1,y\nNA,z\n")
    edges = pa.table({"source": ["01", "NA"], "target": ["1", "01"]})
    graph = from_table(edges, nodes=str(path))
    assert graph.attributes["team"].to_pylist() == ["x", "y", "z"]
    numbers = pa.table({"source": [1], "target": [2]})
    path.write_text("id,team\n2,x\n1,y\n")
    assert from_table(numbers, nodes=str(path)).attributes["team"].to_pylist() == ["y", "x"]
    path.write_text("id,team\nzz,x\n")
    with pytest.raises(InputError, match="does not read as ids of type int64"):
        from_table(numbers, nodes=str(path), node_id="id")


@pytest.mark.parametrize("content", [b"PAR1x", b"", b"id\n"])
def test_broken_nodes_files(content, tmp_path):
    path = tmp_path / "nodes.parquet"
    path.write_bytes(content)
    with pytest.raises(InputError):
        from_table(EDGES, nodes=str(path))
    with pytest.raises(InputError, match="there is no file"):
        from_table(EDGES, nodes=str(tmp_path / "none.csv"))


@pytest.mark.parametrize("ending", ["parquet", "csv", "tsv", "csv.gz"])
def test_values_in_node_order(ending, tmp_path):
    import gzip

    path = tmp_path / f"v.{ending}"
    if ending == "parquet":
        write(path, {"node": ["d", "a"], "p": [0.25, 3]})
    else:
        text = "node,p\nd,0.25\na,3\n".replace(",", "\t" if ending == "tsv" else ",").encode()
        path.write_bytes(gzip.compress(text) if ending.endswith("gz") else text)
    assert read_node_values(path, from_table(EDGES)).tolist() == [3.0, 0.0, 0.0, 0.25]


def test_values_of_a_named_column(tmp_path):
    path = write(tmp_path / "v.parquet", {"id": ["a"], "p": [1], "q": [2]})
    graph = from_table(EDGES)
    assert read_node_values(path, graph, "q").tolist() == [2.0, 0.0, 0.0, 0.0]
    with pytest.raises(InputError, match=r"which column of .* holds the values"):
        read_node_values(path, graph)
    with pytest.raises(InputError, match="no column 'r'"):
        read_node_values(path, graph, "r")
    with pytest.raises(InputError, match="values of nodes are numbers"):
        read_node_values(write(tmp_path / "w.parquet", {"id": ["a"], "p": ["x"]}), graph, "p")


@pytest.mark.parametrize(
    ("ids", "values", "words"),
    [
        (["a", "x", "y"], [1.0] * 3, "2 nodes that the graph does not hold: x, y"),
        (["a", None], [1.0] * 2, "1 node that the graph does not hold: null"),
        (["a", "a", "b"], [1.0] * 3, "1 node more than one value, for example a"),
        (["a", "b"], [1.0, -1.0], r"1 value that is negative or no number \(row 2, b: -1\)"),
        (["a", "b"], [None, float("nan")], r"2 values that are .* \(row 1, a: null\)"),
        (["a"], [float("inf")], "row 1, a: inf"),
    ],
)
def test_values_that_cannot_be_used(ids, values, words, tmp_path):
    path = write(tmp_path / "v.parquet", {"id": ids, "p": pa.array(values, pa.float64())})
    with pytest.raises(InputError, match=words):
        read_node_values(path, from_table(EDGES))


def test_integer_ids_and_values_are_told_apart(tmp_path):
    graph = from_table(pa.table({"source": [1], "target": [2]}))
    path = write(tmp_path / "v.parquet", {"id": [2], "count": [7]})
    assert read_node_values(path, graph).tolist() == [0.0, 7.0]


def test_load_joins_as_well(tmp_path):
    pq.write_table(EDGES, tmp_path / "edges.parquet")
    nodes = write(tmp_path / "nodes.parquet", {"id": ["a"], "x": [1]})
    assert load(tmp_path / "edges.parquet", nodes=nodes).attributes.num_rows == 4


def test_attributes_that_are_views(tmp_path):
    nodes = pa.table(
        {
            "id": ["a", "b", "x"],
            "text": pa.array(["1", None, "3"], pa.string_view()),
            "raw": pa.array([b"1", b"\xff", b"3"], pa.binary_view()),
        }
    )
    pq.write_table(nodes, tmp_path / "nodes.parquet")
    edges = pa.table({"source": ["a", "b", "c"], "target": ["b", "c", "a"]})
    graph = from_table(edges, nodes=str(tmp_path / "nodes.parquet"))
    assert graph.attributes.column("text").to_pylist() == ["1", None, None]
    assert graph.attributes.column("raw").to_pylist() == [b"1", b"\xff", None]
