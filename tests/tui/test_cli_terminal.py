"""The command line on a real pseudo-terminal: what it refuses, tames and cleans up."""

from __future__ import annotations

import os
import pty
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pyte
import pytest

ENDLESS = """
import sys
import numpy as np
from kingpost.core import measures
from kingpost.core.measures.base import Measure, Settings
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop

def solve(graph, settings, watch):
    index = 0
    while not watch.cancelled:
        index += 1
        yield Iteration(index, 0.5, 0.5, index, 0.0, proven=2)
    return Result("endless", settings, np.arange(graph.n) + 1.0, Stop.CANCELLED,
                  "cancelled on the way", Bound(BoundKind.L1, 0.5, absolute=0.5))

class Module:
    MEASURE = Measure("endless", "N", "endless", Settings, solve)

sys.modules["endless"] = Module
measures._MODULES["endless"] = "endless"
from kingpost.tui.cli import main
main()
"""


@pytest.fixture
def edges(tmp_path: Path) -> Path:
    names = ["\x1b[31mred", "\N{RIGHT-TO-LEFT OVERRIDE}txt", "plain"]
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": names, "target": names[1:] + names[:1]}), path)
    return path


def on_terminal(
    words: list[object], react: Callable[[bytes, subprocess.Popen[bytes]], None] | None = None
) -> tuple[int, bytes]:
    """Run the program with both outputs on a terminal; its status and all it wrote."""
    master, slave = pty.openpty()
    with subprocess.Popen(
        [sys.executable, *map(str, words)],
        stdin=subprocess.DEVNULL,
        stdout=slave,
        stderr=slave,
        env={**os.environ, "TERM": "xterm", "COLUMNS": "80", "LINES": "24"},
    ) as process:
        os.close(slave)
        said = b""
        while True:
            try:
                piece = os.read(master, 65_536)
            except OSError:  # Linux: the other side is closed
                break
            if not piece:
                break
            said += piece
            if react is not None:
                react(said, process)
        status = process.wait(timeout=60)
    os.close(master)
    return status, said


def test_parquet_is_refused_before_any_work(edges: Path) -> None:
    words = ["-m", "kingpost.tui", "rank", edges, "--format", "parquet"]
    status, said = on_terminal(words)
    assert status == 2
    assert said.decode().splitlines() == [
        "kingpost: parquet is no text for a terminal; add --out FILE, or use a pipe"
    ]


@pytest.mark.parametrize("form", ["table", "csv", "json"])
def test_names_do_not_act_on_a_terminal(edges: Path, form: str) -> None:
    words = ["-m", "kingpost.tui", "rank", edges, "--format", form]
    status, said = on_terminal(words)
    assert status == 0, said
    assert b"\x1b" not in said
    assert "\N{RIGHT-TO-LEFT OVERRIDE}".encode() not in said
    assert b"[31mred" in said


def test_progress_is_one_line_and_leaves_nothing(edges: Path) -> None:
    asked = []

    def interrupt(said: bytes, process: subprocess.Popen[bytes]) -> None:
        if b"order proven to 2" in said and not asked:
            asked.append(True)
            process.send_signal(signal.SIGINT)

    words = ["-c", ENDLESS, "rank", edges, "--measure", "endless", "--source", "source"]
    status, said = on_terminal([*words, "--target", "target"], interrupt)
    assert status == 130
    assert b"endless  sweep" in said
    screen = pyte.Screen(80, 40)
    pyte.ByteStream(screen).feed(said)
    lines = [line.rstrip() for line in screen.display]
    assert lines[0].startswith("edges.parquet  3 nodes")
    assert not any("sweep" in line and "max-sweeps" not in line for line in lines)
    assert "kingpost: endless: cancelled: cancelled on the way" in lines
