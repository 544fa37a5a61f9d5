"""The hash tables give equal ids equal numbers and no others, however they fill and grow."""

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.ingest import from_table, load
from kingpost.core.ingest.dictionaries import TextDictionary, WholeDictionary
from kingpost.core.ingest.files import open_parts
from kingpost.core.kernels import ids


def first_seen(values):
    """Numbers in the order of first sight, by a Python dictionary."""
    seen = {}
    return [seen.setdefault(value, len(seen)) for value in values], list(seen)


def encode(dictionary, chunks):
    codes = np.full(sum(map(len, chunks)) + 1, 2**32 - 1, dtype=np.uint32)
    at = 0
    for chunk in chunks:
        dictionary.encode(chunk, codes, at)
        at += len(chunk)
    assert codes[-1] == 2**32 - 1
    return codes[:-1].tolist()


@settings(max_examples=100, deadline=None)
@given(
    st.lists(st.lists(st.binary(max_size=20) | st.sampled_from([b"", b"a", b"\0"]), max_size=30))
)
def test_text_of_any_bytes(chunks):
    arrays = [pa.array([b"#", *chunk], pa.binary()).slice(1) for chunk in chunks]
    known = TextDictionary()
    codes, labels = first_seen([value for chunk in chunks for value in chunk])
    assert encode(known, arrays) == codes
    assert known.ids(pa.binary()).to_pylist() == labels
    if labels:
        order = known.order()
        assert order is None or [labels[at] for at in order] == sorted(labels)


@pytest.mark.parametrize("sort", [pa.string(), pa.large_string()])
def test_text_through_many_growths(sort):
    rng = np.random.default_rng(2)
    values = [f"{'x' * (n % 70)}{n}" for n in rng.integers(0, 30_000, 60_000).tolist()]
    codes, labels = first_seen(values)
    known = TextDictionary()
    assert encode(known, [pa.array(values[:5], sort), pa.array(values[5:], sort)]) == codes
    assert known.ids(sort).to_pylist() == labels


def test_a_text_longer_than_all_the_room():
    values = ["a" * 300_000, "b", "a" * 300_000, "a" * 299_999]
    known = TextDictionary()
    assert encode(known, [pa.array(values)]) == [0, 1, 0, 2]
    assert known.ids(pa.string()).to_pylist() == [values[0], "b", values[3]]


def test_whole_numbers_through_many_growths():
    rng = np.random.default_rng(3)
    values = rng.integers(-(2**63), 2**63 - 1, 20_000)[rng.integers(0, 20_000, 60_000)]
    codes, labels = first_seen(values.tolist())
    known = WholeDictionary()
    assert encode(known, [pa.array(values[:7]), pa.array(values[7:])]) == codes
    assert known.ids(pa.int64()).to_pylist() == labels


def test_narrow_signed_numbers_keep_their_sign():
    known = WholeDictionary()
    assert encode(known, [pa.array([-1, 5, -1, -(2**31)], pa.int32())]) == [0, 1, 0, 2]
    assert known.ids(pa.int32()).to_pylist() == [-1, 5, -(2**31)]


def test_one_dictionary_takes_up_another():
    for make, values in (
        (WholeDictionary, [[5, 7], [7, 9]]),
        (TextDictionary, [["x", "y"], ["y", "z"]]),
    ):
        left, right = make(), make()
        encode(left, [pa.array(values[0])])
        encode(right, [pa.array(values[1])])
        assert left.absorb(right).tolist() == [1, 2]
        kind = pa.array(values[0]).type
        assert left.ids(kind).to_pylist() == [*values[0], values[1][1]]


def test_ids_whose_hashes_meet_stay_apart():
    """With every hash forced to be the same only the ids themselves can tell."""
    known = TextDictionary()
    encode(known, [pa.array(["aa", "bb"])])
    wanted = ids._hash_text(np.frombuffer(b"cc", np.uint8), np.uint64(0), np.uint64(2))
    # The slots of "aa" and "bb" now claim the hash of "cc", in its place of the table.
    known.table[:] = 0
    mask = len(known.table) - 1
    for number in range(2):
        slot = (int(wanted) + number) & mask
        known.table[slot] = (int(wanted) >> 32 << 32) | (number + 1)
    assert encode(known, [pa.array(["cc"])]) == [2]
    assert known.ids(pa.string()).to_pylist() == ["aa", "bb", "cc"]


@pytest.mark.parametrize(
    "names",
    [
        ["prefix-b", "prefix-a", "prefix-", "prefix-ab"],
        ["a\0", "a", "a\0\0", ""],
        ["12345678b", "12345678", "12345678a", "1234567"],
        ["common12345678b", "common12345678\0", "common12345678", "x"],
        ["é", "e", "z", "ÿ"],
    ],
)
def test_names_are_ordered_by_their_bytes(names):
    known = TextDictionary()
    encode(known, [pa.array(names)])
    assert [names[at] for at in known.order()] == sorted(names, key=str.encode)


def test_names_alike_for_long_are_left_to_a_full_comparison():
    known = TextDictionary()
    encode(known, [pa.array(["x", "a" * 40 + "c", "a" * 40 + "b"])])
    assert known.order() is None


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_dictionary_arrays_number_only_what_rows_use(data):
    known = TextDictionary()
    rows, codes = [], []
    for _ in range(data.draw(st.integers(1, 3))):
        words = data.draw(st.lists(st.sampled_from(["a", "b", "", "unused", "é"]), min_size=1))
        array = pa.array(words)
        for _ in range(data.draw(st.integers(1, 3))):
            at = data.draw(st.lists(st.integers(0, len(words) - 1), max_size=6))
            chunk = pa.DictionaryArray.from_arrays(pa.array([0, *at], pa.int8()), array).slice(1)
            codes += encode(known, [chunk])
            rows += [words[index] for index in at]
    wanted, labels = first_seen(rows)
    # Words of one chunk are numbered before those of the next, in the order of first sight.
    assert codes == wanted
    assert known.ids(pa.string()).to_pylist() == labels


@pytest.mark.parametrize("null", [None, "a"])
def test_dictionary_columns_give_the_graph_of_plain_ones(null, tmp_path):
    rng = np.random.default_rng(4)
    names = [None if n == 7 else f"name {n}" for n in rng.integers(0, 50, 300_000).tolist()]
    names = [null if name is None else name for name in names]
    plain = pa.table({"source": pa.array(names), "target": pa.array(names[::-1])})
    encoded = pa.table({name: plain[name].dictionary_encode() for name in plain.column_names})
    pq.write_table(plain, tmp_path / "plain.parquet", row_group_size=100_000)
    pq.write_table(plain, tmp_path / "whole.parquet", use_dictionary=False)
    want = from_table(plain, bad_rows="skip")
    for graph in (
        from_table(encoded, bad_rows="skip"),
        load(tmp_path / "plain.parquet", bad_rows="skip"),
        load(tmp_path / "whole.parquet", bad_rows="skip"),
    ):
        assert graph.fingerprint == want.fingerprint
        assert graph.account == want.account


def test_which_columns_are_read_as_dictionaries(tmp_path):
    few = [f"name {n % 50}" for n in range(500_000)]
    many = [f"name {n}" for n in range(500_000)]
    pq.write_table(pa.table({"few": few, "many": many}), tmp_path / "x.parquet")
    part = open_parts(tmp_path / "x.parquet")[0]
    batch = next(part.read(["few", "many"], True))
    assert [pa.types.is_dictionary(item.type) for item in batch.schema] == [True, False]
    batch = next(part.read(["few", "many"], False))
    assert not any(pa.types.is_dictionary(item.type) for item in batch.schema)
