"""Filters, formats and how soon a load can be stopped: ``python tests/bench/formats.py FILE``.

FILE is a Parquet table of two whole-number columns, such as rmat20.parquet.  Seconds are the best
of ``--times`` runs in one process after a first; filtered loads also tell the rows kept and the
rows of row groups that were not read.  CSV is measured on the first ``--rows`` rows, written by
Arrow.  The wait after a cancel is the greatest of ``--stops`` loads, cancelled at moments spread
over the time a load takes.
"""

from __future__ import annotations

import argparse
import tempfile
import threading
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.csv as pc
import pyarrow.parquet as pq

from kingpost.core.errors import Interrupted
from kingpost.core.ingest import load
from kingpost.core.ingest.files import open_parts
from kingpost.core.ingest.where import Filter
from kingpost.core.watch import Watch


def best(work: Callable[[], Any], times: int) -> tuple[float, Any]:
    """Least seconds of some runs, and what the last gave."""
    work()
    seconds, made = [], None
    for _ in range(times):
        begin = time.perf_counter()
        made = work()
        seconds.append(time.perf_counter() - begin)
    return min(seconds), made


def passed_over(path: str, where: str) -> int:
    """Rows of the row groups that a filter need not read."""
    chosen = Filter(where, open_parts(path))
    for part in open_parts(path):
        for _ in chosen.read(part, [part.schema.names[0]], Watch()):
            pass
    return chosen.passed_over


def longest_wait(path: str, whole: float, stops: int, **options: Any) -> float:
    """Greatest seconds between a cancel and the end of a load."""
    waits = []
    for at in range(stops):
        watch, told = Watch(), [0.0]

        def cancel(watch: Watch = watch, told: list[float] = told) -> None:
            told[0] = time.perf_counter()
            watch.cancel()

        timer = threading.Timer(whole * (at + 0.5) / stops, cancel)
        timer.start()
        try:
            load(path, watch=watch, **options)
        except Interrupted:
            waits.append(time.perf_counter() - told[0])
        timer.cancel()
    return max(waits, default=0.0)


def main() -> None:
    """Print one line a measurement."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("file")
    parser.add_argument("--times", type=int, default=2)
    parser.add_argument("--rows", type=int, default=4_000_000)
    parser.add_argument("--stops", type=int, default=12)
    asked = parser.parse_args()
    path = asked.file
    source = open_parts(path)[0].schema.names[0]
    high = pq.read_table(path, columns=[source]).column(0)
    middle = high[len(high) // 2].as_py()
    print(f"{'load':44}{'seconds':>9}{'kept':>13}{'unread':>13}{'stopped in':>12}")
    for where in (None, f"{source} % 4 = 0", f"{source} < {middle}", f"{source} < -1 OR true"):
        options = {} if where is None else {"where": where}
        seconds, graph = best(lambda o=options: load(path, **o), asked.times)
        unread = 0 if where is None else passed_over(path, where)
        wait = longest_wait(path, seconds, asked.stops, **options)
        print(
            f"{where or 'no filter':44}{seconds:9.2f}{graph.account.rows_kept:13,}{unread:13,}"
            f"{wait:11.2f}s",
            flush=True,
        )
    table = pq.ParquetFile(path)
    rows: list[pa.RecordBatch] = []
    for batch in table.iter_batches(1 << 20):
        rows.append(batch)
        if sum(map(len, rows)) >= asked.rows:
            break
    some = pa.Table.from_batches(rows).slice(0, asked.rows)
    with tempfile.TemporaryDirectory() as folder:
        pq.write_table(some, f"{folder}/x.parquet")
        pc.write_csv(some, f"{folder}/x.csv")
        with pa.CompressedOutputStream(f"{folder}/x.csv.gz", "gzip") as sink:
            pc.write_csv(some, sink)
        with pa.OSFile(f"{folder}/x.arrow", "wb") as file, pa.ipc.new_file(file, some.schema) as w:
            w.write_table(some)
        for name in ("x.parquet", "x.arrow", "x.csv", "x.csv.gz"):
            one = str(Path(folder) / name)
            text = name.startswith("x.csv")
            seconds, graph = best(lambda o=one: load(o), asked.times)
            wait = longest_wait(one, seconds, asked.stops)
            size = Path(one).stat().st_size / 1e6
            words = f"{name}, {size:,.0f} MB" + (" (types known already)" if text else "")
            print(f"{words:44}{seconds:9.2f}{graph.account.rows_kept:13,}{0:13,}{wait:11.2f}s")
            if text:
                again = []
                for turn in range(asked.times):
                    twin = f"{folder}/{turn}{name}"
                    Path(one).rename(twin)  # another path: it is looked through anew
                    begin = time.perf_counter()
                    load(twin)
                    again.append(time.perf_counter() - begin)
                    Path(twin).rename(one)
                print(f"{name + ', first time':44}{min(again):9.2f}", flush=True)


if __name__ == "__main__":
    main()
