"""Journeys through what can be asked, through the whole application without a terminal."""

from __future__ import annotations

import threading

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.tui import terminal
from kingpost.tui.app import KingpostApp
from tests.tui.test_journeys import Kingpost, opened, until


class Real(Kingpost):
    """The application over measures of the product."""

    def __init__(self, graph, measure="surfer"):
        looks = terminal.decide({"LANG": "C.UTF-8"})
        KingpostApp.__init__(self, ["f.parquet"], lambda job: graph, measure, None, looks=looks)

    def make_sitting(self, graph, measure):
        return KingpostApp.make_sitting(self, graph, measure)


@pytest.fixture
def app(graph):
    return Real(graph)


async def asked(pilot, words):
    """Open the sheet of questions and take the one called so."""
    app = pilot.app
    await pilot.press("A")
    await until(pilot, lambda: app.screen.view == "choice")
    names = [choice.name for choice in app.screen._choices.choices]
    await pilot.press(*["down"] * names.index(words), "enter")


async def test_agreement_leads_to_a_node_and_back(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "agreement")
        await until(pilot, lambda: "[nodes apart]" in app.shown())
        assert "agreement of surfer, eigenvector, katz, degree" in app.shown()
        assert "◆" in app.shown()
        await pilot.press("m", "t", "enter")
        await until(pilot, lambda: "surfer rank across, eigenvector down" in app.shown())
        await pilot.press("tab")
        await until(pilot, lambda: "tau-b, Spearman" in app.shown())
        await pilot.press("tab")
        await until(pilot, lambda: "placed apart" in app.shown())
        name = app.screen.page.listing.head[0].text(0)
        await pilot.press("enter")
        await until(pilot, lambda: f"▼ {name}" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "agreement")
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_agreement_of_one_measure_says_what_to_do(graph, bench):
    app = Kingpost(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        app.desk.sitting.results.pop("mirror")
        await asked(pilot, "agreement")
        await until(pilot, lambda: "no answer" in app.shown())
        assert "m chooses another measure" in app.shown()
        # The measure solved meanwhile is compared without being asked again.
        app.desk.solve("mirror", None)
        await until(pilot, lambda: "agreement of plain, mirror" in app.shown())


async def test_why_and_against_another(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "why")
        await until(pilot, lambda: "[terms]" in app.shown())
        assert "The terms sum to the score" in app.shown().replace("\n ", " ")
        await pilot.press("tab")
        await until(pilot, lambda: "[supply paths]" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        await asked(pilot, "against another")
        await until(pilot, lambda: app.screen.view == "prompt")
        await pilot.press(*"quay", "enter")
        await until(pilot, lambda: "against quay, surfer" in app.shown())
        assert "leads by" in app.shown()


async def test_the_palette_knows_the_questions(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("g", *"term by", "enter")
        await until(pilot, lambda: app.screen.view in ("why", "prompt"))


async def test_the_loss_of_a_node_is_tried_with_the_caution_in_sight(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "what if it were lost")
        await until(pilot, lambda: "[standings]" in app.shown())
        assert "surfer without " in app.shown()
        assert "Structure, not traffic engineering" in app.shown()
        assert "follow the local change procedure" in app.shown()
        await pilot.press("tab", "tab", "tab")
        await until(pilot, lambda: "[in words]" in app.shown() and "reachability" in app.shown())
        await pilot.resize_terminal(40, 10)
        await until(pilot, lambda: "Structure, not traffic engin" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        await asked(pilot, "losses one by one")
        await until(pilot, lambda: "without" in app.shown() and "rank" in app.shown())


async def test_ranks_along_the_damping(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "along a setting")
        await until(pilot, lambda: "along which setting of surfer" in app.shown())
        await pilot.press("e", "enter")
        await until(pilot, lambda: app.screen.view == "prompt")
        await pilot.press(*"damping=0.5:2:3", "enter")
        await until(pilot, lambda: "it takes a number" in app.shown())
        await pilot.press(*["backspace"] * 3, *"0.9:3", "enter")
        await until(pilot, lambda: "surfer along damping" in app.shown())
        await until(pilot, lambda: "3 values from 0.5 to 0.9" in app.shown())
        await pilot.press("tab", "tab")
        await until(pilot, lambda: "[leader changes]" in app.shown())


async def test_a_walk_from_the_node(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "walk from it")
        await until(pilot, lambda: "a walker from" in app.shown())
        await pilot.press("down", "enter")
        await until(pilot, lambda: "jumping with chance 0.15" in app.shown())
        await until(pilot, lambda: "mixed after" in app.shown())
        await pilot.press("tab")
        await until(pilot, lambda: "in the long run" in app.shown())


async def test_drift_against_a_table_in_the_same_folder(tmp_path):
    paths = []
    for name, target in (("before", "hub"), ("after", "spare")):
        table = pa.table({"source": ["a", "b", "c", "c"], "target": [target, target, "d", "e"]})
        paths.append(str(tmp_path / f"{name}.parquet"))
        pq.write_table(table, paths[-1])
    looks = terminal.decide({"LANG": "C.UTF-8"})
    app = KingpostApp([paths[0]], None, "degree", None, looks=looks, store=False)
    app.shown = lambda: Kingpost.shown(app)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "drift")
        await until(pilot, lambda: "after.parquet" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "which of the two is earlier" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "drift of degree from before.parquet" in app.shown())
        await pilot.press("tab", "tab", "tab")
        await until(pilot, lambda: "1 node gone" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "▼ hub" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "drift")
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        # A path written by hand that leads nowhere is asked for again.
        await asked(pilot, "drift")
        await until(pilot, lambda: "another table" in app.shown())
        await pilot.press("e", "enter")
        await until(pilot, lambda: app.screen.view == "prompt")
        await pilot.press(*"nowhere", "enter")
        await until(pilot, lambda: "there is no table at" in app.shown())


async def test_scores_among_peers_as_columns(app):
    async with app.run_test(size=(120, 40)) as pilot:
        await opened(pilot)
        await asked(pilot, "among peers")
        await until(pilot, lambda: "rescaled among peers by" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "in team" in app.shown())
        # They go along to another measure, and away when they are not wanted.
        app.desk.choose("katz")
        await until(pilot, lambda: app.screen.model.result.measure == "katz")
        assert "in team" in app.shown()
        await asked(pilot, "among peers")
        await pilot.press("e", "enter")
        await until(pilot, lambda: "in team" not in app.shown())


async def test_leaving_ends_the_work(app, monkeypatch):
    working, ended = threading.Event(), threading.Event()

    def held(graph, result, node, glyphs, watch):
        working.set()
        try:
            while True:
                watch.report("holding on", 1, 2, "parts")
                watch.check()
        finally:
            ended.set()

    monkeypatch.setattr("kingpost.tui.views.why.why_answer", held)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "why")
        await until(pilot, lambda: working.is_set() and "holding on 1 of 2 parts" in app.shown())
        assert "being worked out; Esc ends it" in app.shown()
        await pilot.press("escape")
        await until(pilot, lambda: ended.is_set() and not app.runner.jobs("answer:why"))
        assert app.screen.view == "standings"
        await pilot.pause()
        assert "holding on" not in app.shown()


async def test_nodes_of_an_answer_go_on_the_shortlist(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await asked(pilot, "agreement")
        await until(pilot, lambda: "placed apart" in app.shown())
        node = app.screen.node_at_hand()
        await pilot.press("x")
        await until(pilot, lambda: "1 on the shortlist" in app.shown() and "★" in app.shown())
        assert node in app.keeper.marks
        await pilot.press("o")
        await until(pilot, lambda: app.screen.view == "shortlist")
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "agreement")
