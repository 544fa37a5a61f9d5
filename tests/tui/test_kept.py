"""The screen over a graph and results that are kept: the second sitting begins with answers."""

from __future__ import annotations

import asyncio
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from keeping import EDGES

from kingpost.core.open import open_graph
from kingpost.core.store.shelf import Shelf
from kingpost.tui import terminal
from kingpost.tui.app import KingpostApp


async def sitting_over(path: Path) -> tuple[str, dict[str, str | None]]:
    """What the screen shows once all measures in company are solved, and when each was solved."""
    looks = terminal.decide({"LANG": "C.UTF-8"})
    app = KingpostApp(
        [str(path)],
        lambda job: open_graph(path, watch=job.watch, tell=pytest.fail),
        "surfer",
        None,
        looks=looks,
    )
    async with app.run_test(size=(120, 30)) as pilot:
        async with asyncio.timeout(60):
            while app._desk is None or len(app.sitting.results) < 3 or app.runner.jobs("solve"):
                await pilot.pause()
            while app.runner.jobs("table"):
                await pilot.pause()
        await pilot.pause()
        strips = app.screen._compositor.render_strips()
        text = "\n".join("".join(s.text for s in strip).rstrip() for strip in strips)
        return text, {name: found.solved_on for name, found in app.sitting.results.items()}


async def test_the_second_sitting_says_that_its_answers_were_kept(tmp_path: Path) -> None:
    path = tmp_path / "calls.parquet"
    pq.write_table(pa.table(EDGES), path)
    first, solved = await sitting_over(path)
    assert "from the store" not in first
    assert set(solved.values()) == {None}
    assert len([entry for entry in Shelf().entries() if entry.kind == "result"]) >= 3
    second, kept = await sitting_over(path)
    assert f"from the store, solved on {kept['surfer'][:10]}; order proven" in second
    assert {name for name, since in kept.items() if since} >= {"surfer", "katz", "degree"}
    rows = [line for line in first.splitlines() if "\u2503" in line]
    assert rows
    assert rows == [line for line in second.splitlines() if "\u2503" in line]
