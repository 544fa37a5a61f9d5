"""Leaving and coming back, through the whole application without a terminal."""

from __future__ import annotations

import asyncio

import pytest

from kingpost.tui.models import resumption
from kingpost.tui.opening import ASK, TAKE
from tests.tui.test_journeys import Kingpost, opened, until

PATHS = ["ferry.parquet"]


def again(graph, bench, how=ASK):
    app = Kingpost(graph, bench)
    app.opener._how = how
    return app


async def left(graph, bench, *keys):
    """A sitting in which keys are pressed, each when the one before has had its effect."""
    app = again(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        for key in keys:
            if key == "by name":
                await pilot.press("s")
                await until(pilot, lambda: app.screen.view == "choice" and app.screen.composed)
                await pilot.press("down", "enter")
                await until(pilot, lambda: app.standings.model.arrangement.sort == "node")
            else:
                await pilot.press(key)
        if keys[-1:] == ("enter",):
            await until(pilot, lambda: app.screen.view == "node")
        await pilot.pause()
        app.leave(129)
        await until(pilot, lambda: app._exit)
    return app


async def test_a_sitting_is_offered_and_taken_up(graph, bench):
    await left(graph, bench, "x", "down", "down", "by name", "enter")
    kept = resumption.read(PATHS)
    assert (kept.view, kept.wanted["sort"], kept.marks) == ("node", "node", 1)
    app = again(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: "take it up" in app.shown())
        await until(pilot, lambda: "a sitting of today" in app.shown())
        await until(pilot, lambda: "sorted by node" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "node")
        assert f"▼ {kept.trail[-1]}" in app.shown()
        await pilot.press("escape")
        await until(pilot, lambda: "node  " in app.shown() and app.screen.view == "standings")
        assert app.screen.model.arrangement.sort == "node"
        assert app.screen.model.graph.label(app.screen.model.node) == kept.cursor


async def test_a_measure_its_settings_and_the_filter_come_back(graph, bench):
    app = again(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("c", "down", *["backspace"] * 3, *"0.25", "enter")
        await until(pilot, lambda: "pull 0.25" in app.shown() and not app.runner.jobs("solve"))
        # A condition on another measure: there is no such column until that one is solved again.
        app.desk.arrange(where="mirror_rank <= 3")
        await until(pilot, lambda: app.screen.model.arrangement.where == "mirror_rank <= 3")
        rows = app.screen.model.count
        assert 0 < rows < graph.n
        app.leave(143)
        await until(pilot, lambda: app._exit)
    app = again(graph, bench, TAKE)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await until(pilot, lambda: app.screen.model.arrangement.where == "mirror_rank <= 3")
        assert app.screen.model.count == rows
        assert "pull 0.25" in app.shown()


async def test_going_afresh_leaves_the_marks(graph, bench):
    await left(graph, bench, "x", "down", "by name")
    app = again(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: "begin afresh" in app.shown())
        await pilot.press("F")
        await opened(pilot)
        assert app.screen.model.arrangement.sort == "rank"
        assert app.screen.model.cursor == 0
        assert "★" in app.shown()


async def test_nothing_is_offered_after_a_sitting_in_which_nothing_was_done(graph, bench):
    await left(graph, bench)
    assert resumption.read(PATHS) is None
    app = again(graph, bench, TAKE)
    async with app.run_test(size=(100, 24)) as pilot:
        await opened(pilot)
        assert "no sitting over these tables was kept" in app.shown()


async def test_a_changed_table_takes_up_what_still_fits(graph, make_graph, bench):
    await left(graph, bench, "down", "down", "enter")
    smaller = make_graph(["fare", "gate", "lamp"], [(0, 1, 1.0), (2, 1, 4.0)])
    app = again(smaller, bench)
    async with app.run_test(size=(100, 24)) as pilot:
        await until(pilot, lambda: "take it up" in app.shown())
        await pilot.press("enter")
        await opened(pilot)
        await until(pilot, lambda: "took up the sitting" in app.shown())
        assert "without the node berth" in app.shown()
        assert app.screen.view == "standings"


@pytest.mark.parametrize("content", [b"{}", b"\x00", b'{"format": 1, "wanted": {"sort": 3}}'])
async def test_a_damaged_sitting_never_keeps_one_from_the_standings(graph, bench, content):
    file = resumption.file_of(PATHS)
    file.parent.mkdir(parents=True)
    file.write_bytes(content)
    app = again(graph, bench)
    async with app.run_test(size=(100, 24)) as pilot:
        async with asyncio.timeout(30):
            while app.screen.view != "standings":
                if app.opener.can_sitting_resume():
                    await pilot.press("enter")
                await pilot.pause()
        await opened(pilot)
        assert "gate" in app.shown()


async def test_a_sitting_that_cannot_be_kept_is_said_on_leaving(
    graph, bench, tmp_path, monkeypatch
):
    wall = tmp_path / "wall"
    wall.write_text("no folder")
    monkeypatch.setenv("XDG_STATE_HOME", str(wall))
    app = await left(graph, bench, "down", "by name")
    assert app.sentence.startswith("the sitting is not kept: nothing can be kept")
