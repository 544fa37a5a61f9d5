"""What the screen costs: the first frame, the bytes of a key, and waiting over millions of rows.

    python tests/bench/screen.py [--rows 5000000] [--runs 10] [--keep FOLDER]

The first frame and the keys are measured on the program itself in a pseudo-terminal of 120x40, as
somebody on the far side of a slow line has them; sorting, filtering and finding in this process,
where one can see for how long the event loop did not get a turn.
"""

from __future__ import annotations

import argparse
import asyncio
import os
import re
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

sys.path.insert(0, str(Path(__file__).parents[2]))

from tests.terminal.conftest import Terminal

TICK = 0.002
DOWNS = 200


def table(path: Path, nodes: int) -> Path:
    """A tree of calls: everyone points at a lower number, most at the lowest; names of 16
    characters, so that finding looks at text.
    """
    if path.exists():
        return path
    heads = np.arange(1, nodes)
    tails = (heads * np.random.default_rng(1).random(nodes - 1) ** 3).astype(np.int64)
    names = pa.array([f"ferry-{i:010d}" for i in range(nodes)])
    pq.write_table(pa.table({"caller": names.take(heads), "callee": names.take(tails)}), path)
    return path


def program(*arguments: str | Path) -> Terminal:
    """Kingpost in a pseudo-terminal, with state and store of its own."""
    home = tempfile.mkdtemp(prefix="kingpost-bench-")
    own = ("XDG_STATE_HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME", "KINGPOST_CACHE_DIR")
    env = {key: value for key, value in os.environ.items() if not key.startswith("TEXTUAL")}
    env |= {"TERM": "xterm-256color", "LANG": "C.UTF-8"} | dict.fromkeys(own, home)
    argv = [sys.executable, "-m", "kingpost.tui", *map(str, arguments)]
    return Terminal(argv, (120, 40), env)


def first_frames(path: Path, runs: int) -> list[float]:
    """Seconds from the start of the process to a frame that names the file."""
    found = []
    for _ in range(runs):
        run = program(path, "--no-store")
        while path.name not in run.text:
            run.pump(0.05)
        found.append(time.monotonic() - run.began)
        run.close()
    return found


def bytes_of_a_key(path: Path) -> tuple[float, float]:
    """Bytes a key on average: without scrolling, and over 200 cursor-downs."""
    run = program(path, "--no-store")
    run.shows("? all keys", "held up by", " katz", " degree")
    run.settle(1.0)

    def row() -> int:
        found = re.search(r"▸ *([\d,]+)", run.text)
        return int(found[1].replace(",", "")) if found else 0

    def downs(count: int, rest: float) -> float:
        run.settle()
        start = len(run.raw)
        for _ in range(count):
            before = row()
            run.press("down")
            run.until(lambda at=before: row() > at, "the next row")  # type: ignore[misc]
            if rest:
                run.settle(rest)
        run.settle()
        return (len(run.raw) - start) / count

    still, scrolling = downs(15, 0.15), downs(DOWNS, 0.0)
    run.close()
    return still, scrolling


async def timed(condition: Callable[[], bool]) -> tuple[float, float]:
    """Seconds until a condition holds, and the longest turn the loop had to wait for."""
    start = last = time.perf_counter()
    worst = 0.0
    while not condition():
        await asyncio.sleep(TICK)
        now = time.perf_counter()
        worst, last = max(worst, now - last - TICK), now
    return time.perf_counter() - start, worst


async def over_many_rows(path: Path) -> None:
    """Sort, filter and find; prints seconds until the rows are shown and the longest wait."""
    from kingpost.core.ingest import LoadOptions, load
    from kingpost.tui import terminal
    from kingpost.tui.app import KingpostApp

    looks = terminal.decide({"LANG": "C.UTF-8"})
    app = KingpostApp(
        [str(path)],
        lambda job: load([str(path)], LoadOptions(), job.watch),
        "surfer",
        None,
        looks=looks,
    )
    async with app.run_test(size=(120, 40)):

        def idle() -> bool:
            return not any(app.runner.jobs(lane) for lane in ("load", "solve", "table", "find"))

        await timed(lambda: app.standings_shown is not None and idle())
        print(f"{app.sitting.graph.n:,} rows", flush=True)
        wishes: list[tuple[str, dict[str, object]]] = [
            ("sort by in-degree", {"sort": "in", "turned": False}),
            ("sort by name", {"sort": "node", "turned": False}),
            ("filter by ranks and degrees", {"where": "rank > 1000 and in_degree > 2"}),
            ("filter by a part of names", {"where": "node like '%99%'"}),
            ("no filter, by rank", {"where": "", "sort": "rank"}),
        ]
        for name, wanted in wishes:
            app.desk.arrange(**wanted)
            seconds, worst = await timed(idle)
            print(f"{name:32} {seconds:6.2f} s   longest wait {1000 * worst:5.1f} ms", flush=True)
        app.standings.find("4999")
        seconds, worst = await timed(idle)
        print(f"{'find a part of names':32} {seconds:6.2f} s   longest wait {1000 * worst:5.1f} ms")


def load_now() -> str:
    """How busy the machine is."""
    return f"load average {os.getloadavg()[0]:.1f} on {os.cpu_count()} cores"


def main() -> None:
    """Measure all three and print them."""
    parser = argparse.ArgumentParser(description="What the screen costs.")
    parser.add_argument("--rows", type=int, default=5_000_000)
    parser.add_argument("--runs", type=int, default=10)
    parser.add_argument("--keep", type=Path, help="folder that keeps the tables made")
    asked = parser.parse_args()
    folder = asked.keep or Path(tempfile.mkdtemp(prefix="kingpost-bench-"))
    folder.mkdir(parents=True, exist_ok=True)
    print(load_now())
    million = table(folder / "ferries_1m.parquet", 1_000_000)
    times = first_frames(million, asked.runs)
    print(
        f"first frame: median {statistics.median(times):.3f} s of {asked.runs}, "
        f"{min(times):.3f} to {max(times):.3f}",
        flush=True,
    )
    still, scrolling = bytes_of_a_key(million)
    print(f"bytes a key: {still:.0f} without scrolling, {scrolling:.0f} over {DOWNS} downs")
    print(load_now(), flush=True)
    asyncio.run(over_many_rows(table(folder / f"ferries_{asked.rows}.parquet", asked.rows)))


if __name__ == "__main__":
    main()
