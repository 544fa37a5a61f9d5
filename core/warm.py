"""Compiling, or fetching from the cache, what a run is going to need while its table is read.

The first kernel of a process costs some tenths of a second, each further one some milliseconds,
and the first start on a machine, which compiles them all, several seconds.  Reading a large
table leaves the interpreter idle for most of its time: a thread spends that on loading and
solving graphs of a few edges, by the same code, so that exactly the kernels for the right types
are ready.  For programs that are about to load something large; a library has no use for it.
"""

from __future__ import annotations

import contextlib
import threading
from collections.abc import Sequence
from typing import Any

from kingpost.core.errors import KingpostError
from kingpost.core.watch import Progress, Watch

READING = "reading rows"  # the stage in which the interpreter is idle
LEAST = 500_000  # rows from which a thread is worth its start

_lock = threading.Lock()
_expected: list[str] = [""]  # names of measures; the empty one stands for loading
_started: set[str] = set()


class _Quiet(Watch):
    """Cancelled as soon as the program is ending: nobody should wait for a compiler then."""

    def __init__(self) -> None:
        super().__init__(threads=1)

    @property
    def cancelled(self) -> bool:
        return super().cancelled or not threading.main_thread().is_alive()

    def check(self) -> None:
        if self.cancelled:
            self.cancel()
        super().check()


def expect(*measures: str) -> None:
    """Say what will be solved on the graph that is about to be loaded."""
    with _lock:
        _expected.extend(measures)


def heed(report: Progress) -> threading.Thread | None:
    """To be told of all progress: starts the thread once a large table is being read.

    A graph that is kept, or small, is there before a thread could help.
    """
    if report.stage != READING or (report.total or 0) < LEAST:
        return None
    with _lock:
        fresh = [name for name in dict.fromkeys(_expected) if name not in _started]
        _started.update(fresh)
    if not fresh:
        return None
    thread = threading.Thread(target=_run, args=(fresh,), name="kingpost-warm")
    thread.start()
    return thread


def _run(names: Sequence[str]) -> None:
    # Whatever goes wrong here will go wrong again, and be told, where it matters.
    with contextlib.suppress(Exception):
        run(names, _Quiet())


def run(names: Sequence[str], watch: Watch) -> None:
    """Load and solve small graphs: unweighted, merged (hence weighted), weighted, by text."""
    import pyarrow as pa

    from kingpost.core.ingest import from_table
    from kingpost.core.measures import measure

    # Cycles of three and two, a loop, a tail, twins on a cycle and off it; then a row repeated.
    source = [0, 1, 2, 0, 11, 2, 3, 4, 5, 6, 7, 7, 8, 9]
    target = [1, 2, 0, 11, 2, 3, 4, 3, 5, 7, 8, 9, 10, 10]
    plain: dict[str, Any] = {"source": source, "target": target}
    repeated = {"source": [*source, 6], "target": [*target, 7]}
    graphs = [from_table(pa.table(table), watch=watch) for table in (repeated, plain)]
    for name in names:
        for graph in graphs if name else ():
            watch.check()
            one = measure(name)
            with contextlib.suppress(KingpostError):
                _ = one.rank(graph, one.settings(), watch).standing
    watch.check()
    if "" in names:
        text = {key: [f"n{value}" for value in ends] for key, ends in plain.items()}
        from_table(pa.table(text), watch=watch)
        from_table(pa.table({"source": [1, 10**12], "target": [2, 5]}), watch=watch)
        from_table(pa.table({**plain, "weight": [0.5] * len(source)}), watch=watch)
        _of_large_graphs()


def _of_large_graphs() -> None:
    """Kernels that join the parts of something small graphs have in one part."""
    import numpy as np

    from kingpost.core.kernels.build import move_left
    from kingpost.core.kernels.mixing import multiply
    from kingpost.core.kernels.rows import copy_rows, given_to

    near, scores = np.zeros(1, np.uint32), np.zeros(1)
    move_left(near, 0, 1, 0)
    move_left(scores, 0, 1, 0)
    copy_rows(near, 0, 1, scores, scores)
    multiply(near, 0, 1, 1.0, scores, np.zeros((1, 1)), 1)
    offsets = np.zeros(2, np.int64)
    for array in (offsets, rows := np.zeros(0, np.uint32), heavy := np.zeros(0)):
        array.setflags(write=False)
    given_to(offsets, rows, None, near, 0, 1, scores, scores)
    given_to(offsets, rows, heavy, near, 0, 1, scores, scores)
