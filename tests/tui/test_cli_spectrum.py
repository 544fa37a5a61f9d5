"""``kingpost spectrum``, through click's runner."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
HARBOUR = SAMPLES / "harbour_calls.parquet"
CALLS = ("--weight", "calls_per_min")


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, ["spectrum", *(str(word) for word in words)])


def written(folder: Path, source: list[object], target: list[object]) -> Path:
    path = folder / "edges.parquet"
    pq.write_table(pa.table({"source": source, "target": target}), path)
    return path


def test_the_same_rows_in_every_format(tmp_path: Path) -> None:
    words = (HARBOUR, *CALLS, "--measure", "katz", "--count", "4")
    found = json.loads(run(*words, "--format", "json").stdout)
    rows = found["values"]
    assert [row["number"] for row in rows] == list(range(1, len(rows) + 1))
    assert rows[0]["low"] <= rows[0]["real"] + 1e-9
    assert found["radius"][0] <= 0.85 <= found["radius"][1] + 1e-12
    assert {row["rate"] for row in found["rates"]} == {"predicted", "observed"}
    assert found["solve"]["stop"] == "converged"
    table = tmp_path / "values.parquet"
    assert run(*words, "--out", table).exit_code == 0
    assert pq.read_table(table).column_names == list(rows[0])
    read = list(csv.DictReader(io.StringIO(run(*words, "--format", "csv").stdout)))
    assert [float(row["modulus"]) for row in read] == [row["modulus"] for row in rows]
    rates = run(*words, "--format", "csv", "--sheet", "rates").stdout
    assert "observed" in rates
    text = run(*words).stdout
    assert max(map(len, text.splitlines())) <= 100
    assert "predicted rate 0.85 a sweep" in text
    assert "observed rate" in text
    assert run(*words, "--format", "markdown").exit_code == 0


@pytest.mark.parametrize("measure", ["surfer", "eigenvector", "hits", "communicability"])
def test_every_measure_with_a_matrix(measure: str, tmp_path: Path) -> None:
    ring = written(tmp_path, [1, 2, 3, 1], [2, 3, 1, 3])
    done = run(ring, "--measure", measure, "--format", "json")
    assert done.exit_code == 0, done.stderr
    found = json.loads(done.stdout)
    assert found["complete"] is True
    assert found["values"]


def test_a_measure_that_has_no_answer_still_has_a_spectrum(tmp_path: Path) -> None:
    chain = written(tmp_path, [1, 2], [2, 3])
    done = run(chain, "--measure", "eigenvector")
    assert done.exit_code == 0
    assert "every eigenvalue is exactly 0" in done.stdout
    assert "itself has no answer here" in done.stdout
    assert (
        json.loads(run(chain, "--measure", "eigenvector", "--format", "json").stdout)["values"]
        == []
    )
    twins = written(tmp_path, [1, 2, 3, 4], [2, 1, 4, 3])
    text = run(twins, "--measure", "surfer").stdout
    assert "2 closed classes" in text


def test_it_refuses_in_a_sentence(tmp_path: Path) -> None:
    for words, told in [
        (("--measure", "degree"), "degree iterates no matrix"),
        (("--measure", "pagerang"), "no measure is called"),
        (("--count", "0"), "a number from 1"),
        (("--measure", "katz", "--damping", "0.5"), "takes no --damping"),
    ]:
        done = run(HARBOUR, *words)
        assert done.exit_code == 2
        assert told in done.stderr
    none = written(tmp_path, pa.array([], pa.int64()), pa.array([], pa.int64()))
    done = run(none)
    assert done.exit_code == 2
    assert "holds no rows" in done.stderr


def test_names_that_would_act_on_a_terminal_do_not(tmp_path: Path) -> None:
    path = written(tmp_path, ["\x1b[31mred", "b"], ["b", "\x1b[31mred"])
    done = run(path)
    assert done.exit_code == 0
    assert "\x1b" not in done.stdout
