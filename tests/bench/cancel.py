"""How long work goes on after it was cancelled, wherever that meets it.

    .venv/bin/python tests/bench/cancel.py .bench/rmat20.parquet [--only WHAT ...] [--times 12]

Loading, finding the structure and every measure are begun in a thread and cancelled after 1/13,
2/13 ... of the seconds they take when left alone (of 20 where they take longer), a fresh graph
each time so that nothing kept makes it short.  What is told is the longest and the median delay
from ``Watch.cancel()`` to the return, beside the target of 0.2 s.
"""

from __future__ import annotations

import argparse
import contextlib
import statistics
import threading
import time
from collections.abc import Callable
from dataclasses import replace
from typing import Any

from kingpost.core.errors import Interrupted, KingpostError
from kingpost.core.graph import Graph
from kingpost.core.ingest import load
from kingpost.core.insight.edit import edit_of
from kingpost.core.insight.trial import trial
from kingpost.core.measures import NAMES, measure
from kingpost.core.watch import Watch

TARGET = 0.2
LONGEST = 20.0

Work = Callable[[Watch], Any]


def fresh(graph: Graph) -> Graph:
    """The same graph with nothing found out about it yet."""
    return replace(graph)


def jobs(path: str, graph: Graph) -> dict[str, Work]:
    """Everything that can be begun, by name."""
    from kingpost.core.structure import analyse

    found: dict[str, Work] = {
        "load": lambda watch: load(path, watch=watch),
        "structure": lambda watch: analyse(fresh(graph), watch),
    }
    for name in NAMES:
        one = measure(name)
        found[name] = lambda watch, one=one: one.rank(fresh(graph), one.settings(), watch)
    surfer = measure("surfer")
    before = surfer.rank(graph, surfer.settings())
    edit = edit_of(graph, nodes=[int(before.standing.order[0])])
    found["trial"] = lambda watch: trial(graph, before, edit, watch)
    return found


def alone(work: Work) -> float:
    """Seconds the work takes if it is let, cut off at the longest looked at."""
    watch = Watch()
    timer = threading.Timer(LONGEST, watch.cancel)
    timer.start()
    began = time.perf_counter()
    try:
        work(watch)
    except (Interrupted, KingpostError):
        pass
    finally:
        timer.cancel()
    return time.perf_counter() - began


def delay(work: Work, after: float) -> float | None:
    """Seconds from the cancel to the return; None if the work was over before."""
    watch = Watch()
    cancelled: list[float] = []

    def stop() -> None:
        cancelled.append(time.perf_counter())
        watch.cancel()

    timer = threading.Timer(after, stop)
    timer.start()
    with contextlib.suppress(Interrupted, KingpostError):
        work(watch)
    ended = time.perf_counter()
    timer.cancel()
    return ended - cancelled[0] if cancelled else None


def main() -> int:
    """Measure and print; 1 where something took longer than the target."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("file")
    parser.add_argument("--only", nargs="+", metavar="WHAT")
    parser.add_argument("--times", type=int, default=12)
    asked = parser.parse_args()
    graph = load(asked.file)
    print(f"{asked.file}: {graph.n:,} nodes, {graph.m:,} edges; seconds", flush=True)
    late = False
    for name, work in jobs(asked.file, graph).items():
        if asked.only and name not in asked.only:
            continue
        work_seconds = min(alone(work), alone(work))
        delays = [
            found
            for k in range(1, asked.times + 1)
            if (found := delay(work, work_seconds * k / (asked.times + 1))) is not None
        ]
        if not delays:
            print(f"{name:15}{work_seconds:8.2f} alone; over before it could be cancelled")
            continue
        worst = max(delays)
        late |= worst > TARGET
        print(
            f"{name:15}{work_seconds:8.2f} alone{'+' if work_seconds >= LONGEST else ' '}"
            f"{worst:8.3f} longest{statistics.median(delays):8.3f} median"
            f"{'   beyond ' + str(TARGET) if worst > TARGET else ''}",
            flush=True,
        )
    return int(late)


if __name__ == "__main__":
    raise SystemExit(main())
