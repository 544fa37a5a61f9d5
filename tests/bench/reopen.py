"""How long reopening takes, what keeping costs, and what memory a solve over the files needs.

    .venv/bin/python tests/bench/reopen.py .bench/rmat20.parquet

Every figure comes from a process of its own: ``keep`` reads the table and keeps the graph,
``reopen`` opens the kept copy with every checksum verified, ``mapped`` and ``read`` solve the
random surfer over the kept and over the freshly read graph, ``again`` finds the result.  Memory
is what only this process holds (RssAnon); pages of the files can be dropped at any time.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path
from typing import Any

TRIES = 5


def anonymous() -> int:
    """Bytes of memory that no file stands behind, as Linux counts them."""
    with open("/proc/self/status") as status:
        for line in status:
            if line.startswith("RssAnon:"):
                return int(line.split()[1]) * 1024
    return 0


class Peak:
    """The greatest :func:`anonymous` while the block runs, looked at every 5 ms."""

    def __enter__(self) -> Peak:
        self.bytes, self._on = anonymous(), True
        self._thread = threading.Thread(target=self._look)
        self._thread.start()
        return self

    def _look(self) -> None:
        while self._on:
            self.bytes = max(self.bytes, anonymous())
            time.sleep(0.005)

    def __exit__(self, *_: object) -> None:
        self._on = False
        self._thread.join()


def work(what: str, path: str, shelf: str) -> dict[str, Any]:
    """One measurement; everything but the work itself is imported before."""
    import numpy  # noqa: F401
    import pyarrow.compute
    import pyarrow.dataset
    import pyarrow.parquet  # noqa: F401

    from kingpost.core.ingest import load
    from kingpost.core.measures import measure
    from kingpost.core.measures.base import finish
    from kingpost.core.open import open_graph
    from kingpost.core.store.results import keep_result, solve
    from kingpost.core.store.shelf import Shelf
    from kingpost.core.watch import Watch

    surfer, watch = measure("surfer"), Watch()
    if what == "warm":  # compiled loops come from numba's own cache afterwards
        graph = load(path)
        finish(surfer.solve(graph)).standing  # noqa: B018
        return {}
    if what in ("keep", "load"):
        began = time.perf_counter()
        graph = load(path) if what == "load" else open_graph(path, store=shelf, tell=print)
        seconds = time.perf_counter() - began
        size = sum(entry.bytes for entry in Shelf(shelf).entries())
        return {"seconds": seconds, "edges": graph.m, "nodes": graph.n, "bytes": size}
    if what == "reopen":
        times, used = [], time.process_time()
        for _ in range(TRIES):
            began = time.perf_counter()
            graph = open_graph(path, store=shelf, tell=print)
            times.append(time.perf_counter() - began)
        used = (time.process_time() - used) / TRIES
        return {"first": times[0], "seconds": sorted(times)[TRIES // 2], "cpu": used}
    graph = load(path) if what == "read" else open_graph(path, store=shelf, tell=print)
    before = anonymous()
    with Peak() as peak:
        began = time.perf_counter()
        result = finish(solve(surfer, graph, None, watch))
        seconds = time.perf_counter() - began
    found = {"seconds": seconds, "held before": before, "peak": peak.bytes, "nodes": graph.n}
    _ = result.standing
    if what == "mapped":
        began = time.perf_counter()
        keep_result(surfer, graph, result, watch)
        found["keeping"] = time.perf_counter() - began
    found["kept"] = result.solved_on is not None
    return found


def measured(what: str, path: str, shelf: str) -> dict[str, Any]:
    """The same in a fresh process."""
    command = [sys.executable, __file__, path, "--work", what, "--shelf", shelf]
    done = subprocess.run(command, check=True, capture_output=True, text=True)
    return dict(json.loads(done.stdout.splitlines()[-1]))


def main() -> None:
    """Measure, and print one line a figure."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("path")
    parser.add_argument("--work")
    parser.add_argument("--shelf")
    given = parser.parse_args()
    if given.work:
        print(json.dumps(work(given.work, given.path, given.shelf)))
        return
    with tempfile.TemporaryDirectory(dir=Path(given.path).parent) as folder:
        shelf = os.path.join(folder, "shelf")
        measured("warm", given.path, shelf)
        load, keep = (measured(what, given.path, shelf) for what in ("load", "keep"))
        print(f"{given.path}: {keep['nodes']:,} nodes, {keep['edges']:,} edges")
        print(f"load without keeping   {load['seconds']:.2f} s")
        print(f"load and keep          {keep['seconds']:.2f} s, {keep['bytes'] / 1e6:,.0f} MB kept")
        again = measured("reopen", given.path, shelf)
        print(
            f"reopen, all verified   {again['seconds']:.3f} s (median of {TRIES}; the first "
            f"{again['first']:.3f} s; {again['cpu']:.3f} s of processor time)"
        )
        for what, words in (("read", "over arrays"), ("mapped", "over the files"), ("again", "")):
            found = measured(what, given.path, shelf)
            if what == "again":
                told = "from the store" if found["kept"] else "NOT from the store"
                print(f"the kept result        {found['seconds']:.3f} s, {told}")
                continue
            before, peak = found["held before"], found["peak"]
            more = (peak - before) / found["nodes"]
            print(
                f"surfer {words:<15} {found['seconds']:.2f} s; memory of its own "
                f"{before / 1e6:,.0f} MB before, {peak / 1e6:,.0f} MB at most "
                f"({more:.0f} bytes a node more)"
            )


if __name__ == "__main__":
    main()
