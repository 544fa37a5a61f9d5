"""Ids of every type that identifies things keep their values exactly, and meet where they can."""

import datetime as dt
import uuid
from decimal import Decimal

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from reference import assert_sound, edges_of

from kingpost.core.errors import InputError
from kingpost.core.ingest import from_table, load

HOSTILE = [
    "\x1b[31mred",
    "[bold]x[/bold]",
    "\u202eevil",
    "n" * 5_000,
    "🚢",
    "",
    " a",
    "a",
    "a\x00b",
]
U = uuid.UUID(int=7).bytes
CASES = {
    **{
        f"{sign}int{width}": (getattr(pa, f"{sign}int{width}")(), [5, 0, 2 ** (width - 1) - 1])
        for sign in ("", "u")
        for width in (8, 16, 32, 64)
    },
    "negative": (pa.int64(), [-(2**63), 2**63 - 1, 0]),
    "uint64 above 2^63": (pa.uint64(), [2**64 - 1, 2**63, 2**63 + 1]),
    "uint64 across 2^63": (pa.uint64(), [2**64 - 1, 0, 2**63]),
    "uint64 below 2^63": (pa.uint64(), [2**63 - 1, 2**63 - 2, 2**63 - 3]),
    "string": (pa.string(), ["b", "é", "a"]),
    "large string": (pa.large_string(), ["b", "é", "a"]),
    "hostile": (pa.string(), HOSTILE),
    "binary": (pa.binary(), [b"\xff", b"\x00", b""]),
    "large binary": (pa.large_binary(), [b"\xff", b"\x00", b""]),
    "fixed binary": (pa.binary(16), [U, bytes(16), b"x" * 16]),
    "decimal": (pa.decimal128(12, 3), [Decimal("-1.500"), Decimal("2.000"), Decimal("0.001")]),
    "decimal 256": (pa.decimal256(50, 0), [Decimal(10**45), Decimal(-1), Decimal(0)]),
    "date": (pa.date32(), [dt.date(2020, 2, 29), dt.date(1960, 1, 1), dt.date(2021, 1, 1)]),
    "timestamp": (
        pa.timestamp("us", "UTC"),
        [dt.datetime(2020, 2, 29, 1, tzinfo=dt.UTC), dt.datetime(1960, 1, 1, tzinfo=dt.UTC)],
    ),
    "time": (pa.time64("us"), [dt.time(23, 59, 59, 999_999), dt.time(0, 0, 1)]),
    "bool": (pa.bool_(), [True, False]),
}


def cycle(kind, ids):
    """Each id points at the next, the last at the first."""
    following = [*ids[1:], ids[0]]
    return pa.table({"source": pa.array(ids, kind), "target": pa.array(following, kind)})


@pytest.mark.parametrize("case", CASES)
def test_ids_round_trip_through_a_file(case, tmp_path):
    kind, ids = CASES[case]
    pq.write_table(cycle(kind, ids), tmp_path / "x.parquet")
    graph = load(tmp_path / "x.parquet")
    assert graph.labels.type == kind
    ordered = sorted(ids, key=lambda value: value.encode() if isinstance(value, str) else value)
    assert graph.labels.to_pylist() == ordered
    assert edges_of(graph) == dict.fromkeys(zip(ids, [*ids[1:], ids[0]], strict=True), 1.0)
    assert_sound(graph)


@pytest.mark.parametrize(
    "kind",
    [
        pa.dictionary(pa.int8(), pa.string()),
        pa.dictionary(pa.int32(), pa.large_string()),
        pa.string_view(),
    ],
)
@pytest.mark.parametrize("through_file", [True, False])
def test_wrapped_text_is_unwrapped(kind, through_file, tmp_path):
    plain = cycle(pa.string(), HOSTILE)
    table = plain.cast(pa.schema([("source", kind), ("target", kind)]))
    if through_file:
        pq.write_table(table, tmp_path / "x.parquet")
        graph = load(tmp_path / "x.parquet")
    else:
        graph = from_table(table)
    assert graph.labels.type in (pa.string(), pa.large_string())
    assert edges_of(graph) == edges_of(from_table(plain))


def test_dictionaries_of_integers_with_nulls_inside_are_unwrapped():
    inside = pa.DictionaryArray.from_arrays(pa.array([0, 1, 2, None]), pa.array([7, None, 9]))
    table = pa.table({"source": inside, "target": pa.array([1, 1, 1, 1])})
    graph = from_table(table, bad_rows="skip")
    assert graph.labels.to_pylist() == [1, 7, 9]
    assert graph.account.skipped == {"null source": 2}


def test_uuid_columns_keep_their_bytes():
    ids = pa.array([U, bytes(16)], pa.binary(16))
    table = pa.table({"source": ids, "target": ids}).cast(
        pa.schema([("source", pa.uuid()), ("target", pa.uuid())])
    )
    assert from_table(table).labels.to_pylist() == [bytes(16), U]


@pytest.mark.parametrize(
    ("left", "right", "together"),
    [
        (pa.int32(), pa.int64(), pa.int64()),
        (pa.int8(), pa.uint8(), pa.int16()),
        (pa.uint32(), pa.int8(), pa.int64()),
        (pa.int64(), pa.uint32(), pa.int64()),
        (pa.int32(), pa.uint64(), pa.uint64()),
        (pa.uint16(), pa.uint64(), pa.uint64()),
        (pa.decimal128(5, 2), pa.decimal128(12, 0), pa.decimal128(14, 2)),
        (pa.decimal128(38, 0), pa.decimal128(38, 9), pa.decimal256(47, 9)),
        (pa.date32(), pa.date64(), pa.date64()),
        (pa.timestamp("s"), pa.timestamp("ns"), pa.timestamp("ns")),
        (pa.timestamp("s", "Asia/Tokyo"), pa.timestamp("ms", "UTC"), pa.timestamp("ms", "UTC")),
        (pa.time32("s"), pa.time64("us"), pa.time64("us")),
    ],
)
def test_numeric_types_meet(left, right, together):
    whole = pa.array([1, 2, 3], pa.int32())
    if pa.types.is_date(left):
        values = [pa.array([1, 2, 3], pa.int32()).cast(pa.date32()).cast(t) for t in (left, right)]
    else:
        values = [_cast(whole, kind) for kind in (left, right)]
    for order in (values, values[::-1]):
        graph = from_table(pa.table({"source": order[0], "target": order[1]}))
        assert graph.labels.type == together
        assert graph.n == graph.m == graph.account.loops == 3


def _cast(whole, kind):
    if pa.types.is_timestamp(kind):
        return whole.cast(pa.int64()).cast(pa.timestamp("s")).cast(pa.timestamp(kind.unit, kind.tz))
    if pa.types.is_time(kind):
        return whole.cast(pa.time32("s")).cast(kind)
    if pa.types.is_decimal(kind):
        return pa.array([Decimal(value) for value in whole.to_pylist()], kind)
    return whole.cast(kind)


def test_text_meets_dictionary_text_across_files(tmp_path):
    for at, kind in enumerate((pa.string(), pa.dictionary(pa.int32(), pa.string()))):
        pq.write_table(cycle(kind, ["a", "b"]), tmp_path / f"{at}.parquet")
    graph = load(tmp_path)
    assert graph.labels.type == pa.string()
    assert graph.account.merged == 2
    assert edges_of(graph) == {("a", "b"): 2.0, ("b", "a"): 2.0}


def test_integers_of_two_widths_meet_across_files(tmp_path):
    for at, kind in enumerate((pa.int32(), pa.int64())):
        pq.write_table(cycle(kind, [1, 2]), tmp_path / f"{at}.parquet")
    assert load(tmp_path).labels.type == pa.int64()


@pytest.mark.parametrize(
    ("left", "right"),
    [
        (pa.array([1]), pa.array(["1"])),
        (pa.array(["1"]), pa.array([b"1"])),
        (pa.array([1]), pa.array([True])),
        (pa.array([1]), pa.array([Decimal(1)])),
        (pa.array([dt.date(2020, 1, 1)]), pa.array([dt.datetime(2020, 1, 1)])),
        (
            pa.array([dt.datetime(2020, 1, 1)], pa.timestamp("us")),
            pa.array([dt.datetime(2020, 1, 1)], pa.timestamp("us", "UTC")),
        ),
    ],
)
def test_sorts_of_ids_that_do_not_meet(left, right):
    with pytest.raises(InputError, match="different sorts"):
        from_table(pa.table({"source": left, "target": right}))


@pytest.mark.parametrize(
    "weights",
    [
        pa.array([2, 3], pa.int8()),
        pa.array([2, 3], pa.uint64()),
        pa.array([2, 3], pa.float32()),
        pa.array(np.array([2, 3], np.float16)),
        pa.array([Decimal("2.00"), Decimal("3.00")]),
        pa.array([Decimal(2), Decimal(3)], pa.decimal256(60, 1)),
        pa.array([2.0, 3.0]).dictionary_encode(),
    ],
)
def test_weights_of_every_numeric_type(weights):
    table = pa.table({"source": ["a", "b"], "target": ["b", "c"], "weight": weights})
    assert from_table(table).outward.weights.tolist() == [2.0, 3.0]


def test_truth_values_as_weights():
    table = pa.table({"source": ["a", "b"], "target": ["b", "c"], "seen": [True, False]})
    graph = from_table(table, weight="seen")
    assert (graph.outward.weights, graph.m, graph.account.zero_weight) == (None, 1, 1)


def test_integer_weights_beyond_53_bits_are_rounded():
    table = pa.table({"source": ["a"], "target": ["b"], "weight": [2**60 + 1]})
    assert from_table(table).outward.weights.tolist() == [2.0**60]


def test_more_rows_than_a_batch_against_scipy():
    """The adjacency equals scipy's sparse sum of duplicates (scipy.sparse as reference)."""
    import scipy.sparse as sp

    rng = np.random.default_rng(5)
    for low, high in ((-300, 300), (-(10**17), 10**17)):
        pool = rng.integers(low, high, 700)
        source, target = rng.choice(pool, 400_000), rng.choice(pool, 400_000)
        weight = rng.integers(1, 9, 400_000).astype(float)  # sums are exact in any order
        table = pa.table({"source": source, "target": target, "weight": weight})
        graph = from_table(pa.concat_tables([table.slice(0, 7), table.slice(7)]))
        ids, codes = np.unique(np.concatenate([source, target]), return_inverse=True)
        want = sp.csr_matrix((weight, (codes[:400_000], codes[400_000:])), shape=(len(ids),) * 2)
        want.sum_duplicates()
        for got, ref in ((graph.outward, want), (graph.inward, want.T.tocsr())):
            ref.sort_indices()
            assert (got.offsets == ref.indptr).all()
            assert (got.neighbours == ref.indices).all()
            assert (got.weights == ref.data).all()
        assert (graph.labels.to_numpy() == ids).all()
        assert graph.account.merged == 400_000 - want.nnz
