"""How long the screen keeps a key waiting while rows are sorted, filtered and found.

    python tests/bench/screen_lag.py EDGES.parquet

Opens the table without a terminal, then asks for each and prints the seconds until the rows are
there and the longest time for which the event loop did not get a turn meanwhile.
"""

from __future__ import annotations

import asyncio
import sys
import time
from collections.abc import Callable

from kingpost.core.ingest import LoadOptions, load
from kingpost.tui import terminal
from kingpost.tui.app import KingpostApp

TICK = 0.002


async def timed(condition: Callable[[], bool]) -> tuple[float, float]:
    """Seconds until a condition holds, and the longest turn the loop had to wait for."""
    start = last = time.perf_counter()
    worst = 0.0
    while not condition():
        await asyncio.sleep(TICK)
        now = time.perf_counter()
        worst, last = max(worst, now - last - TICK), now
    return time.perf_counter() - start, worst


async def main(path: str) -> None:
    looks = terminal.decide({"LANG": "C.UTF-8"})
    app = KingpostApp(
        [path], lambda job: load([path], LoadOptions(), job.watch), "surfer", None, looks=looks
    )
    async with app.run_test(size=(120, 40)):

        def idle() -> bool:
            return not any(app.runner.jobs(lane) for lane in ("load", "solve", "table", "find"))

        await timed(lambda: app.standings_shown is not None and idle())
        print(f"{app.sitting.graph.n:,} nodes, {app.sitting.graph.m:,} edges")
        wishes = [
            ("sort by in-degree", {"sort": "in", "turned": False}),
            ("sort by name", {"sort": "node", "turned": False}),
            ("filter by ranks and degrees", {"where": "rank > 1000 and in_degree > 20"}),
            ("filter by a part of names", {"where": "node::text like '%99%'"}),
            ("no filter", {"where": "", "sort": "rank"}),
        ]
        for name, wanted in wishes:
            app.desk.arrange(**wanted)
            seconds, worst = await timed(idle)
            print(f"{name:32} {seconds:6.2f} s   longest wait {1000 * worst:5.1f} ms")
        app.standings.find("4999")
        seconds, worst = await timed(idle)
        print(f"{'find a part of names':32} {seconds:6.2f} s   longest wait {1000 * worst:5.1f} ms")


if __name__ == "__main__":
    asyncio.run(main(sys.argv[1]))
