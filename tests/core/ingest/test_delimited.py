"""Delimited text: types that lose nothing, and one sentence with file, line and example."""

import bz2
import csv
import gzip
import io
import subprocess
import sys
import tempfile
from pathlib import Path

import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference import Refused, agree, assert_sound, expected

from kingpost.core.errors import InputError, Interrupted, KingpostError, RowsError, SettingsError
from kingpost.core.ingest import LoadOptions, delimited, describe, load
from kingpost.core.kernels import words
from kingpost.core.watch import Watch


def write(tmp_path, text, name="x.csv"):
    path = tmp_path / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return str(path)


def labels(tmp_path, text, name="x.csv", **options):
    graph = load(write(tmp_path, text, name), **options)
    assert_sound(graph)
    return graph.labels.to_pylist()


CELLS = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\0"), max_size=4)
SPELLED = st.sampled_from(["1", "2", "07", "-3", "0", "-0", "+1", "NA", "null", "1e3", "1.0", ""])


@settings(max_examples=40, deadline=None)
@given(
    st.lists(
        st.tuples(CELLS | SPELLED, CELLS | SPELLED, st.none() | st.integers(0, 9)),
        min_size=1,
        max_size=12,
    ),
    st.sampled_from([",", ";", "\t", "|"]),
    st.sampled_from(["utf-8", "utf-8-sig", "utf-16"]),
    st.sampled_from(["", ".gz", ".bz2", ".zst"]),
    st.sampled_from(["\n", "\r\n"]),
)
def test_cells_come_back_as_they_were_written(rows, mark, encoding, packer, line_end):
    """Written by Python's csv module (RFC 4180), read here."""
    text = io.StringIO()
    writer = csv.writer(text, delimiter=mark, lineterminator=line_end, quoting=csv.QUOTE_NONNUMERIC)
    writer.writerow(["source", "target", "weight", "note"])
    writer.writerows([u, v, "" if w is None else w, f"a{mark}b\n"] for u, v, w in rows)
    # The writer quotes an empty text, which is a name; an empty weight is null all the same.
    data = text.getvalue().replace(f'{mark}""{mark}"a', f'{mark}{mark}"a').encode(encoding)
    pack = {"": bytes, ".gz": gzip.compress, ".bz2": bz2.compress, ".zst": zstd}[packer]
    whole = all(_plain(cell) for u, v, _ in rows for cell in (u, v))
    want_rows = [(int(u) if whole else u, int(v) if whole else v, w) for u, v, w in rows]
    options = {"bad_rows": "skip", "weight": "weight"}
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / f"x.csv{packer}"
        path.write_bytes(pack(data))
        try:
            want = expected(
                want_rows, weighted=True, directed=True, parallel="sum", loops="keep",
                bad_rows="skip", weight_as="asis",
            )  # fmt: skip
        except Refused:
            with pytest.raises(RowsError):
                load(path, delimiter=mark, **options)
            return
        agree(load(path, delimiter=mark, **options), want)


def _plain(cell):
    try:
        return str(int(cell)) == cell  # not so for digits of other scripts
    except ValueError:
        return False


def zstd(data):
    return pa.compress(data, codec="zstd", asbytes=True)


@pytest.mark.parametrize(
    ("cells", "kind"),
    [
        (["1", "-9223372036854775808"], pa.int64()),
        (["1", "9223372036854775807"], pa.int64()),
        (["1", "9223372036854775808"], pa.uint64()),
        (["0", "18446744073709551615"], pa.uint64()),
        (["0", "18446744073709551616"], pa.string()),
        (["-1", "9223372036854775808"], pa.string()),
        (["-9223372036854775809", "1"], pa.string()),
        (["1", "01"], pa.string()),
        (["1", "+1"], pa.string()),
        (["1", "-0"], pa.string()),
        (["1", " 1"], pa.string()),
        (["1.10", "1.1"], pa.string()),
        (["1e3", "1000"], pa.string()),
        (["NA", "nan"], pa.string()),
        (["1", "x"], pa.string()),
    ],
)
def test_ids_are_whole_numbers_only_in_their_plainest_spelling(tmp_path, cells, kind):
    graph = load(write(tmp_path, "source,target\n" + ",".join(cells) + "\n"))
    assert graph.labels.type == kind
    assert sorted(map(str, graph.labels.to_pylist())) == sorted(cells)


def naive(cells):
    """The flags of kernels.words.whole, by Python's own whole numbers."""
    flags = 0
    for cell in cells:
        if cell is None:
            continue
        if not _plain(cell) or not cell.isascii():
            return None
        number = int(cell)
        flags |= words.NEGATIVE * (number < 0) | words.BEYOND_SIGNED * (number >= 2**63)
        flags |= words.BEYOND_UNSIGNED * (number >= 2**64 or number < -(2**63))
    return flags


EDGES = [0, 1, 9, 10, 2**63 - 1, 2**63, 2**63 + 1, 2**64 - 1, 2**64, 10**19, 10**20, 10**25]
SPELLINGS = (
    st.sampled_from([str(sign * edge) for edge in EDGES for sign in (1, -1)])
    | st.sampled_from(["", "-", "-0", "00", "+1", "1 ", "1.0", "٣", "0x1", "1_0"])
    | st.integers(-(2**65), 2**65).map(str)
)


@settings(max_examples=200, deadline=None)
@given(st.lists(st.none() | SPELLINGS, max_size=4), st.integers(0, 2))
def test_whole_numbers_are_told_as_python_tells_them(cells, skipped):
    array = pa.array(["?"] * skipped + cells, pa.string()).slice(skipped)
    found, want = words.whole(*delimited._flat(array)), naive(cells)
    if want is None:
        assert found & words.OTHER
    else:
        assert found == want


def test_a_late_text_turns_a_column_of_numbers_back(tmp_path):
    rows = "".join(f"{i},{i + 1}\n" for i in range(300_000))
    graph = load(write(tmp_path, f"source,target\n{rows}x,007\n"))
    assert graph.n == 300_003
    assert {"0", "300000", "x", "007"} <= set(graph.labels.to_pylist())


def test_files_of_which_one_holds_text(tmp_path):
    write(tmp_path, "source,target\n1,2\n", "a.csv")
    write(tmp_path, "source,target\n2,x9\n", "b.csv")
    graph = load(tmp_path)
    assert graph.labels.to_pylist() == ["1", "2", "x9"]


def test_quotes_separators_line_ends_and_blank_lines(tmp_path):
    text = 'source,target\r\n"a,1","b\n2"\r\n\r\n"say ""hi""",b"c\r\n'
    assert labels(tmp_path, text) == ["a,1", "b\n2", 'b"c', 'say "hi"']


def test_an_empty_cell_is_null_and_a_quoted_one_a_name(tmp_path):
    graph = load(write(tmp_path, 'source,target\n,b\n"",c\n'), bad_rows="skip")
    assert graph.labels.to_pylist() == ["", "c"]
    assert graph.account.skipped == {"null source": 1}


@pytest.mark.parametrize("name", ["x.txt", "x.csv", "edges"])
@pytest.mark.parametrize("mark", [",", "\t", ";", "|", " "])
def test_the_separator_is_guessed(tmp_path, name, mark):
    text = f"source{mark}target\na{mark}b\nb{mark}c\n"
    graph = load(write(tmp_path, text, name))
    assert graph.labels.to_pylist() == ["a", "b", "c"]
    told = any("--delimiter" in note for note in graph.account.notes)
    assert told == (mark in ";| ")


def test_a_text_without_names_loses_no_row(tmp_path):
    graph = load(write(tmp_path, "# from to\n\n1\t2\n2\t3\n", "x.txt"))
    assert (graph.m, graph.labels.to_pylist()) == (2, [1, 2, 3])
    notes = " ".join(graph.account.notes)
    assert "the first line holds numbers" in notes
    assert "1 line at its head that begin with #" in notes
    assert load(write(tmp_path, "a,b\nb,c\n"), header="no").m == 2
    assert load(write(tmp_path, "1,2\na,b\n"), header="yes", source="1", target="2").m == 1


def test_utf_16_and_named_encodings(tmp_path):
    assert labels(tmp_path, "source,target\né,b\n".encode("utf-16")) == ["b", "é"]
    assert labels(tmp_path, b"source,target\n\xe9,b\n", encoding="latin-1") == ["b", "é"]


def test_weights_that_are_no_numbers(tmp_path):
    rows = "".join(f"a,b{i},{i}\n" for i in range(5))
    path = write(tmp_path, f"source,target,calls\n{rows}c,d,n/a\nc,e,12 ms\n")
    with pytest.raises(RowsError) as caught:
        load(path)
    assert "x.csv line 7: column 'calls' holds 'n/a', which is no number (2 of 7 rows)" in str(
        caught.value
    )
    graph = load(path, bad_rows="skip")
    assert graph.account.skipped == {"null weight": 2}
    assert any("line 7" in note for note in graph.account.notes)
    assert load(path, weight_as="none").m == 7


def test_a_column_of_words_called_like_a_weight_is_no_weight(tmp_path):
    graph = load(write(tmp_path, "source,target,value\na,b,high\nb,c,3\nb,d,low\n"))
    assert graph.origin.weight is None


def test_filters_see_numbers_and_text(tmp_path):
    path = write(tmp_path, "source,target,rate,day\na,b,0.5,2024-01-01\nb,c,1.5,2024-01-02\n")
    assert load(path, where="rate > 1").labels.to_pylist() == ["b", "c"]
    assert load(path, where="day::DATE = DATE '2024-01-01'").labels.to_pylist() == ["a", "b"]


def test_rows_with_too_many_or_too_few_fields(tmp_path):
    path = write(tmp_path, 'source,target\na,"b\nb"\nb,c,d\n\nx\nc,a\n')
    with pytest.raises(RowsError) as caught:
        load(path)
    text = str(caught.value)
    assert "2 of 4 rows" in text
    assert "x.csv line 4: 'b,c,d' has 3 fields, not 2" in text
    graph = load(path, bad_rows="skip")
    assert_sound(graph)
    assert graph.account.skipped == {"a wrong number of fields": 2}
    assert len(graph.account.examples["a wrong number of fields"]) == 2


def test_a_ragged_row_far_down_is_found_by_its_line(tmp_path):
    rows = "".join(f"{i},{i + 1}\n" for i in range(400_000))
    path = write(tmp_path, f"source,target\n{rows}1,2,3\n{rows}")
    with pytest.raises(RowsError, match="line 400,002: '1,2,3' has 3 fields"):
        load(path)


WRONG = [
    (b"source,target\na,b\nb,caf\xe9\n", InputError, "line 3 is not valid UTF-8 text ('b,café')"),
    (b"sourc\xe9,target\na,b\n", InputError, "line 1 is not valid UTF-8"),
    (b'source,target\na,"b\nc,d\n', InputError, "line 2: a quoted value is not closed"),
    (b'"source,target\na,b\n', InputError, "line 1: a quoted value is not closed"),
    (b"source,target\n", InputError, "holds no rows"),
    (b"# nothing\n\n", InputError, "holds no rows"),
    (b"", InputError, "is empty"),
    (b"source\na\n", InputError, "one column only"),
    (b"source,source\na,b\n", InputError, "columns called 'source'"),
    (b"source,target\na,\0b\n", InputError, "null bytes"),
    (b"source,target,weight\na,b,x\nb,c,y\n", InputError, "which is no weight"),
]


@pytest.mark.parametrize(("data", "kind", "words"), WRONG)
def test_a_dirty_text_is_one_sentence(tmp_path, data, kind, words):
    path = write(tmp_path, data)
    options = {"weight": "weight"} if b"weight" in data else {}
    if b"source,source" in data:
        options = {"source": "source", "target": "target"}
    with pytest.raises(KingpostError) as caught:
        load(path, **options)
    text = caught.value.sentence
    assert isinstance(caught.value, kind)
    assert words in text
    assert "x.csv" in text
    assert "\n" not in text
    assert not text.endswith(".")


@pytest.mark.parametrize("packer", ["gz", "bz2", "zst"])
def test_a_packed_text_that_was_cut_off(tmp_path, packer):
    pack = {"gz": gzip.compress, "bz2": bz2.compress, "zst": zstd}[packer]
    rows = "".join(f"{i * 7919 % 10007},{i * 104729 % 10007}\n" for i in range(200_000))
    data = pack(f"source,target\n{rows}".encode())
    path = write(tmp_path, data, f"x.csv.{packer}")
    assert load(path).account.rows_read == 200_000
    for size in (len(data) // 2, len(data) - 4):
        write(tmp_path, data[:size], f"x.csv.{packer}")
        with pytest.raises(InputError, match=r"damaged|cannot be read|no rows"):
            load(path)


def test_options_out_of_range():
    for wrong in ({"delimiter": ",,"}, {"delimiter": '"'}, {"encoding": "x-none"}, {"header": "x"}):
        with pytest.raises(SettingsError):
            LoadOptions(**wrong)


def test_a_text_changed_between_the_two_readings(tmp_path):
    from kingpost.core.ingest.files import open_parts

    path = write(tmp_path, "source,target\na,b\n")
    part = open_parts(path)[0]
    write(tmp_path, "source,target\na,b\nb,c\n")
    with pytest.raises(InputError, match="changed while it was read"):
        list(part.read(["source"], False))


def test_describe_reads_a_text_once(tmp_path):
    about = describe(write(tmp_path, "source,target,calls\n1,2,3\n,2,3\n"))
    assert (about.rows, about.source, about.weight) == (2, "source", "calls")
    assert [column.nulls for column in about.columns] == [1, 0, 0]


def test_a_cancelled_watch_stops_the_first_reading(tmp_path):
    path = write(tmp_path, "source,target\n" + "a,b\n" * 1000)
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        load(path, watch=watch)
    assert load(path).m == 1


COMMAND = [sys.executable, "-m", "kingpost.tui", "rank", "-", "--measure", "degree"]


def pipe(data, *words):
    return subprocess.run(
        [*COMMAND, "--format", "csv", *words], input=data, capture_output=True, timeout=120
    )


def test_standard_input_takes_text_arrow_and_packed_text():
    text = b"source,target\na,b\nc,b\n"
    table = pa.table({"source": ["a", "c"], "target": ["b", "b"]})
    sink = io.BytesIO()
    with pa.ipc.new_stream(sink, table.schema) as writer:
        writer.write_table(table)
    answers = {pipe(data).stdout for data in (text, gzip.compress(text), sink.getvalue())}
    assert len(answers) == 1
    assert b'"b"' in answers.pop()


def test_standard_input_that_is_empty():
    done = pipe(b"")
    assert done.returncode == 2
    assert done.stderr.decode().strip() == (
        "kingpost: standard input is empty; an edge table needs at least one row"
    )
