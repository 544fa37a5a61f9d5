"""From Start to a table and back, through the whole application without a terminal."""

from __future__ import annotations

import threading

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.tui import terminal
from kingpost.tui.app import KingpostApp
from kingpost.tui.models import recent
from kingpost.tui.opening import ASK
from tests.tui.test_journeys import Kingpost, opened, until


class Started(KingpostApp):
    """The application as it is started without a table."""

    def __init__(self):
        looks = terminal.decide({"LANG": "C.UTF-8"})
        super().__init__([], None, "degree", None, kept=ASK, store=False, looks=looks)

    shown = Kingpost.shown


@pytest.fixture
def folder(tmp_path, monkeypatch):
    place = tmp_path / "graphs"
    (place / "older").mkdir(parents=True)
    table = pa.table({"caller": ["a", "b", "c"], "callee": ["b", "c", "a"]})
    pq.write_table(table, place / "calls.parquet")
    moves = {"p": ["a", "b"], "q": ["b", "c"], "r": ["c", "a"]}
    pq.write_table(pa.table(moves), place / "moves.parquet")
    (place / "wrong.parquet").write_bytes(b"PAR1 nothing else")
    monkeypatch.chdir(place)
    return place


async def started(pilot):
    app = pilot.app
    await until(pilot, lambda: app.screen.view == "start" and "calls.parquet" in app.shown())
    await until(pilot, lambda: "nothing was opened yet" in app.shown())
    await pilot.pause()  # for the layout that this has changed


async def test_a_table_is_chosen_and_offered_the_next_time(folder):
    app = Started()
    async with app.run_test(size=(80, 24)) as pilot:
        await started(pilot)
        assert "nothing was opened yet" in app.shown()
        assert "older/" in app.shown()
        await pilot.press("down", "enter")
        await opened(pilot)
        assert "calls.parquet   3 nodes" in app.shown()
        await until(pilot, lambda: not app.runner.jobs("noting"))
        await pilot.press("x", "S")
        await until(pilot, lambda: app.screen.view == "start" and "3 nodes" in app.shown())
        assert "this sitting is kept" in app.shown()
        assert "today" in app.shown()
        await pilot.press("enter")
        await until(pilot, lambda: "take it up" in app.shown())
        await pilot.press("enter")
        await opened(pilot)
        assert "★" in app.shown()
        await pilot.press("S")
        await until(pilot, lambda: app.screen.view == "start")
        (folder / "calls.parquet").unlink()
        await pilot.press("escape")
        app.screen.look_again()
        await until(pilot, lambda: "no longer there" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "it is no longer there: " in app.shown())


async def test_start_is_told_of_a_table_that_is_noted_after_it_opened(folder, monkeypatch):
    back = threading.Event()

    def note(*about, before=recent.note):
        assert back.wait(30)
        before(*about)

    monkeypatch.setattr(recent, "note", note)
    app = Started()
    async with app.run_test(size=(80, 24)) as pilot:
        await started(pilot)
        await pilot.press("down", "enter")
        await opened(pilot)
        await pilot.press("S")
        await until(pilot, lambda: app.screen.view == "start" and not app.runner.jobs("recent"))
        assert "nothing was opened yet" in app.shown()
        back.set()
        await until(pilot, lambda: "opened lately" in app.shown() and "3 nodes" in app.shown())


async def test_what_cannot_be_read_comes_back_to_start_with_its_sentence(folder):
    app = Started()
    async with app.run_test(size=(100, 24)) as pilot:
        await started(pilot)
        await pilot.press("slash", *"wrong")
        await until(pilot, lambda: app.screen_stack[0].files.count == 1)
        await pilot.press("enter")
        await until(pilot, lambda: "nothing was opened" in app.shown())
        assert "wrong.parquet is a truncated or damaged Parquet file" in " ".join(
            app.shown().replace("\n", "").split()
        )
        await pilot.press("escape")
        await pilot.press("slash", *["backspace"] * 5, *"gone/x.parquet", "enter")
        await until(pilot, lambda: "there is no file" in app.shown())
        await pilot.press("enter")
        await pilot.press("slash", *"older/", "enter")
        await until(pilot, lambda: "graphs/older" in app.shown())
        await pilot.press("left")
        await until(pilot, lambda: "calls.parquet" in app.shown())
        assert "▸older/" in app.shown()


async def test_unclear_columns_are_asked_about(folder):
    app = Started()
    async with app.run_test(size=(100, 24)) as pilot:
        await started(pilot)
        await pilot.press("slash", *"moves", "enter")
        await until(pilot, lambda: "say which column an edge starts at" in app.shown())
        assert "2 rows  3 columns" in app.shown()
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "start")
        assert "it is not clear which columns" in app.shown()
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "roles")
        await pilot.press("right", "down", "tab")
        await until(pilot, lambda: "Enter read it" in app.shown())
        await pilot.press("enter")
        await opened(pilot)
        assert "along p -> q" in app.shown()


async def test_columns_can_be_chosen_where_they_are_clear(folder):
    app = Started()
    async with app.run_test(size=(100, 24)) as pilot:
        await started(pilot)
        await pilot.press("slash", *"calls", "escape")
        await until(pilot, lambda: app.screen.view == "start" and "moves" in app.shown())
        await pilot.press("down", "c")
        await until(pilot, lambda: "caller -> callee, no weights" in app.shown())
        await pilot.press("e", "up", "right")
        await until(pilot, lambda: "caller -- callee" in app.shown())
        await pilot.press("enter")
        await opened(pilot)
        assert "undirected" in app.shown()


async def test_reading_is_given_up(folder, bench):
    app = Started()

    def load(job):
        job.watch.report("reading rows", 10, 100, "rows")
        while True:
            job.watch.check()
            bench.release.wait(0.005)

    async with app.run_test(size=(80, 24)) as pilot:
        await started(pilot)
        app.opener.open([str(folder / "calls.parquet")])
        app.opener._load_given = load
        await until(pilot, lambda: "reading rows" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "start" and "cancelled" in app.shown())
        assert app._exit is False


@pytest.mark.parametrize("size", [(40, 10), (20, 5), (120, 40)])
async def test_start_and_the_columns_fit_any_terminal(folder, size):
    app = Started()
    async with app.run_test(size=size) as pilot:
        await until(pilot, lambda: app.screen.view == "start" and not app.runner.jobs("folder"))
        app.opener.open([str(folder / "moves.parquet")])
        await until(pilot, lambda: app.screen.view == "roles")
        await until(pilot, lambda: "▸" in app.shown())
        assert len(app.shown().splitlines()) <= size[1]
        for width in (30, 120, 10, 80):
            await pilot.resize_terminal(width, 12)
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "start")
