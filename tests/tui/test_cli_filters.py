"""Filters and formats from the command line: said in every header and export."""

from __future__ import annotations

import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


@pytest.fixture
def table(tmp_path: Path) -> Path:
    columns = {
        "caller": ["a", "b", "c", "d"],
        "callee": ["b", "c", "a", "a"],
        "calls": [1, 2, 3, None],
        "day": ["mon", "mon", "tue", "mon"],
    }
    path = tmp_path / "calls.parquet"
    pq.write_table(pa.table(columns), path)
    return path


COMMANDS = [
    ("rank", ["--measure", "degree"]),
    ("audit", []),
    ("node", ["a"]),
    ("why", ["a"]),
    ("agree", ["--measures", "degree,surfer"]),
]


@pytest.mark.parametrize(("command", "more"), COMMANDS)
def test_a_filter_is_said_where_answers_are_read(
    table: Path, command: str, more: list[str]
) -> None:
    done = run(command, table, *more, "--where", "calls > 1", "--bad-rows", "skip", "--no-store")
    assert done.exit_code == 0, done.output
    assert "where: calls > 1" in " ".join(done.stdout.split())
    assert "filtered 2 rows for which where is not true, 1 of them because" in done.stderr


@pytest.mark.parametrize(("command", "more"), COMMANDS)
def test_a_filter_is_said_in_data(table: Path, command: str, more: list[str]) -> None:
    done = run(command, table, *more, "--where", "calls > 1", "--format", "json", "--no-store")
    assert done.exit_code == 0, done.output
    text = json.dumps(json.loads(done.stdout))
    assert "calls > 1" in text
    assert '"filtered": 2' in text
    assert '"filtered_null": 1' in text


def test_parquet_and_markdown_say_it_too(table: Path, tmp_path: Path) -> None:
    out = tmp_path / "ranks.parquet"
    assert run("rank", table, "--where", "day = 'mon'", "--weight-as", "none", "--out", out,
               "--no-store").exit_code == 0  # fmt: skip
    facts = json.loads(pq.read_schema(out).metadata[b"kingpost"])
    assert facts["input"]["where"] == "day = 'mon'"
    assert facts["account"]["filtered"] == 1
    done = run("rank", table, "--where", "calls > 1", "--format", "markdown", "--no-store")
    assert "where: calls" in done.stdout


def test_nodes_left_out_are_counted(table: Path, tmp_path: Path) -> None:
    nodes = tmp_path / "nodes.csv"
    nodes.write_text("id,team\na,x\nb,x\nc,y\n")
    options = ["--nodes", nodes, "--node-where", "team = 'x'", "--weight-as", "none"]
    done = run("audit", table, *options, "--no-store")
    assert done.exit_code == 0, done.output
    words = " ".join(done.stdout.split())
    assert "nodes where: team = 'x'" in words
    assert (
        "2 nodes for which node-where is not true (1 neither true nor false), and 3 rows that lead"
        in words
    )


@pytest.mark.parametrize("where", ["calls >", "cals > 1", "calls > 1; select 1", "sum(calls) > 1"])
def test_a_wrong_filter_is_one_sentence_and_status_2(table: Path, where: str) -> None:
    done = run("rank", table, "--where", where, "--no-store")
    assert done.exit_code == 2
    assert done.stderr.startswith("kingpost: --where")
    assert done.stderr.count("\n") == 1
    assert done.stdout == ""


def test_text_tables_with_their_options(tmp_path: Path) -> None:
    path = tmp_path / "calls.txt"
    path.write_bytes("a\té\nb\té\n".encode("latin-1"))
    words = ["rank", path, "--measure", "degree", "--format", "csv", "--no-store"]
    done = run(*words)
    assert done.exit_code == 2
    assert "--encoding" in done.stderr
    done = run(*words, "--encoding", "latin-1", "--header", "no", "--delimiter", "\\t")
    assert done.exit_code == 0, done.output
    assert '"é"' in done.stdout


def test_the_audit_tells_the_memory(table: Path) -> None:
    options = ["--bad-rows", "skip", "--no-store"]
    done = run("audit", table, *options, "--format", "json")
    memory = json.loads(done.stdout)["memory"]
    assert memory["rows"] == 4
    assert 0 < memory["peak"] < memory["available"]["bytes"]
    assert "at the peak of loading, as predicted" in " ".join(
        run("audit", table, *options).stdout.split()
    )
