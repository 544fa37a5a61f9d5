"""What is compiled while a table is read is what loading and solving then call."""

from __future__ import annotations

import subprocess
import sys
import threading

import pytest

from kingpost.core import warm
from kingpost.core.watch import Progress

# Warms a fresh process, then loads and solves a graph large enough for threads and lanes.
CHECK = """
import sys
from numba.core.dispatcher import Dispatcher
from kingpost.core import warm
from kingpost.core.kernels import settings
from kingpost.core.watch import Watch

settings.look_for_blas = False

def known():
    found = set()
    for name, module in list(sys.modules.items()):
        if name.startswith("kingpost.core.kernels"):
            for value in vars(module).values():
                if isinstance(value, Dispatcher):
                    found |= {(value.py_func.__qualname__, str(s)) for s in value.signatures}
    return found

warm.run(["", "surfer"], Watch(threads=1))
ready = known()
assert ready
import pyarrow as pa
from kingpost.core.gallery import rmat
from kingpost.core.ingest import from_table
from kingpost.core.measures import measure
edges = rmat(15, 1_400_000, seed=3)
for parallel in ("sum", "max"):
    graph = from_table(
        pa.table({"source": edges.source, "target": edges.target}), parallel=parallel
    )
    surfer = measure("surfer")
    _ = surfer.rank(graph, surfer.settings(), Watch(threads=2)).standing
assert "scipy.linalg" not in sys.modules
print(sorted(known() - ready))
"""


def test_loading_and_solving_find_their_kernels_ready():
    done = subprocess.run([sys.executable, "-c", CHECK], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    assert done.stdout == "[]\n"


@pytest.fixture
def runs(monkeypatch):
    seen: list[list[str]] = []
    monkeypatch.setattr(warm, "_expected", [""])
    monkeypatch.setattr(warm, "_started", set())
    monkeypatch.setattr(warm, "run", lambda names, watch: seen.append(list(names)))
    return seen


def test_only_a_large_table_that_is_being_read_starts_it(runs):
    assert warm.heed(Progress("keeping the graph", 1, 10**9)) is None
    assert warm.heed(Progress(warm.READING, 1, warm.LEAST - 1)) is None
    assert warm.heed(Progress(warm.READING, 1, None)) is None
    assert runs == []


def test_each_measure_is_warmed_once(runs):
    large = Progress(warm.READING, 1, warm.LEAST, "rows")
    warm.expect("surfer")
    thread = warm.heed(large)
    assert thread is not None
    thread.join()
    assert warm.heed(large) is None
    warm.expect("surfer", "katz")
    again = warm.heed(large)
    assert again is not None
    again.join()
    assert runs == [["", "surfer"], ["katz"]]


def test_trouble_on_the_thread_stays_there(runs, monkeypatch):
    def fail(names, watch):
        raise RuntimeError("no compiler")

    monkeypatch.setattr(warm, "run", fail)
    told: list[object] = []
    monkeypatch.setattr(threading, "excepthook", told.append)
    thread = warm.heed(Progress(warm.READING, 1, warm.LEAST))
    assert thread is not None
    thread.join()
    assert told == []


def test_the_stage_is_called_as_reading_calls_it():
    import pyarrow as pa

    from kingpost.core.ingest import from_table
    from kingpost.core.watch import Watch

    stages: list[str] = []
    watch = Watch(lambda report: stages.append(report.stage))
    from_table(pa.table({"source": [1], "target": [2]}), watch=watch)
    assert warm.READING in stages
