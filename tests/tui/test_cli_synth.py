"""``kingpost synth`` writes whole files only, and says what it wrote."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.core.gallery import KINDS, recipe, tables
from kingpost.tui.cli import cli
from kingpost.tui.commands import synth


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def test_the_words_of_the_command_are_those_of_the_core():
    assert synth.KINDS == KINDS == tuple(tables.COLUMNS)
    assert synth.NAMES == tables.NAMES
    assert synth.WEIGHTS == tables.WEIGHTS


@pytest.mark.parametrize("kind", KINDS)
def test_every_kind_is_written_and_can_be_ranked(kind, tmp_path):
    out = tmp_path / "made.parquet"
    done = run("synth", kind, "--edges", "2k", "--seed", 3, "--out", out)
    assert done.exit_code == 0, done.stderr
    assert done.stdout.startswith("2,000 edges over ")
    assert ("--undirected" in done.stdout) == (kind == "powerlaw")
    whole = recipe(kind, 2_000, seed=3).whole()
    assert pq.read_table(out).column(0).to_pylist() == whole.source.tolist()
    assert os.listdir(tmp_path) == ["made.parquet"]
    ranked = run("rank", out, "--format", "csv", *(["--undirected"] if kind == "powerlaw" else []))
    assert ranked.exit_code == 0, ranked.stderr
    assert len(ranked.stdout.splitlines()) > 10


@pytest.mark.parametrize(("size", "rows"), [("1_200", 1200), ("3k", 3000), ("1,500", 1500)])
def test_sizes_as_people_write_them(size, rows, tmp_path):
    out = tmp_path / "made.parquet"
    assert run("synth", "pairwise", "--edges", size, "--out", out).exit_code == 0
    assert pq.read_metadata(out).num_rows == rows


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["rmat", "--edges", "0"], "'0' is not a number from 1 to 1000G"),
        (["rmat", "--edges", "many"], "'many' is not a number from 1 to 1000G"),
        (["rmat", "--edges", "9", "--nodes", "10"], "a power of two of nodes, not 10"),
        (["rmat", "--edges", "9", "--time"], "the edges of rmat graphs happen at no time"),
        (["layered", "--edges", "9", "--errors", "0.1"], "belong to citation graphs"),
        (["tree", "--edges", "9"], "'tree' is not one of"),
        (["rmat"], "Missing option '--edges'"),
    ],
)
def test_what_cannot_be_made_is_refused_in_one_sentence(words, sentence, tmp_path):
    out = tmp_path / "made.parquet"
    done = run("synth", *words, "--out", out)
    assert done.exit_code == 2
    assert sentence in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert os.listdir(tmp_path) == []


def test_a_folder_that_is_missing_is_refused_before_any_work(tmp_path):
    done = run("synth", "rmat", "--edges", "900G", "--out", tmp_path / "no" / "made.parquet")
    assert done.exit_code == 2
    assert "there is no folder" in done.stderr


@pytest.mark.skipif(os.name != "posix", reason="sends a POSIX signal")
def test_an_interrupt_leaves_the_old_file_and_no_half_one(tmp_path):
    out = tmp_path / "made.parquet"
    out.write_text("as it was")
    words = ["synth", "rmat", "--edges", "2G", "--names", "text", "--out", str(out)]
    child = subprocess.Popen(
        [sys.executable, "-m", "kingpost.tui", *words],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    try:
        deadline = time.monotonic() + 60
        while not _growing(tmp_path) and time.monotonic() < deadline:
            assert child.poll() is None, child.communicate()[1]
            time.sleep(0.02)
        child.send_signal(signal.SIGINT)
        told = child.communicate(timeout=60)[1]
    finally:
        child.kill()
        child.wait()
    assert child.returncode == 130
    assert told == "kingpost: interrupted\n"
    assert os.listdir(tmp_path) == ["made.parquet"]
    assert out.read_text() == "as it was"


def _growing(folder: Path) -> bool:
    """Whether there is an unfinished file with something in it."""
    return any(part.stat().st_size > 0 for part in folder.glob(".kingpost-*.part"))
