"""Whatever is wrong with the input: one sentence, and never anything else."""

import os
import random
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import InputError, RowsError, SettingsError
from kingpost.core.ingest import LoadOptions, describe, from_table, load

EDGES = {"source": ["a", "b", "c"], "target": ["b", "c", "a"], "weight": [1.0, 2.0, 3.0]}


def write(path, columns=EDGES, **options):
    pq.write_table(pa.table(columns), path, **options)
    return str(path)


def sentence(call, kind=InputError):
    with pytest.raises(kind) as caught:
        call()
    text = caught.value.sentence
    assert text
    assert "\n" not in text
    assert not text.endswith(".")
    return text


def test_a_missing_file(tmp_path):
    assert "there is no file" in sentence(lambda: load(tmp_path / "none.parquet"))


def test_no_path_at_all():
    assert "no edge table" in sentence(lambda: load([]))


def test_a_dangling_link(tmp_path):
    (tmp_path / "x.parquet").symlink_to(tmp_path / "gone")
    assert "cannot be read" in sentence(lambda: load(tmp_path / "x.parquet"))


@pytest.mark.skipif(os.geteuid() == 0, reason="root reads everything")
def test_a_file_one_may_not_read(tmp_path):
    path = tmp_path / "x.parquet"
    write(path)
    path.chmod(0)
    assert "cannot be read: Permission denied" in sentence(lambda: load(path))


def test_a_file_that_fails_to_open(tmp_path, monkeypatch):
    path = write(tmp_path / "x.parquet")

    def refuse(*_):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("builtins.open", refuse)
    assert "cannot be read: Permission denied" in sentence(lambda: load(path))


def test_a_folder_without_parquet(tmp_path):
    (tmp_path / "notes.txt").write_text("hello")
    write(tmp_path / "_temporary.parquet")
    assert "holds no Parquet file" in sentence(lambda: load(tmp_path))


def test_a_glob_that_matches_nothing(tmp_path):
    assert "no file matches" in sentence(lambda: load(f"{tmp_path}/*.parquet"))


def test_an_empty_file(tmp_path):
    (tmp_path / "x.parquet").write_bytes(b"")
    assert "is empty" in sentence(lambda: load(tmp_path / "x.parquet"))


def test_garbage_named_parquet(tmp_path):
    (tmp_path / "x.parquet").write_bytes(b"a,b\n1,2\n")
    assert "no Parquet file" in sentence(lambda: load(tmp_path / "x.parquet"))


def test_an_encrypted_file(tmp_path):
    (tmp_path / "x.parquet").write_bytes(b"PARE" + b"x" * 50 + b"PARE")
    assert "encrypted" in sentence(lambda: load(tmp_path / "x.parquet"))


def test_a_file_cut_anywhere(tmp_path):
    whole = (tmp_path / "whole.parquet", tmp_path / "cut.parquet")
    content = Path(write(whole[0])).read_bytes()
    for size in range(4, len(content), 17):
        whole[1].write_bytes(content[:size])
        assert "truncated or damaged" in sentence(lambda: load(whole[1]))


def test_a_file_with_damaged_bytes_is_refused_or_read(tmp_path):
    # Nothing guards the bytes of values themselves, so some damage can only be read as it is.
    content = bytearray(Path(write(tmp_path / "whole.parquet", compression="none")).read_bytes())
    random_bytes = random.Random(7)
    sentences = []
    for _ in range(150):
        broken = bytearray(content)
        broken[random_bytes.randrange(4, len(content))] ^= 1 << random_bytes.randrange(8)
        (tmp_path / "x.parquet").write_bytes(broken)
        try:
            load(tmp_path / "x.parquet", bad_rows="skip")
        except InputError as error:
            sentences.append(error.sentence)
    assert len(sentences) > 10
    assert not any("\n" in text for text in sentences)


@pytest.mark.parametrize("checksums", [True, False])
def test_data_pages_that_cannot_be_read(tmp_path, checksums):
    columns = {name: [f"{name} {at % 999}" for at in range(50_000)] for name in EDGES}
    path = write(tmp_path / "x.parquet", columns, compression="gzip", write_page_checksum=checksums)
    content = bytearray(Path(path).read_bytes())
    middle = len(content) // 3
    content[middle : middle + 5_000] = bytes(5_000)
    (tmp_path / "x.parquet").write_bytes(content)
    assert "is damaged" in sentence(lambda: load(path, weight_as="none"))


def test_page_checksums_are_heeded(tmp_path):
    # Numbers stored as they are: without the checksum the change would go unseen.
    columns = {"source": list(range(5_000)), "target": list(range(5_000))}
    path = write(
        tmp_path / "x.parquet",
        columns,
        compression="none",
        use_dictionary=False,
        write_page_checksum=True,
    )
    content = bytearray(Path(path).read_bytes())
    content[20_000] ^= 1
    (tmp_path / "x.parquet").write_bytes(content)
    assert "CRC checksum" in sentence(lambda: load(path))


def test_no_rows(tmp_path):
    empty = {"source": pa.array([], pa.int64()), "target": pa.array([], pa.int64())}
    assert "holds no rows" in sentence(lambda: load(write(tmp_path / "x.parquet", empty)))
    both = [write(tmp_path / name, empty) for name in ("x.parquet", "y.parquet")]
    assert "each of 2 files holds no rows" in sentence(lambda: load(both))


def test_an_empty_file_among_others_does_no_harm(tmp_path):
    empty = pa.table(EDGES).slice(0, 0)
    pq.write_table(empty, tmp_path / "a.parquet")
    write(tmp_path / "b.parquet")
    assert load(tmp_path).m == 3


def test_one_column(tmp_path):
    path = write(tmp_path / "x.parquet", {"source": [1]})
    assert "one column only, source (int64)" in sentence(lambda: load(path))


def test_a_missing_column_with_near_names():
    table = pa.table({"caller": ["a"], "callee": ["b"]})
    text = sentence(lambda: from_table(table, source="callr"))
    assert "no column 'callr'; did you mean caller" in text
    assert "its columns are caller (string), callee (string)" in text


def test_a_column_name_that_stands_twice():
    table = pa.Table.from_arrays([pa.array([1])] * 3, names=["source", "target", "target"])
    assert "2 columns called 'target'" in sentence(
        lambda: from_table(table, source="source", target="target")
    )


def test_nothing_to_guess():
    table = pa.table({"x": ["a"], "y": ["b"], "z": ["c"]})
    text = sentence(lambda: from_table(table))
    assert "name them with --source and --target" in text
    assert "x (string), y (string), z (string)" in text


@pytest.mark.parametrize(
    ("columns", "words"),
    [
        ({"source": [1.0], "target": [2.0]}, "floating-point numbers do not identify nodes"),
        ({"source": [1], "target": ["b"]}, "hold ids of different sorts"),
        ({"source": [[1]], "target": [[2]]}, "nested type"),
        ({"source": [{"a": 1}], "target": [{"a": 1}]}, "nested type"),
        ({"source": [None], "target": [None]}, "holds only nulls"),
        ({"source": [1], "target": [2], "weight": ["x"]}, "no weight"),
        ({"source": [1], "target": [2], "weight": [[1.0]]}, "no weight"),
    ],
)
def test_types_that_cannot_serve(columns, words):
    names = {name: name for name in columns}
    assert words in sentence(lambda: from_table(pa.table(columns), **names))


def test_a_guess_never_takes_a_text_column_as_weight():
    graph = from_table(pa.table({"source": [1], "target": [2], "weight": ["x"]}))
    assert graph.origin.weight is None


def test_files_whose_columns_differ_in_sort(tmp_path):
    write(tmp_path / "a.parquet", {"source": [1], "target": [2]})
    write(tmp_path / "b.parquet", {"source": ["1"], "target": ["2"]})
    text = sentence(lambda: load(tmp_path))
    for words in ("'source'", "a.parquet", "b.parquet", "int64", "string"):
        assert words in text


def test_a_file_that_lacks_a_column(tmp_path):
    write(tmp_path / "a.parquet")
    write(tmp_path / "b.parquet", {"source": ["a"], "target": ["b"]})
    text = sentence(lambda: load(tmp_path))
    for words in ("'weight'", "a.parquet", "is missing from", "b.parquet"):
        assert words in text


def test_text_that_is_not_utf8():
    bad = pa.Array.from_buffers(
        pa.string(), 1, [None, pa.py_buffer(np.array([0, 2], np.int32)), pa.py_buffer(b"\xff\xfe")]
    )
    assert "not valid UTF-8" in sentence(
        lambda: from_table(pa.table({"source": bad, "target": bad}))
    )


def test_a_negative_id_beside_uint64():
    table = pa.table(
        {"source": pa.array([2**64 - 1], pa.uint64()), "target": pa.array([-1], pa.int64())}
    )
    assert "does not fit the common type uint64" in sentence(lambda: from_table(table))


def test_bad_rows_are_counted_by_reason_with_examples():
    inf, nan = float("inf"), float("nan")
    table = pa.table(
        {
            "source": ["a", None, "a", "a", "a", "a", "a"],
            "target": ["b", "b", None, "b", "b", "\x1b[31mred", "b"],
            "weight": [1.0, 1.0, 1.0, None, nan, -2.5, inf],
        }
    )
    text = sentence(lambda: from_table(table), RowsError)
    assert text.startswith("6 of 7 rows cannot be used: ")
    for words in (
        "1 with null source (row 2: null -> b)",
        "1 with null target (row 3: a -> null)",
        "1 with null weight (row 4: a -> b)",
        "1 with NaN weight (row 5: a -> b weighs nan)",
        "1 with infinite weight (row 7: a -> b weighs inf)",
        "1 with negative weight (row 6: a -> \\e[31mred weighs -2.5)",
        "--bad-rows skip",
    ):
        assert words in text, words
    graph = from_table(table, bad_rows="skip")
    assert graph.labels.to_pylist() == ["a", "b"]
    assert graph.account.skipped == dict.fromkeys(
        [
            "null source",
            "null target",
            "null weight",
            "NaN weight",
            "infinite weight",
            "negative weight",
        ],
        1,
    )


def test_bad_rows_are_counted_in_the_whole_input_and_named_by_file(tmp_path):
    write(tmp_path / "a.parquet")
    for name in "bc":
        write(
            tmp_path / f"{name}.parquet",
            {"source": ["a"] * 9, "target": ["b"] * 9, "weight": [1.0] * 4 + [-1.0] * 5},
        )
    text = sentence(lambda: load(tmp_path), RowsError)
    assert "10 of 21 rows" in text
    assert "b.parquet row 5: a -> b" in text
    examples = load(tmp_path, bad_rows="skip").account.examples["negative weight"]
    assert [line.rsplit("/", 1)[1].split(":")[0] for line in examples] == [
        "b.parquet row 5",
        "b.parquet row 6",
        "b.parquet row 7",
    ]


def test_no_good_row():
    table = pa.table({"source": pa.array([None], pa.string()), "target": ["b"]})
    text = sentence(lambda: from_table(table, bad_rows="skip"), RowsError)
    assert (
        text == "1 of 1 row cannot be used: 1 with null source (row 1: null -> b); no row is left"
    )


def test_nodes_without_an_edge_left():
    graph = from_table(pa.table({"source": ["a"], "target": ["a"]}), loops="drop")
    assert (graph.n, graph.m) == (1, 0)
    assert "no edge is left" in graph.account.notes[-1]


@pytest.mark.parametrize(
    ("weights", "options", "ends"),
    [
        ([1e308, 1e308], {}, "infinite by --parallel sum, for example a -> b"),
        ([1e308, 1e308], {"parallel": "mean"}, "infinite by --parallel mean"),
        ([1e308, 1e308], {"weight_as": "inverse"}, "--parallel sum and --weight-as inverse"),
        ([1e-310, 0.0], {"weight_as": "inverse"}, "--weight-as inverse"),
    ],
)
def test_weights_too_great_for_a_number(weights, options, ends):
    table = pa.table({"source": ["a", "a"], "target": ["b", "b"], "weight": weights})
    assert ends in sentence(lambda: from_table(table, **options), RowsError)


@pytest.mark.parametrize(
    "options",
    [
        {"parallel": "median"},
        {"loops": "maybe"},
        {"bad_rows": "ignore"},
        {"weight_as": "square"},
        {"source": ""},
        {"source": "a", "target": "a"},
        {"node_id": "id"},
    ],
)
def test_options_outside_their_choices(options):
    sentence(lambda: LoadOptions(**options), SettingsError)


def test_hostile_column_names_are_made_visible():
    table = pa.table({"\x1b[31m": ["a"], "\u202ey": ["b"]})
    graph = from_table(table)
    assert graph.account.notes[0].startswith("took \\e[31m -> \\u{202e}y as the edge")
    with pytest.raises(InputError, match=r"\\e\[31m"):
        from_table(table, source="nothing")


def test_describing_a_broken_file_is_refused_alike(tmp_path):
    (tmp_path / "x.parquet").write_bytes(b"PAR1")
    assert "truncated or damaged" in sentence(lambda: describe(tmp_path / "x.parquet"))
