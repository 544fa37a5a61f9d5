"""Every exit status, and what stands on standard error with it."""

from __future__ import annotations

import csv
import json
import os
import signal
import subprocess
import sys
import types
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.core import measures
from kingpost.core.measures.base import Measure, Settings
from kingpost.core.result import Bound, BoundKind, Iteration, Refusal, Stop
from kingpost.core.result import Result as Answer
from kingpost.tui.cli import cli

# A program that registers a measure which sweeps until it is cancelled.
ENDLESS = """
import sys
import numpy as np
from kingpost.core import measures
from kingpost.core.measures.base import Measure, Settings
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop

def solve(graph, settings, watch):
    print("solving", file=sys.stderr, flush=True)
    index = 0
    while not watch.cancelled:
        index += 1
        yield Iteration(index, 0.5, 0.5, index, 0.0)
    return Result("endless", settings, np.arange(graph.n) + 1.0, Stop.CANCELLED,
                  "cancelled on the way", Bound(BoundKind.L1, 0.5, absolute=0.5))

class Module:
    MEASURE = Measure("endless", "N", "endless", Settings, solve)

sys.modules["endless"] = Module
measures._MODULES["endless"] = "endless"
from kingpost.tui.cli import main
main()
"""


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def one_sentence(done: Result) -> str:
    """The only line on standard error that is no note."""
    lines = [line for line in done.stderr.splitlines() if ": note: " not in line]
    assert len(lines) == 1, done.stderr
    assert lines[0].startswith("kingpost: ")
    assert "Traceback" not in done.stderr
    assert "Usage" not in done.stderr
    return lines[0]


@pytest.fixture
def ring(tmp_path: Path) -> Path:
    path = tmp_path / "ring.parquet"
    table = pa.table({"source": ["a", "b", "c", "c"], "target": ["b", "c", "a", "b"]})
    pq.write_table(table, path)
    return path


@pytest.fixture
def register(monkeypatch: pytest.MonkeyPatch) -> Any:
    """Put a made-up measure into the registry."""

    def put(name: str, solver: Any) -> None:
        module = types.ModuleType(f"made_{name}")
        module.MEASURE = Measure(name, "N", name, Settings, solver)  # type: ignore[attr-defined]
        monkeypatch.setitem(sys.modules, module.__name__, module)
        monkeypatch.setitem(measures._MODULES, name, module.__name__)

    return put


def test_0_answered(ring: Path) -> None:
    done = run("rank", ring)
    assert done.exit_code == 0
    assert "converged" in done.stdout


def test_1_prints_the_best_iterate_and_says_how_good_it_is(ring: Path, tmp_path: Path) -> None:
    out = tmp_path / "ranks.json"
    done = run("rank", ring, "--max-sweeps", 1, "--out", out)
    assert done.exit_code == 1
    assert "sweep limit" in one_sentence(done)
    solve = json.loads(out.read_text())["solve"]
    assert solve["stop"] == "sweep limit"
    assert solve["error_bound"] > 1e-10
    table = run("rank", ring, "--max-sweeps", 1)
    assert table.exit_code == 1
    assert "sweep limit:" in table.stdout
    assert "error at most" in table.stdout


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        ([], "no edge table was named"),
        (["rank"], "EDGES"),
        (["rank", "missing.parquet"], "missing.parquet"),
        (["rank", "RING", "--measure", "fame"], "no measure is called 'fame'"),
        (["rank", "RING", "--damping", "2"], "--damping is 2"),
        (["rank", "RING", "--damping", "much"], "'much'"),
        (["rank", "RING", "--flow", "up"], "along, against"),
        (["rank", "RING", "--stop", "order:0"], "order:K"),
        (["rank", "RING", "--tol", "nan"], "--tol"),
        (["rank", "RING", "--top", "0"], "number from 1"),
        (["rank", "RING", "--threads", "-3"], "number from 1"),
        (["rank", "RING", "--format", "xml"], "xml"),
        (["rank", "RING", "--nonsense"], "--nonsense"),
        (["rank", "RING", "--source", "nowhere"], "nowhere"),
        (["rank", "RING", "--out", "ranks.xml"], "add --format"),
        (["rank", "RING", "--out", "/no/such/folder/r.csv"], "no folder"),
        (["rank", "RING", "--out", "RING", "--format", "parquet"], "being read"),
        (["rank", "RING", "--log", "sweeps.txt"], "*.csv"),
        (["rank", "RING", "--out", "x.csv", "--log", "x.csv"], "two files"),
        (["rank", "RING", "--alpha", "0.1"], "it belongs to katz"),
        (["rank", "RING", "--measure", "degree", "--damping", "0.5"], "it belongs to surfer"),
        (["rank", "RING", "--measure", "katz", "--beta", "no such"], "neither a number"),
        (["node", "RING"], "NAME"),
        (["node", "RING", "d"], "no node is called 'd'"),
        (["audit", "RING", "--format", "csv"], "csv"),
        (["audit", "RING", "--damping", "0.5"], "--damping"),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, list) else "",
)
def test_2_is_one_sentence(ring: Path, words: list[str], expected: str) -> None:
    done = run(*[str(ring) if word == "RING" else word for word in words])
    assert done.exit_code == 2
    assert expected in one_sentence(done)
    assert done.stdout == ""


def test_2_for_a_file_that_is_no_table(tmp_path: Path) -> None:
    path = tmp_path / "garbage.parquet"
    path.write_bytes(b"\x1b[31mnot a table at all")
    for command in ("rank", "audit"):
        done = run(command, path)
        assert done.exit_code == 2
        assert "garbage.parquet" in one_sentence(done)
        assert "\x1b" not in done.stderr


def test_2_rather_than_write_over_what_is_read(ring: Path, tmp_path: Path) -> None:
    before = ring.read_bytes()
    found = run("rank", str(ring).replace("ring", "r*g"), "--out", ring)
    assert found.exit_code == 2
    assert "being read" in one_sentence(found)
    nodes = tmp_path / "nodes.csv"
    nodes.write_text("id,x\na,1\n")
    for words in (["--nodes", nodes], ["--teleport", nodes]):
        done = run("rank", ring, *words, "--out", nodes)
        assert done.exit_code == 2
        assert "being read" in one_sentence(done)
    assert ring.read_bytes() == before


def test_3_gives_the_reason_and_what_to_use_instead(ring: Path, register: Any) -> None:
    def refuse(graph: Any, settings: Any, watch: Any) -> Iterator[Iteration]:
        yield Iteration(1, 1.0, 1.0, 1, 0.0)
        return Answer(
            "odd",
            settings,
            np.full(graph.n, np.nan),
            Stop.REFUSED,
            "there is none",
            Bound(BoundKind.NONE, float("nan")),
            refusal=Refusal("there is no such vector", "use katz"),
        )

    register("odd", refuse)
    for form in ("table", "json"):
        done = run("rank", ring, "--measure", "odd", "--format", form)
        assert done.exit_code == 3
        assert one_sentence(done) == "kingpost: there is no such vector; use katz"
        assert done.stdout == ""


def test_3_for_an_acyclic_graph_and_the_eigenvector(tmp_path: Path) -> None:
    path = tmp_path / "chain.parquet"
    pq.write_table(pa.table({"source": ["a", "b"], "target": ["b", "c"]}), path)
    done = run("rank", path, "--measure", "eigenvector")
    assert done.exit_code == 3
    assert "katz" in one_sentence(done).lower()


def test_130_prints_the_best_iterate_of_an_interrupted_solve(ring: Path, register: Any) -> None:
    def interrupted(graph: Any, settings: Any, watch: Any) -> Iterator[Iteration]:
        yield Iteration(1, 0.5, 0.5, 4, 0.0)
        signal.raise_signal(signal.SIGINT)
        assert watch.cancelled
        scores = np.array([3.0, 2.0, 1.0])
        bound = Bound(BoundKind.L1, 0.1, absolute=0.1)
        return Answer("odd", settings, scores, Stop.CANCELLED, "cancelled", bound)

    register("odd", interrupted)
    before = signal.getsignal(signal.SIGINT)
    done = run("rank", ring, "--measure", "odd", "--format", "csv")
    assert done.exit_code == 130
    assert [row["node"] for row in csv.DictReader(done.stdout.splitlines())] == ["a", "b", "c"]
    assert signal.getsignal(signal.SIGINT) is before


def test_130_while_ordering_keeps_the_scores(ring: Path, register: Any) -> None:
    def solved(graph: Any, settings: Any, watch: Any) -> Iterator[Iteration]:
        yield Iteration(1, 0.0, 0.1, 4, 0.0)

        def ties(pools: Any) -> None:
            signal.raise_signal(signal.SIGINT)

        scores, bound = np.array([1.0, 1.0, 3.0]), Bound(BoundKind.L1, 0.1, absolute=0.1)
        return Answer("odd", settings, scores, Stop.CONVERGED, "", bound, symmetry=ties)

    register("odd", solved)
    done = run("rank", ring, "--measure", "odd", "--format", "csv")
    assert done.exit_code == 130
    assert [row["node"] for row in csv.DictReader(done.stdout.splitlines())] == ["c", "a", "b"]
    assert "ties may be missing" in one_sentence(done)


def test_130_while_loading_leaves_nothing(
    ring: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from kingpost.core import ingest

    honest = ingest.load

    def load(paths: Any, options: Any, watch: Any) -> Any:
        signal.raise_signal(signal.SIGINT)
        return honest(paths, options, watch)

    monkeypatch.setattr(ingest, "load", load)
    folder = tmp_path / "out"
    folder.mkdir()
    done = run("rank", ring, "--out", folder / "r.csv")
    assert done.exit_code == 130
    assert one_sentence(done) == "kingpost: interrupted"
    assert os.listdir(folder) == []


def test_130_at_the_second_interrupt_whatever_the_work_says(ring: Path, register: Any) -> None:
    def deaf(graph: Any, settings: Any, watch: Any) -> Iterator[Iteration]:
        yield Iteration(1, 0.5, 0.5, 4, 0.0)
        signal.raise_signal(signal.SIGINT)
        signal.raise_signal(signal.SIGINT)
        raise AssertionError("not reached")

    register("odd", deaf)
    done = run("rank", ring, "--measure", "odd")
    assert (done.exit_code, done.stdout) == (130, "")


def test_130_while_writing_leaves_the_old_file(
    ring: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from kingpost.core.export import data

    def slow(*anything: Any, **more: Any) -> None:
        anything[1].write(b"half")
        signal.raise_signal(signal.SIGINT)

    monkeypatch.setattr(data, "write_json", slow)
    out = tmp_path / "out"
    out.mkdir()
    (out / "r.json").write_text("old")
    done = run("rank", ring, "--out", out / "r.json")
    assert done.exit_code == 130
    assert (out / "r.json").read_text() == "old"
    assert os.listdir(out) == ["r.json"]


def test_a_fault_of_the_program_is_no_answer(ring: Path, register: Any) -> None:
    def broken(graph: Any, settings: Any, watch: Any) -> Iterator[Iteration]:
        yield Iteration(1, 0.5, 0.5, 4, 0.0)
        raise ZeroDivisionError

    register("odd", broken)
    done = run("rank", ring, "--measure", "odd")
    assert done.exit_code == 70
    assert "fault of the program" in done.stderr


def test_a_real_interrupt_of_a_real_process(ring: Path, tmp_path: Path) -> None:
    out = tmp_path / "ranks.csv"
    words = [sys.executable, "-c", ENDLESS, "rank", ring, "--measure", "endless", "--out", out]
    with subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        assert process.stderr is not None
        for line in process.stderr:
            if line == b"solving\n":
                break
        process.send_signal(signal.SIGINT)
        said = process.communicate(timeout=60)[1].decode()
    assert process.returncode == 130
    assert said.splitlines() == ["kingpost: endless: cancelled: cancelled on the way"]
    assert [row["node"] for row in csv.DictReader(out.open())] == ["c", "b", "a"]


def test_a_reader_that_leaves_early_is_no_trouble(ring: Path) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    try:
        done = subprocess.run(
            [sys.executable, "-m", "kingpost.tui", "rank", ring, "--format", "csv"],
            stdout=writing,
            stderr=subprocess.PIPE,
            timeout=60,
            check=False,
        )
    finally:
        os.close(writing)
    assert done.returncode == 0
    assert all(b": note: " in line for line in done.stderr.splitlines())


def test_output_in_an_encoding_without_unicode(ring: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "kingpost.tui", "rank", ring],
        capture_output=True,
        timeout=60,
        check=False,
        env={**os.environ, "PYTHONIOENCODING": "latin-1"},
    )
    assert done.returncode == 0
    assert done.stdout.isascii()
