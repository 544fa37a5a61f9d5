"""Rows filtered by SQL: those that another SQL engine keeps, and one sentence for the rest."""

import datetime as dt
import sqlite3
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference import assert_sound, edges_of, expected

from kingpost.core.errors import InputError, Interrupted, KingpostError, RowsError, SettingsError
from kingpost.core.ingest import files, from_table, load
from kingpost.core.ingest.sql import Expression
from kingpost.core.ingest.where import Filter
from kingpost.core.watch import Watch

NUMBERS = st.none() | st.integers(-3, 3)
REALS = st.none() | st.sampled_from([-1.5, -0.0, 0.0, 0.5, 2.0])
WORDS = st.none() | st.sampled_from(["", "a", "b", "ä", "it's"])


def quoted(value):
    if isinstance(value, str):
        return "'" + value.replace("'", "''") + "'"
    return str(value)


@st.composite
def conditions(draw, depth=2):
    if depth and draw(st.booleans()):
        left, right = draw(conditions(depth - 1)), draw(conditions(depth - 1))
        join = draw(st.sampled_from(["({}) AND ({})", "({}) OR ({})", "NOT ({}) AND ({})"]))
        return join.format(left, right)
    name, pool = draw(
        st.sampled_from(
            [("n", [-4, -2, 0, 1, 3, 9]), ("x", [-2.5, 0.0, 0.5, 3.0]), ("w", ["", "a", "c", "ä"])]
        )
    )
    a, b = (quoted(draw(st.sampled_from(pool))) for _ in range(2))
    operator = draw(st.sampled_from(["=", "<>", "<", "<=", ">", ">="]))
    forms = [f"{name} {operator} {a}", f"{a} {operator} {name}", f"{name} BETWEEN {a} AND {b}"]
    forms += [f"{name} IN ({a}, {b})", f"{name} IS NULL", f"{name} IS NOT NULL"]
    return draw(st.sampled_from(forms))


def truth(columns, condition):
    """True, False or None for every row, by SQLite: another engine of the same standard."""
    with sqlite3.connect(":memory:") as base:
        base.execute("CREATE TABLE t (at INTEGER, n INTEGER, x REAL, w TEXT)")
        rows = zip(columns["n"], columns["x"], columns["w"], strict=True)
        base.executemany("INSERT INTO t VALUES (?, ?, ?, ?)", [(i, *r) for i, r in enumerate(rows)])
        found = base.execute(f"SELECT ({condition}) FROM t ORDER BY at").fetchall()
    return [None if value is None else bool(value) for (value,) in found]


@settings(max_examples=30, deadline=None)
@given(st.data(), conditions(), st.integers(1, 5), st.integers(1, 3))
def test_the_rows_that_another_engine_keeps(data, condition, group_rows, parts):
    size = data.draw(st.integers(1, 16))
    columns = {
        name: data.draw(st.lists(kind, min_size=size, max_size=size))
        for name, kind in (("n", NUMBERS), ("x", REALS), ("w", WORDS))
    }
    ends = st.lists(st.sampled_from("abc"), min_size=size, max_size=size)
    source, target = data.draw(ends), data.draw(ends)
    table = pa.table(
        {"source": source, "target": target}
        | {
            "n": pa.array(columns["n"], pa.int32()),
            "x": pa.array(columns["x"], pa.float64()),
            "w": pa.array(columns["w"], pa.string()),
        }
    )
    values = truth(columns, condition)
    with tempfile.TemporaryDirectory() as folder:
        cut = -(-size // parts)
        for at in range(0, size, cut):
            path = Path(folder) / f"{at:02}.parquet"
            pq.write_table(table.slice(at, cut), path, row_group_size=group_rows)
        kept = [(u, v, 1) for u, v, value in zip(source, target, values, strict=True) if value]
        if not kept:
            with pytest.raises(RowsError, match="is true for none"):
                load(folder, where=condition, weight_as="none")
            return
        graph = load(folder, where=condition, weight_as="none")
    want = expected(
        kept, weighted=False, directed=True, parallel="sum", loops="keep", bad_rows="refuse",
        weight_as="none",
    )  # fmt: skip
    assert_sound(graph)
    assert graph.labels.to_pylist() == want.labels
    assert edges_of(graph) == want.edges
    account = graph.account
    assert account.rows_read == size
    assert account.rows_kept == len(kept)
    assert account.filtered == size - len(kept)
    assert account.filtered_null == values.count(None)
    assert graph.origin.where == condition


def sorted_file(path, rows=1000, group=100):
    days = [dt.date(2024, 1, 1) + dt.timedelta(days=i // 100) for i in range(rows)]
    table = pa.table(
        {
            "source": [f"n{i % 7}" for i in range(rows)],
            "target": [f"n{i % 11}" for i in range(rows)],
            "calls": pa.array(range(rows), pa.int64()),
            "day": days,
            "text": [str(day) for day in days],
            "rate": [float(i) for i in range(rows)],
            "note": [None, *(str(i) for i in range(1, rows))],
        }
    )
    pq.write_table(table, path, row_group_size=group)
    return str(path)


@pytest.mark.parametrize(
    ("where", "kept", "passed_over"),
    [
        ("calls >= 950", 50, 900),
        ("950 <= calls", 50, 900),
        ("calls = 7", 1, 900),
        ("calls BETWEEN 150 AND 249", 100, 800),
        ("calls < 20 AND note <> 'x'", 19, 900),
        ("day = DATE '2024-01-03' AND calls < 250", 50, 900),
        ("day = '2024-01-03'", 100, 900),
        ("text > '2024-01-09'", 100, 900),
        ("rate < 100", 100, 900),
        ("rate > 899", 100, 0),  # statistics do not tell of NaN, which is greater than all
        ("note = 'zz'", 0, 900),  # one group holds a null, which is to be counted
        ("calls >= 950 OR calls < 1", 51, 0),
        ("calls + 0 >= 950", 50, 0),
        ("NOT calls < 950", 50, 0),
    ],
)
def test_row_groups_that_cannot_matter_are_not_read(tmp_path, where, kept, passed_over):
    parts = files.open_parts(sorted_file(tmp_path / "x.parquet"))
    chosen = Filter(where, parts)
    pieces = list(chosen.read(parts[0], ["source"], Watch()))
    assert sum(piece.batch.num_rows for piece in pieces if piece.batch is not None) == kept
    assert sum(piece.rows for piece in pieces) == 1000
    assert chosen.passed_over == passed_over


def test_not_a_number_is_kept_by_greater_than(tmp_path):
    path = tmp_path / "x.parquet"
    rate = [1.0, float("nan"), 2.0, 3.0]
    table = pa.table({"source": list("abcd"), "target": list("bcda"), "rate": rate})
    pq.write_table(table, path, row_group_size=2)
    graph = load(path, where="rate > 2.5", weight_as="none")
    assert graph.account.rows_kept == 2


def test_partitions_are_columns_and_pass_files_over(tmp_path):
    for year in (2023, 2024):
        folder = tmp_path / f"year={year}"
        folder.mkdir()
        sorted_file(folder / "x.parquet", 10)
    parts = files.open_parts(tmp_path)
    chosen = Filter("year = 2024", parts)
    kept = [
        sum(p.rows for p in chosen.read(part, ["source"], Watch()) if p.batch) for part in parts
    ]
    assert kept == [0, 10]
    assert chosen.passed_over == 10


def test_a_filtered_row_is_looked_at_no_further():
    table = pa.table({"source": ["a", None], "target": ["b", "c"], "weight": [1.0, -2.0]})
    graph = from_table(table, where="weight > 0")
    assert (graph.account.rows_read, graph.account.filtered, graph.account.skipped) == (2, 1, {})
    with pytest.raises(RowsError, match=r"null source \(row 2: null -> c\)"):
        from_table(table, where="weight < 0")


def test_bad_rows_keep_their_places_behind_a_filter(tmp_path):
    rows = 300
    weights = [float(i) for i in range(rows)]
    weights[250] = float("nan")
    table = pa.table({"source": [1] * rows, "target": [2] * rows, "weight": weights})
    pq.write_table(table, tmp_path / "x.parquet", row_group_size=50)
    with pytest.raises(RowsError, match="row 251"):
        load(tmp_path / "x.parquet", where="source = 1 AND NOT weight < 100")


def test_ids_keep_their_types_and_order_of_rows(tmp_path):
    table = pa.table(
        {
            "source": pa.array(["a"] * 6).dictionary_encode(),
            "target": pa.array(["b"] * 6).dictionary_encode(),
            "weight": [6.0, 5.0, 4.0, 3.0, 2.0, 1.0],
        }
    )
    pq.write_table(table, tmp_path / "x.parquet", row_group_size=2)
    graph = load(tmp_path / "x.parquet", where="weight < 5.5", parallel="first")
    assert graph.outward.weights.tolist() == [5.0]
    assert graph.labels.type == pa.string()


def test_columns_by_any_case_and_in_quotes():
    table = pa.table({"source": [1, 2], "target": [2, 1], "Total Cost": [1, 5], "a.b": [1, 2]})
    for where in ('"Total Cost" > 2', '"total cost" > 2', '"a.b" = 2', 'edges."a.b" = 2'):
        assert from_table(table, where=where).account.rows_kept == 1


WRONG = [
    ("", SettingsError, "is empty"),
    ("calls >", SettingsError, "position 7"),
    ("calls > 1) OR (1=1", SettingsError, "position 10"),
    ("source = 'ä' )", SettingsError, "position 14"),
    ("calls > 3 /* open", SettingsError, "position 11"),
    ("calls > 1; DROP TABLE edges", SettingsError, "statement"),
    ("calls > 1; SELECT 2", SettingsError, "one SQL expression and nothing around it"),
    ("calls, source", SettingsError, "one SQL expression and nothing around it"),
    ("calls > 1 LIMIT 1", SettingsError, "one SQL expression and nothing around it"),
    ("calls > 1 AS x", SettingsError, "one SQL expression and nothing around it"),
    ("1 FROM 'x.parquet'", SettingsError, "one SQL expression and nothing around it"),
    ("calls IN (SELECT 1)", SettingsError, "a query within"),
    ("EXISTS (FROM 'x.csv')", SettingsError, "a query within"),
    ("calls > ?", SettingsError, "a parameter"),
    ("COLUMNS(*) > 1", SettingsError, "COLUMNS"),
    ("#1 > 1", SettingsError, "position"),
    ("sum(calls) > 1", SettingsError, "many rows"),
    ("sum(calls) OVER () > 1", SettingsError, "window"),
    ("unnest([calls]) > 1", SettingsError, "unnest"),
    ("random() > 0.5", SettingsError, "another each time"),
    ("current_date > DATE '2024-01-01'", SettingsError, "another each time"),
    ("now() > TIMESTAMP '2024-01-01'", SettingsError, "another each time"),
    ("length(repeat('x', 1000000000)) > 1", SettingsError, "any size"),
    ("read_text('x') = 'y'", SettingsError, "read_text"),
    ("flor(calls) > 1", SettingsError, "did you mean floor"),
    ("cals > 1", InputError, "'cals', which table lacks; did you mean calls?"),
    ('source = "a"', InputError, "text stands in single quotes"),
    ("calls", InputError, "true or false"),
    ("calls > 'x'", InputError, "position 9"),
    ("source > 5", InputError, "explicit cast"),
    ("source::INT > 5", InputError, "'a'"),
    ("calls > 100", RowsError, "is true for none of 2 rows"),
    ("NULL", RowsError, "for 2 of them it is neither true nor false"),
    ("a = \0", SettingsError, "null character"),
]


@pytest.mark.parametrize(("where", "kind", "words"), WRONG)
def test_a_wrong_expression_is_one_sentence(where, kind, words):
    table = pa.table({"source": ["a", "b"], "target": ["b", "c"], "calls": [1, 2]})
    with pytest.raises(KingpostError) as caught:
        from_table(table, where=where)
    assert type(caught.value) is kind
    text = caught.value.sentence
    assert words in text
    assert "\n" not in text
    assert not text.endswith(".")
    assert text.startswith("--where")


def test_names_that_differ_by_case_only():
    table = pa.table({"source": [1], "target": [2], "a": [1], "A": [2]})
    assert from_table(table, where='"A" = 2').m == 1
    with pytest.raises(InputError, match="differ by case only"):
        from_table(table, where='a = 1 AND "A" = 2')


def test_a_column_that_a_later_file_lacks(tmp_path):
    sorted_file(tmp_path / "a.parquet", 10)
    pq.write_table(pa.table({"source": ["x"], "target": ["y"]}), tmp_path / "b.parquet")
    with pytest.raises(InputError, match="which --where names, is missing from"):
        load(tmp_path, where="rate > 1", weight_as="none")


def test_nothing_outside_is_within_reach(tmp_path):
    (tmp_path / "x.csv").write_text("a\n1\n")
    expression = Expression("a = 1", "--where")
    connection = expression._connection
    for query in (
        f"SELECT * FROM '{tmp_path}/x.csv'",
        f"COPY (SELECT 1) TO '{tmp_path}/y.csv'",
        f"ATTACH '{tmp_path}/z.db'",
        "INSTALL httpfs",
        "LOAD httpfs",
        "SET enable_external_access = true",
        "SET threads = 4",
    ):
        with pytest.raises(Exception, match=r"disabled|locked|Cannot|cannot"):
            connection.execute(query)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["x.csv"]


def test_cancelling_interrupts_the_engine():
    rows = 60_000
    table = pa.table({"source": range(rows), "target": range(rows), "n": [9_000] * rows})
    slow = "list_sum(list_transform([n, n + 1, n + 2, n + 3], lambda x: ln(x + 2))) > 0"
    watch = Watch()
    began = {}

    def cancel():
        began["cancelled"] = time.monotonic()
        watch.cancel()

    long = " AND ".join(f"({slow.replace('ln', f'{i} + ln')})" for i in range(200))
    threading.Timer(0.15, cancel).start()
    with pytest.raises(Interrupted):
        from_table(table, where=long, weight_as="none", watch=watch)
    assert time.monotonic() - began["cancelled"] < 5  # the bench measures; this must only end


def test_no_engine_is_loaded_without_a_filter(tmp_path):
    path = sorted_file(tmp_path / "x.parquet", 10)
    program = (
        "import sys; from kingpost.core.ingest import load; load(sys.argv[1], weight_as='none');"
        "print('duckdb' in sys.modules)"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, path], capture_output=True, text=True, check=True
    )
    assert done.stdout.strip() == "False"


NODES = {
    "service": ["a", "b", "c", "d", "e"],
    "team": ["red", "red", "blue", None, "red"],
    "size": [1, 2, 3, 4, 5],
}
EDGES = pa.table(
    {
        "source": ["a", "a", "b", "c", "d", "f", "b", "e"],
        "target": ["b", "c", "a", "a", "a", "a", "b", "c"],
        "weight": [1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0],
    }
)


def nodes_file(tmp_path):
    path = tmp_path / "nodes.parquet"
    pq.write_table(pa.table(NODES), path)
    return str(path)


def test_node_where_gives_the_induced_subgraph(tmp_path):
    graph = from_table(EDGES, nodes=nodes_file(tmp_path), node_where="team = 'red'")
    assert_sound(graph)
    assert graph.labels.to_pylist() == ["a", "b", "e"]  # e loses its edges and stays
    assert edges_of(graph) == {("a", "b"): 1.0, ("b", "a"): 3.0, ("b", "b"): 7.0}
    assert graph.attributes.column("size").to_pylist() == [1, 2, 5]
    a = graph.account
    assert (a.rows_read, a.rows_kept, a.outside) == (8, 3, 5)
    assert (a.nodes_filtered, a.nodes_filtered_null) == (3, 2)  # d has no team, f no row
    assert (a.nodes_joined, a.nodes_missing, a.nodes_unknown) == (5, 1, 0)
    assert graph.origin.node_where == "team = 'red'"


def test_node_where_by_id_and_with_where(tmp_path):
    graph = from_table(
        EDGES, nodes=nodes_file(tmp_path), node_where="service <= 'c'", where="weight < 7",
        directed=False,
    )  # fmt: skip
    assert_sound(graph)
    assert edges_of(graph) == {("a", "b"): 4.0, ("a", "c"): 6.0}
    a = graph.account
    assert (a.rows_read, a.filtered, a.outside, a.rows_kept, a.merged) == (8, 2, 2, 4, 2)


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("tem = 'red'", InputError, "did you mean team"),
        ("team = 'green'", RowsError, "true for none of 6 nodes"),
        ("team", InputError, "true or false"),
        ("team = (SELECT 1)", SettingsError, "a query within"),
    ],
)
def test_a_wrong_node_where(tmp_path, text, kind, words):
    with pytest.raises(kind, match=words) as caught:
        from_table(EDGES, nodes=nodes_file(tmp_path), node_where=text)
    assert caught.value.sentence.startswith("--node-where")


def test_node_where_without_nodes():
    with pytest.raises(SettingsError, match="--nodes FILE"):
        from_table(EDGES, node_where="team = 'red'")


def test_an_induced_subgraph_without_edges_says_so(tmp_path):
    graph = from_table(EDGES, nodes=nodes_file(tmp_path), node_where="service = 'e'")
    assert (graph.n, graph.m) == (1, 0)
    assert any("a node that was left out" in note for note in graph.account.notes)
