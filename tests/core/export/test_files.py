"""Files appear whole or not at all."""

from __future__ import annotations

import io
import json
import math
import os
from pathlib import Path

import pyarrow.csv
import pyarrow.parquet as pq
import pytest
from handmade import make_result

from kingpost.core.errors import OutputError
from kingpost.core.export.files import check_target, replacing
from kingpost.core.export.log import kind_of, write_log


def test_a_file_appears_when_it_is_complete(tmp_path: Path) -> None:
    target = tmp_path / "out.csv"
    target.write_text("old")
    with replacing(str(target)) as sink:
        sink.write(b"new")
        assert target.read_text() == "old"
    assert target.read_text() == "new"
    assert os.listdir(tmp_path) == ["out.csv"]


@pytest.mark.parametrize("trouble", [ValueError, KeyboardInterrupt])
def test_trouble_on_the_way_leaves_the_old_file(
    tmp_path: Path, trouble: type[BaseException]
) -> None:
    target = tmp_path / "out.csv"
    target.write_text("old")

    def half() -> None:
        with replacing(str(target)) as sink:
            sink.write(b"half")
            raise trouble

    with pytest.raises(trouble):
        half()
    assert target.read_text() == "old"
    assert os.listdir(tmp_path) == ["out.csv"]


def test_a_link_is_followed_and_permissions_stay(tmp_path: Path) -> None:
    real, link = tmp_path / "real", tmp_path / "link"
    real.write_text("old")
    real.chmod(0o640)
    link.symlink_to(real)
    with replacing(str(link)) as sink:
        sink.write(b"new")
    assert link.is_symlink()
    assert real.read_text() == "new"
    assert real.stat().st_mode & 0o777 == 0o640


def test_a_device_is_written_and_not_replaced() -> None:
    check_target(os.devnull)
    before = os.stat(os.devnull).st_mode
    with replacing(os.devnull) as sink:
        sink.write(b"gone")
    assert os.stat(os.devnull).st_mode == before


def test_targets_that_cannot_be_are_refused_early(tmp_path: Path) -> None:
    source = tmp_path / "edges.parquet"
    source.write_bytes(b"x")
    with pytest.raises(OutputError, match="is a folder"):
        check_target(str(tmp_path))
    with pytest.raises(OutputError, match="no folder"):
        check_target(str(tmp_path / "none" / "out.csv"))
    with pytest.raises(OutputError, match="being read"):
        check_target(str(source), ["missing", str(source)])
    check_target(str(tmp_path / "new.csv"), [str(source)])


def test_log_as_json_csv_and_parquet() -> None:
    result = make_result([1.0])

    def written(kind: str) -> io.BytesIO:
        sink = io.BytesIO()
        write_log(result, sink, kind)
        return io.BytesIO(sink.getvalue())

    nulls = pyarrow.csv.ConvertOptions(null_values=[""])
    first, second = json.load(written(".json"))
    assert (first["index"], first["bound"], first["proven"]) == (1, None, None)
    assert (second["bound"], second["eigenvalue_low"], second["part"]) == (1e-11, 1.5, "core")
    for table in (
        pyarrow.csv.read_csv(written(".csv"), convert_options=nulls),
        pq.read_table(written(".parquet")),
    ):
        assert table.column_names == list(first)
        assert table.column("edge_visits").to_pylist() == [9, 18]
        assert math.isnan(table.column("bound")[0].as_py())
        assert table.column("proven").to_pylist() == [None, 3]


def test_log_of_no_iterations_has_its_columns() -> None:
    sink = io.BytesIO()
    write_log(make_result([1.0], log=()), sink, ".parquet")
    assert pq.read_table(io.BytesIO(sink.getvalue())).num_rows == 0
    sink = io.BytesIO()
    write_log(make_result([1.0], log=()), sink, ".json")
    assert json.loads(sink.getvalue()) == []


def test_log_names_its_kind() -> None:
    assert kind_of("a/b.JSON") == ".json"
    with pytest.raises(OutputError, match=r"\*\.csv"):
        kind_of("sweeps.txt")
