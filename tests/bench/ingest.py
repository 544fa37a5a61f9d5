"""How long loading takes against reading the two columns alone, and how much memory it needs.

    python tests/bench/graphs.py FOLDER                     (the bench graphs)
    python tests/bench/ingest.py make FOLDER [--rows 16000000] [--nodes 1000000]
    python tests/bench/ingest.py run FOLDER [--kinds NAME ...]

Without ``--kinds`` it measures what FOLDER holds of the bench graphs and of what ``make`` makes.
Every measurement is a process of its own, reading and loading by turns, ``--rounds`` times.
Seconds, of the clock and of the processor over all threads, are the best of all runs (``--times``
in each process) after small loads have compiled the loops.  Memory is the greatest resident
size less what the process held before; like that of the columns it is told in bytes a row, and
``over`` is what it exceeds the columns by.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import threading
import time
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

KINDS = ("dense", "weighted", "sparse", "text", "few")
BENCH = ("rmat20", "rmat20_text", "citation", "citation_errors", "layered", "powerlaw")
GROUP = 1 << 20


def make(folder: Path, rows: int, nodes: int) -> None:
    """Files of the same random edges.

    Ids 0 to n-1 without and with a weight, scattered 64-bit ids, names of 25 characters, and
    such names of a fiftieth of the nodes only.
    """
    folder.mkdir(parents=True, exist_ok=True)
    rng = np.random.default_rng(1)
    scattered = rng.integers(-(2**62), 2**62, nodes)
    names = pa.array([f"node-{number:020d}" for number in rng.permutation(nodes)])
    schema = dict.fromkeys(KINDS, pa.int64()) | dict.fromkeys(("text", "few"), pa.string())
    writers = {}
    for kind, type_ in schema.items():
        fields = [("source", type_), ("target", type_)]
        fields += [("weight", pa.float64())] if kind == "weighted" else []
        writers[kind] = pq.ParquetWriter(folder / f"{kind}.parquet", pa.schema(fields))
    for start in range(0, rows, GROUP):
        size = min(GROUP, rows - start)
        # Squared uniform numbers: some nodes are met far more often than others.
        ends = [(rng.random(size) ** 2 * nodes).astype(np.int64) for _ in range(2)]
        weight = rng.random(size)
        for kind, writer in writers.items():
            columns = []
            for end in ends:
                if kind in ("text", "few"):
                    columns.append(names.take(pa.array(end // 50 if kind == "few" else end)))
                else:
                    columns.append(pa.array(scattered[end] if kind == "sparse" else end))
            columns += [pa.array(weight)] if kind == "weighted" else []
            writer.write_table(pa.Table.from_arrays(columns, schema=writer.schema))
    for writer in writers.values():
        writer.close()


def resident() -> int:
    """Bytes of memory this process holds now."""
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith("VmRSS"):
            return int(line.split()[1]) * 1024
    raise OSError("no VmRSS")


class Peak:
    """Watches the resident size from a thread while the work runs."""

    def __enter__(self) -> Peak:
        self.start = self.top = resident()
        self.ended = threading.Event()
        self.thread = threading.Thread(target=self._look)
        self.thread.start()
        return self

    def _look(self) -> None:
        while not self.ended.wait(0.005):
            self.top = max(self.top, resident())

    def __exit__(self, *_: object) -> None:
        self.ended.set()
        self.thread.join()

    @property
    def used(self) -> int:
        return self.top - self.start


def measure(path: Path, what: str, times: int) -> dict[str, float]:
    """Seconds and peak memory of one way of reading, in this process."""
    held = pq.read_schema(path).names
    columns = [name for name in ("source", "target", "weight") if name in held]
    if what == "load":
        from kingpost.core import warm
        from kingpost.core.ingest import load
        from kingpost.core.watch import Watch

        warm.run([""], Watch())
    work = (
        (lambda: load(path)) if what == "load" else (lambda: pq.read_table(path, columns=columns))
    )
    seconds, cpu, used, size = [], [], 0, 0
    for turn in range(times):
        begin, busy = time.perf_counter(), time.process_time()
        if turn == 0:
            with Peak() as peak:
                made = work()
            used = peak.used
        else:
            made = work()
        seconds.append(time.perf_counter() - begin)
        cpu.append(time.process_time() - busy)
        size = made.nbytes if what == "read" else made.m
        del made
    return {"seconds": min(seconds), "cpu": min(cpu), "used": used, "size": size}


def run(folder: Path, kinds: list[str], times: int, rounds: int) -> None:
    """Print one line a file; sizes in bytes a row."""
    heads = ("read s", "load s", "read cpu", "load cpu", "ratio", "columns", "peak", "over")
    print(f"{'file':16}{'rows':>12}" + "".join(f"{head:>10}" for head in heads))
    for kind in kinds:
        path = folder / f"{kind}.parquet"
        rows = pq.ParquetFile(path).metadata.num_rows
        found: dict[str, dict[str, float]] = {}
        for _ in range(rounds):
            for what in ("read", "load"):
                command = [sys.executable, __file__, "one", str(path), what, "--times", str(times)]
                line = subprocess.run(command, check=True, capture_output=True).stdout
                for key, value in json.loads(line).items():
                    best = found.setdefault(what, {})
                    best[key] = min(value, best.get(key, value))
        read, loaded = found["read"], found["load"]
        figures = [each[key] for key in ("seconds", "cpu") for each in (read, loaded)]
        columns, peak = read["size"] / rows, loaded["used"] / rows
        figures += [loaded["seconds"] / read["seconds"], columns, peak, peak - columns]
        print(f"{kind:16}{rows:12,}" + "".join(f"{figure:10.2f}" for figure in figures), flush=True)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("task", choices=["make", "run", "one"])
    parser.add_argument("place", type=Path)
    parser.add_argument("what", nargs="?", default="load")
    parser.add_argument("--rows", type=int, default=16_000_000)
    parser.add_argument("--nodes", type=int, default=1_000_000)
    parser.add_argument("--times", type=int, default=3)
    parser.add_argument("--rounds", type=int, default=3)
    parser.add_argument("--kinds", nargs="*", metavar="NAME")
    given = parser.parse_args()
    if given.task == "make":
        make(given.place, given.rows, given.nodes)
    elif given.task == "one":
        print(json.dumps(measure(given.place, given.what, given.times)))
    else:
        there = [kind for kind in (*BENCH, *KINDS) if (given.place / f"{kind}.parquet").exists()]
        run(given.place, given.kinds or there, given.times, given.rounds)


if __name__ == "__main__":
    main()
