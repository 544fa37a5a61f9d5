"""Killed at any moment, or side by side with others: the next answer is that of a clean run."""

import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

PROGRAM = Path(__file__).parents[2] / "support" / "crashing.py"


@pytest.fixture
def many(tmp_path):
    rng = np.random.default_rng(5)
    source, target = rng.integers(0, 800, (2, 6_000))
    path = tmp_path / "many.parquet"
    columns = {"source": source, "target": target, "weight": rng.random(6_000)}
    pq.write_table(pa.table(columns), path)
    return path


def run(*words):
    command = [sys.executable, str(PROGRAM), *map(str, words)]
    done = subprocess.run(command, capture_output=True, text=True, timeout=300)
    assert done.returncode == 0, done.stderr
    return json.loads(done.stdout)


def test_killed_at_twenty_moments(many, tmp_path):
    first, *kills = run("kill", many, tmp_path / "shelf", 20)
    assert first["moments"] > 100
    assert len(kills) == 20
    for one in kills:
        assert one["killed"], one
        assert one["after"]["answer"] == first["clean"], one
        assert one["again"]["answer"] == first["clean"], one
        # A store that was interrupted is no damaged store: there is nothing to be told.
        assert one["after"]["told"] == one["again"]["told"] == [], one
        assert one["again"]["kept graph"], one
        assert one["again"]["kept result"], one
    # The kills came before, while and after the store was written.
    assert any(one["left"] for one in kills)
    assert not all(one["after"]["read anew"] for one in kills)
    assert all(one["after"]["read anew"] for one in kills[:5])
    assert not any(one["again"]["read anew"] for one in kills)
    assert not any(one["still left"] for one in kills)


def test_several_processes_at_once(many, tmp_path):
    first, *rounds = run("race", many, tmp_path / "shelf", 5)
    for one in rounds:
        assert set(one["statuses"]) == {0}, one
        for said in [*one["runs"], one["after"]]:
            assert said["answer"] == first["clean"], one
        assert one["left"] == [], one
