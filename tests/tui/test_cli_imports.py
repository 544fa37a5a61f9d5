"""Starting up is a feature: what each command loads, seen from outside."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

PROGRAM = """
import json, sys
from kingpost.tui.cli import cli
try:
    cli.main(sys.argv[1:])
except SystemExit as leave:
    status = leave.code
print(json.dumps([status, sorted({name.partition(".")[0] for name in sys.modules})]))
"""


def loaded(*words: object) -> tuple[str, set[str]]:
    """What a command prints, and the top-level modules it loaded."""
    done = subprocess.run(
        [sys.executable, "-c", PROGRAM, *map(str, words)],
        capture_output=True,
        text=True,
        timeout=120,
        check=True,
    )
    text, _, last = done.stdout.rstrip("\n").rpartition("\n")
    status, modules = json.loads(last)
    assert status == 0, done.stderr
    return text, set(modules)


@pytest.mark.parametrize("words", [["--help"], ["rank", "--help"], ["--version"]])
def test_help_loads_nothing_heavy(words: list[str]) -> None:
    text, modules = loaded(*words)
    assert text
    heavy = {"numpy", "scipy", "pyarrow", "numba", "networkx", "duckdb", "rich", "textual"}
    assert not heavy & modules


def test_help_names_commands_options_and_statuses() -> None:
    text = loaded("--help")[0]
    for word in ("rank", "audit", "node", "--damping", "--weight-as", "Exit status", "130"):
        assert word in text
    assert "Show one node" in text
    assert max(map(len, text.splitlines())) <= 100


@pytest.mark.parametrize("command", ["rank", "audit", ""])
def test_commands_without_a_screen_load_no_screen(tmp_path: Path, command: str) -> None:
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": [1, 2, 3], "target": [2, 3, 1]}), path)
    text, modules = loaded(*([command] if command else []), path)
    assert "3 nodes" in text
    assert not {"textual", "rich", "networkx", "duckdb"} & modules
