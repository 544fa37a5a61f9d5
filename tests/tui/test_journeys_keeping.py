"""Journeys with marks, notes and copying, through the whole application without a terminal."""

from __future__ import annotations

import base64
import csv
import json

import pytest

from kingpost.tui.models import marks as model
from tests.tui.test_journeys import Kingpost, opened, until


@pytest.fixture
def app(graph, bench):
    return Kingpost(graph, bench)


def kept():
    return json.loads(model.marks_file(["ferry.parquet"]).read_text())["marks"]


async def test_marking_noting_and_leaving_keeps_both_for_the_next_sitting(graph, bench):
    app = Kingpost(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("x")
        await until(pilot, lambda: "marked gate; 1 on the shortlist" in app.shown())
        assert "gate  ★" in app.shown()
        await pilot.press("down", "i", *"too few", "enter")
        await until(pilot, lambda: "noted on fare" in app.shown())
        await pilot.press("q")
        await until(pilot, lambda: app._exit)
    assert [(mark["node"], mark["note"]) for mark in kept()] == [("gate", ""), ("fare", "too few")]

    again = Kingpost(graph, bench)
    async with again.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        assert again.shown().count("★") == 2
        await pilot.press("o")
        await until(pilot, lambda: "2 nodes marked" in again.shown())
        assert "too few" in again.shown()


async def test_the_shortlist_takes_off_and_puts_back_and_jumps(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("x", "down", "down", "x", "t", "o")
        await until(pilot, lambda: "2 nodes marked" in app.shown())
        await pilot.press("x")
        await until(pilot, lambda: "1 node marked" in app.shown())
        assert "taken off; x puts it back" in app.shown()
        await pilot.press("x")
        await until(pilot, lambda: "2 nodes marked" in app.shown())
        await pilot.press("down", "j")
        await until(pilot, lambda: app.screen.view == "standings")
        assert app.screen.model.graph.label(app.screen.model.node) == "berth"


async def test_node_marks_its_centre_and_shows_the_note(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("enter", "i", *"look", "enter")
        await until(pilot, lambda: "▼ gate ★ look" in app.shown())
        await pilot.press("x")
        await until(pilot, lambda: "★" not in app.shown())


async def test_an_empty_shortlist_says_what_to_do(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("o")
        await until(pilot, lambda: "no node is marked yet" in app.shown())
        assert "w write" not in app.shown()
        await pilot.press("x", "i", "w", "j", "enter", "escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_the_shortlist_is_written_and_never_over_a_file_unasked(app, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("x", "o", "w", "enter")
        await until(pilot, lambda: "wrote 1 row to hand_made_shortlist.csv" in app.shown())
        target = tmp_path / "hand_made_shortlist.csv"
        rows = list(csv.reader(target.read_text().splitlines()))
        assert rows == [["node", "note", "rank_plain", "rank_mirror"], ["gate", "", "1", "6"]]
        target.write_text("mine")
        await pilot.press("w", "enter")
        await until(pilot, lambda: "hand_made_shortlist.csv exists" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "shortlist")
        assert target.read_text() == "mine"
        await pilot.press("w", "enter")
        await until(pilot, lambda: "exists" in app.shown())
        await pilot.press("down", "enter")
        await until(pilot, lambda: target.read_text() != "mine")
        await pilot.press("w", *["backspace"] * 23, *"nowhere/x.csv", "enter")
        await until(pilot, lambda: "there is no folder nowhere" in app.shown())


async def test_marks_that_cannot_be_kept_are_said_and_said_again_on_leaving(
    app, tmp_path, monkeypatch
):
    wall = tmp_path / "wall"
    wall.write_text("no folder")
    monkeypatch.setenv("XDG_STATE_HOME", str(wall))
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("x")
        await until(pilot, lambda: "nothing can be kept (Not a directory)" in app.shown())
        assert "gate  ★" in app.shown()
        await pilot.press("q")
        await until(pilot, lambda: app._exit)
    assert app.sentence.startswith("the marks are lost: ")


async def test_copying_sends_the_name_then_the_row(app):
    sent = []
    app.send = sent.append
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("C")
        await until(pilot, lambda: "the name gate went to the terminal's clipboard" in app.shown())
        await pilot.press("C")
        await until(pilot, lambda: "the row of gate went to" in app.shown())
    texts = [base64.b64decode(s.split(";")[2].rstrip("\x07")).decode() for s in sent]
    assert texts[0] == "gate"
    assert texts[1].split("\t")[:3] == ["1", "gate", "6.00"]
