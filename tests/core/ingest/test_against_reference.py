"""Any table gives the graph and the account that dictionaries and plain loops give."""

import datetime as dt
import itertools
import tempfile
from decimal import Decimal
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reference import Refused, agree, expected

from kingpost.core.errors import RowsError
from kingpost.core.ingest import from_table, load, spread
from kingpost.core.watch import Watch

TEXT = st.text(st.characters(exclude_categories=["Cs"]), max_size=4)
KINDS = {
    "int8": (pa.int8(), st.integers(-128, 127)),
    "int32": (pa.int32(), st.integers(-3, 3)),
    "int64 wide": (pa.int64(), st.integers(-(2**63), 2**63 - 1)),
    "uint16": (pa.uint16(), st.integers(0, 2**16 - 1)),
    "uint64 wide": (pa.uint64(), st.integers(0, 2**64 - 1)),
    "uint64 high": (pa.uint64(), st.integers(2**64 - 9, 2**64 - 1)),
    "string": (pa.string(), TEXT),
    "large string": (pa.large_string(), TEXT),
    "dictionary": (pa.dictionary(pa.int16(), pa.string()), TEXT),
    "binary": (pa.binary(), st.binary(max_size=3)),
    "fixed binary": (pa.binary(2), st.binary(min_size=2, max_size=2)),
    "decimal": (
        pa.decimal128(20, 2),
        st.integers(-(10**19), 10**19).map(lambda i: Decimal(i).scaleb(-2)),
    ),
    "date": (pa.date32(), st.dates(dt.date(1900, 1, 1), dt.date(2100, 1, 1))),
    "timestamp": (
        pa.timestamp("us"),
        st.datetimes(dt.datetime(1900, 1, 1), dt.datetime(2100, 1, 1)),
    ),
    "bool": (pa.bool_(), st.booleans()),
}
GOOD = st.sampled_from([0.0, -0.0, 1.0, 1.0, 0.1, 0.2, 0.3, 2.5, 7.0, 1e16, 1e-300])
ODD = st.sampled_from([None, float("nan"), float("inf"), -1.0, -float("inf"), 1e308, 1e-309])


@st.composite
def tables(draw):
    """Rows, their table (chunked, columns in any order) and whether it has weights."""
    kind, values = KINDS[draw(st.sampled_from(sorted(KINDS)))]
    pool = draw(st.lists(values, min_size=1, max_size=6))
    # A third of the tables has bad rows, so that the other paths are walked often.
    bad = draw(st.sampled_from([False, False, True]))
    ids = st.sampled_from(pool + [None] * bad)
    size = draw(st.integers(1, 24))
    source = draw(st.lists(ids, min_size=size, max_size=size))
    target = draw(st.lists(ids, min_size=size, max_size=size))
    weight_kind = draw(st.sampled_from([None, pa.float64(), pa.float64(), pa.int32()]))
    columns = {"source": pa.array(source, kind), "target": pa.array(target, kind)}
    weights = [None] * size
    if weight_kind is not None:
        numbers = st.integers(-bad, 3) if pa.types.is_integer(weight_kind) else GOOD
        if bad and pa.types.is_floating(weight_kind):
            numbers |= ODD
        weights = draw(st.lists(numbers, min_size=size, max_size=size))
        columns["weight"] = pa.array(weights, weight_kind)
    columns["note"] = pa.array(["x"] * size)
    order = draw(st.permutations(sorted(columns)))
    table = pa.table({name: columns[name] for name in order})
    cuts = sorted(draw(st.lists(st.integers(0, size), max_size=3)))
    pieces = [table.slice(a, b - a) for a, b in itertools.pairwise([0, *cuts, size])]
    rows = list(zip(source, target, weights, strict=True))
    return rows, pieces, weight_kind is not None


POLICIES = st.fixed_dictionaries(
    {
        "directed": st.booleans(),
        "parallel": st.sampled_from(["sum", "sum", "mean", "min", "max", "first", "count"]),
        "loops": st.sampled_from(["keep", "drop"]),
        "bad_rows": st.sampled_from(["refuse", "skip", "skip"]),
        "weight_as": st.sampled_from(["asis", "asis", "log1p", "inverse", "none"]),
    }
)


@settings(max_examples=300, deadline=None)
@given(tables(), POLICIES)
def test_a_table_in_memory_gives_what_the_reference_gives(made, policies):
    rows, pieces, weighted = made
    table = pa.concat_tables(pieces)
    try:
        want = expected(rows, weighted=weighted, **policies)
    except Refused:
        with pytest.raises(RowsError):
            from_table(table, **policies)
        return
    agree(from_table(table, **policies), want)


@settings(max_examples=100, deadline=None)
@given(tables(), POLICIES, st.integers(1, 4), st.sampled_from([1, 3]))
def test_pieces_and_threads_change_nothing(made, policies, piece, threads):
    rows, pieces, weighted = made
    try:
        want = expected(rows, weighted=weighted, **policies)
    except Refused:
        return
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(spread, "PIECE", piece)
        graph = from_table(pa.concat_tables(pieces), watch=Watch(threads=threads), **policies)
    agree(graph, want)


def test_parallel_rows_meet_in_the_order_of_rows_across_pieces(monkeypatch):
    monkeypatch.setattr(spread, "PIECE", 3)
    weights = [float(at) for at in range(40, 0, -1)]
    table = pa.table({"source": ["a"] * 40, "target": ["b"] * 40, "weight": weights})
    for threads in (1, 3):
        graph = from_table(table, parallel="first", watch=Watch(threads=threads))
        assert graph.outward.weights.tolist() == [40.0]


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(tables(), POLICIES, st.integers(1, 9), st.sampled_from(["folder", "glob", "list"]))
def test_files_give_what_the_reference_gives(made, policies, group_rows, how):
    rows, pieces, weighted = made
    with tempfile.TemporaryDirectory() as folder:
        paths = [Path(folder) / f"{at}.parquet" for at in range(len(pieces))]
        for path, piece in zip(paths, pieces, strict=True):
            pq.write_table(piece, path, row_group_size=group_rows)
        given_paths = {"folder": folder, "glob": f"{folder}/*.parquet", "list": paths}[how]
        try:
            want = expected(rows, weighted=weighted, **policies)
        except Refused:
            with pytest.raises(RowsError):
                load(given_paths, **policies)
            return
        agree(load(given_paths, **policies), want)


@settings(max_examples=40, deadline=None)
@given(st.data())
def test_the_order_of_rows_leaves_no_trace_where_edges_are_distinct(data):
    size = data.draw(st.integers(1, 5))
    names = data.draw(st.lists(TEXT, min_size=size, max_size=size, unique=True))
    pairs = st.tuples(st.sampled_from(names), st.sampled_from(names))
    rows = data.draw(st.lists(pairs, min_size=1, max_size=12, unique=True))
    again = data.draw(st.permutations(rows))

    def graph(of):
        return from_table(pa.table({"source": [u for u, _ in of], "target": [v for _, v in of]}))

    assert graph(rows).fingerprint == graph(again).fingerprint
