"""Choosing which column of a table is what."""

from __future__ import annotations

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import UnclearColumns
from kingpost.core.ingest import LoadOptions, load, peek
from kingpost.tui.models.roles import Roles


@pytest.fixture
def table(tmp_path):
    path = tmp_path / "moves.parquet"
    pq.write_table(
        pa.table(
            {
                "hull": pa.array([1, 2, 3, None], pa.int64()),
                "berth_a": ["x\x1b", "y", "y", "z"],
                "berth_b": ["y", "z", "x\x1b", "y"],
                "minutes": [1.0, 2.5, 1 / 3, 4.0],
                "pilot": ["ada", None, "bo", "bo"],
                "open": [True, False, True, True],
            }
        ),
        path,
    )
    return str(path)


@pytest.fixture
def roles(table):
    return Roles(peek(table), LoadOptions())


def cells(roles, at):
    return [column.text(at) for column in roles.head]


def test_types_nulls_and_sample_rows_are_shown_safely(table, roles):
    with pytest.raises(UnclearColumns):
        load(table)
    assert cells(roles, 0) == ["-", "hull", "int64", "1", "1", "2", "3"]
    assert cells(roles, 1)[4:] == ["x\\e", "y", "y"]
    assert cells(roles, 3)[4:] == ["1", "2.5", "0.333333"]
    assert roles.size == "4 rows  6 columns"


def test_a_free_role_comes_first(roles):
    roles.turn(1, 1)
    assert roles.role_of(1) == "source"
    assert roles.missing == "say which column an edge leads to (target)"
    roles.turn(2, 1)
    assert roles.role_of(2) == "target"
    assert roles.missing == ""
    roles.turn(3, 1)
    assert roles.role_of(3) == "weight"
    assert roles.words == "berth_a -> berth_b, weight minutes"


def test_a_role_is_taken_from_the_column_that_had_it(roles):
    roles.turn(1, 1)
    roles.turn(2, -1)  # backwards: the role another column has comes last, so first this way
    assert (roles.role_of(1), roles.role_of(2)) == (None, "source")


def test_turning_goes_round(roles):
    seen = []
    for _ in range(4):
        seen.append(roles.role_of(0))
        roles.turn(0, 1)
    assert seen == [None, "source", "target", "weight"]
    assert roles.role_of(0) is None


def test_columns_of_different_sorts_cannot_be_the_ends_of_an_edge(roles):
    roles.turn(0, 1)
    roles.turn(1, 1)
    assert "int64" in roles.missing
    assert "do not go together" in roles.missing


def test_what_is_chosen_reads_the_table(table, roles):
    roles.turn(1, 1)
    roles.turn(2, 1)
    graph = load(table, roles.options())
    assert (graph.n, graph.m, graph.weighted) == (3, 4, False)
    roles.turn(6, 1)
    assert cells(roles, 6)[:2] == ["both ways", "every row"]
    assert not load(table, roles.options()).directed
    roles.turn(7, 1)
    assert roles.options().bad_rows == "skip"


def test_an_empty_table_has_columns_and_no_rows(tmp_path):
    path = tmp_path / "empty.parquet"
    pq.write_table(pa.table({"p": pa.array([], pa.string()), "q": pa.array([], pa.int8())}), path)
    found = peek(path)
    assert found.values == ((), ())
    assert Roles(found, LoadOptions()).size == "0 rows  2 columns"
