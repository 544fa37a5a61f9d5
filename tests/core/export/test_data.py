"""csv, tsv, json and parquet give back exactly what went in, read by readers that are not ours."""

from __future__ import annotations

import csv
import datetime as dt
import decimal
import io
import json
import math
from collections.abc import Callable

import numpy as np
import pyarrow as pa
import pyarrow.csv
import pyarrow.parquet as pq
import pytest
from handmade import HOSTILE, make_graph, make_result

from kingpost.core.export import data
from kingpost.core.export.rows import FIXED, Ranking
from kingpost.core.export.table import table
from kingpost.core.insight.node import look
from kingpost.core.result import Bound, BoundKind

EXPECTED = sorted(HOSTILE, key=str.encode)


def written(write: Callable[..., None], ranking: Ranking, **more: object) -> bytes:
    sink = io.BytesIO()
    write(ranking, sink, **more)
    return sink.getvalue()


@pytest.mark.parametrize("delimiter", [",", "\t"])
def test_delimited_by_the_standard_librarys_reader(hostile: Ranking, delimiter: str) -> None:
    text = written(data.write_delimited, hostile, delimiter=delimiter).decode()
    head, *rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    assert head == [*FIXED, "note", "rank_attribute"]
    assert [row[3] for row in rows] == EXPECTED
    assert [row[7] for row in rows] == EXPECTED[::-1]
    assert [float(row[4]) for row in rows] == hostile.result.scores.tolist()


@pytest.mark.parametrize("delimiter", [",", "\t"])
def test_delimited_by_arrows_reader(hostile: Ranking, delimiter: str) -> None:
    blob = written(data.write_delimited, hostile, delimiter=delimiter)
    back = pyarrow.csv.read_csv(
        io.BytesIO(blob),
        parse_options=pyarrow.csv.ParseOptions(delimiter=delimiter, newlines_in_values=True),
        convert_options=pyarrow.csv.ConvertOptions(strings_can_be_null=False),
    )
    assert back.column("node").to_pylist() == EXPECTED


def test_delimited_made_safe_for_a_terminal_acts_on_none(hostile: Ranking) -> None:
    text = written(data.write_delimited, hostile, safe=True).decode()
    assert "\x1b" not in text
    assert "\N{RIGHT-TO-LEFT OVERRIDE}" not in text
    assert "\\e[31mred" in text
    assert len(text.splitlines()) == len(EXPECTED) + 1


def test_parquet_keeps_names_scores_and_facts(hostile: Ranking) -> None:
    back = pq.read_table(io.BytesIO(written(data.write_parquet, hostile)))
    assert back.column("node").to_pylist() == EXPECTED
    assert back.column("score").to_numpy().tolist() == hostile.result.scores.tolist()
    facts = json.loads(back.schema.metadata[b"kingpost"])
    assert facts == json.loads(json.dumps(data.facts(hostile)))


@pytest.mark.parametrize("ascii_only", [False, True])
def test_json_keeps_names_and_is_harmless(hostile: Ranking, ascii_only: bool) -> None:
    text = written(data.write_json, hostile, ascii_only=ascii_only).decode()
    answer = json.loads(text)
    assert [row["node"] for row in answer["rows"]] == EXPECTED
    assert [row["note"] for row in answer["rows"]] == EXPECTED[::-1]
    assert "\x1b" not in text
    assert "\N{RIGHT-TO-LEFT OVERRIDE}" not in text
    assert text.isascii() is ascii_only


def test_json_has_the_promised_keys(ranking: Callable[..., Ranking]) -> None:
    answer = json.loads(written(data.write_json, ranking([3.0, 2.0, 1.0], top=2)))
    assert list(answer) == [
        "input",
        "graph",
        "account",
        "measure",
        "settings",
        "conventions",
        "solve",
        "rows",
    ]
    assert list(answer["solve"]) == [
        "stop",
        "sweeps",
        "edge_visits",
        "error_bound",
        "bound_kind",
        "proven_order",
        "seconds",
        "from_store_solved_on",
    ]
    assert list(answer["solve"]["seconds"]) == ["load", "prepare", "solve"]
    assert [list(row) for row in answer["rows"]] == [list(FIXED)] * 2
    assert answer["rows"][0] == {
        "rank": 1,
        "rank_low": 1,
        "rank_high": 1,
        "node": "a",
        "score": 3.0,
        "in_degree": 2,
        "out_degree": 0,
    }


def test_json_without_rows_or_bound_is_still_json(ranking: Callable[..., Ranking]) -> None:
    def refuse(word: str) -> None:
        raise AssertionError(f"{word} is no JSON")

    none = Bound(BoundKind.NONE, math.inf)
    text = written(data.write_json, ranking([math.nan, 1.0], bound=none))
    answer = json.loads(text, parse_constant=refuse)
    assert answer["solve"]["error_bound"] is None
    assert [row["score"] for row in answer["rows"]].count(None) == 1
    assert json.loads(written(data.write_json, ranking([])))["rows"] == []


def test_ties_share_a_range_in_the_order_of_their_ids(ranking: Callable[..., Ranking]) -> None:
    exact = Bound(BoundKind.EXACT, 0.0, relative=0.0)
    rows = json.loads(written(data.write_json, ranking([1.0, 2.0, 1.0, 1.0], bound=exact)))["rows"]
    spans = [(row["node"], row["rank"], row["rank_low"], row["rank_high"]) for row in rows]
    assert spans == [("b", 1, 1, 1), ("a", 2, 2, 4), ("c", 3, 2, 4), ("d", 4, 2, 4)]


IDS = [
    (pa.array([-1, 2**62], pa.int64()), [-1, 2**62], ["-1", str(2**62)]),
    (pa.array([1, 2**64 - 1], pa.uint64()), [1, 2**64 - 1], ["1", str(2**64 - 1)]),
    (pa.array(["a", "b"], pa.large_string()), ["a", "b"], ["a", "b"]),
    (pa.array([b"ok", b"\xff\x00"], pa.binary()), ["ok", "0xff00"], ["ok", "0xff00"]),
    (
        pa.array([decimal.Decimal("1.50"), decimal.Decimal("20.00")], pa.decimal128(6, 2)),
        ["1.50", "20.00"],
        ["1.50", "20.00"],
    ),
    (
        pa.array([dt.date(1999, 12, 31), dt.date(2024, 2, 29)]),
        ["1999-12-31", "2024-02-29"],
        ["1999-12-31", "2024-02-29"],
    ),
    (pa.array([False, True]), [False, True], ["false", "true"]),
]


@pytest.mark.parametrize(("labels", "as_json", "as_text"), IDS, ids=lambda v: str(v)[:20])
def test_ids_keep_their_type_where_the_format_has_it(
    labels: pa.Array, as_json: list[object], as_text: list[str]
) -> None:
    ranking = Ranking(make_graph(labels, [(0, 1)]), make_result([2.0, 1.0]))
    rows = json.loads(written(data.write_json, ranking))["rows"]
    assert [row["node"] for row in rows] == as_json
    text = written(data.write_delimited, ranking).decode()
    assert [row[3] for row in csv.reader(io.StringIO(text))][1:] == as_text
    back = pq.read_table(io.BytesIO(written(data.write_parquet, ranking)))
    assert back.column("node").combine_chunks() == labels


def test_attributes_of_any_type_reach_text_formats() -> None:
    extra = pa.table(
        {
            "when": pa.array([dt.datetime(2024, 5, 6, 7, 8, 9), None], pa.timestamp("ms")),
            "kind": pa.array(["x", "y"]).dictionary_encode(),
            "tags": pa.array([["a", "b"], None]),
            "share": pa.array([math.nan, math.inf]),
            "none": pa.nulls(2),
            "100% %s": pa.array([7, None]),
            "flag": pa.array([True, None]),
            "span": pa.array([dt.timedelta(seconds=90), None]),
            "fine": pa.array([1_500_000_001, None], pa.timestamp("ns")),
            "half": pa.array([np.float16(1.5), None], pa.float16()),
            "view": pa.array(["x", None], pa.string_view()),
        }
    )
    graph = make_graph(pa.array(["a", "b"]), [(0, 1)], None, extra)
    ranking = Ranking(graph, make_result([2.0, 1.0]))
    first, second = json.loads(written(data.write_json, ranking))["rows"]
    assert first["when"].startswith("2024-05-06T07:08:09")
    assert second["when"] is None
    assert (first["span"], second["span"]) == (90.0, None)
    assert (first["fine"], first["half"]) == ("1970-01-01T00:00:01.500000001", 1.5)
    assert (first["kind"], second["kind"]) == ("x", "y")
    assert (first["100% %s"], second["100% %s"]) == (7, None)
    assert (first["flag"], second["flag"]) == (True, None)
    assert (first["share"], second["share"], first["none"]) == (None, None, None)
    assert json.loads(first["tags"]) == ["a", "b"]
    text = written(data.write_delimited, ranking).decode()
    rows = list(csv.DictReader(io.StringIO(text)))
    assert rows[0]["share"] == "nan"
    assert json.loads(rows[0]["tags"]) == ["a", "b"]
    assert rows[1]["when"] == ""
    assert "00:00:01.500000001" in table(ranking, 400)
    assert (
        look(graph, 0, {"made": ranking.result}, "made").attributes["fine"].endswith("01.500000001")
    )
    back = pq.read_table(io.BytesIO(written(data.write_parquet, ranking)))
    assert back.column("tags").to_pylist() == [["a", "b"], None]


def test_scores_survive_text_to_the_last_bit() -> None:
    rng = np.random.default_rng(7)
    scores = np.sort(rng.random(300) * 10.0 ** rng.integers(-300, 300, 300))[::-1]
    labels = pa.array([f"n{i:03}" for i in range(300)])
    ranking = Ranking(make_graph(labels, []), make_result(scores))
    text = written(data.write_delimited, ranking).decode()
    assert [float(row["score"]) for row in csv.DictReader(io.StringIO(text))] == scores.tolist()
    rows = json.loads(written(data.write_json, ranking))["rows"]
    assert [row["score"] for row in rows] == scores.tolist()


def test_rows_in_several_batches_are_all_there(monkeypatch: pytest.MonkeyPatch) -> None:
    from kingpost.core.export import rows

    monkeypatch.setattr(data, "batches", lambda ranking: rows.batches(ranking, 7))
    labels = pa.array(range(40), pa.int32())
    ranking = Ranking(make_graph(labels, [(1, 0)]), make_result(np.arange(40.0, 0, -1)), 33)
    assert pq.read_table(io.BytesIO(written(data.write_parquet, ranking))).num_rows == 33
    answer = json.loads(written(data.write_json, ranking))
    assert [row["rank"] for row in answer["rows"]] == list(range(1, 34))
    text = written(data.write_delimited, ranking).decode()
    assert text.count("\n") == 34
