"""Any action by name: all of the registry is in the list, and what is taken is done."""

from __future__ import annotations

import pytest

from kingpost.tui import actions, rooms
from kingpost.tui.models.doing import deeds, narrowed
from tests.tui.test_journeys import Kingpost, opened, until


def test_every_action_is_listed_but_the_list_itself():
    listed = deeds(rooms.STANDINGS, lambda _: True, {})
    told = {deed.action.id for deed in listed}
    own = {a.id for a in actions.ACTIONS if a.views == (rooms.DOING,)} | {"do.anything"}
    elsewhere = {
        a.id for a in actions.ACTIONS if a.group == "Moving" and rooms.STANDINGS not in a.views
    }
    assert told == {a.id for a in actions.ACTIONS} - own - elsewhere


def test_what_is_possible_comes_first_and_the_rest_says_where():
    listed = deeds(rooms.STANDINGS, lambda name: name == "rows.sort", {})
    assert listed[0].action.id == "rows.sort"
    assert not listed[0].where
    back = next(deed for deed in listed if deed.action.id == "walk.back")
    assert back.where == "in Node"


def test_every_view_has_a_name():
    assert set(rooms.VIEW_WORDS) == {view for a in actions.ACTIONS for view in a.views}


@pytest.mark.parametrize(
    ("text", "first"), [("sort", "rows.sort"), ("SHORT", "shortlist.open"), ("sql", "rows.filter")]
)
def test_a_few_letters_find_it(text, first):
    listed = deeds(rooms.STANDINGS, lambda _: True, {})
    assert narrowed(listed, text)[0].action.id == first
    assert narrowed(listed, "no such thing at all") == []


async def test_what_is_taken_is_done(graph, bench):
    app = Kingpost(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("g")
        await until(pilot, lambda: "any action" in app.shown())
        await pilot.press(*"mark", "enter")
        await until(pilot, lambda: "marked gate" in app.shown())
        await pilot.press("g", *"walk back", "enter")
        await until(pilot, lambda: "not here: in Node" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


@pytest.mark.parametrize("size", [(40, 10), (20, 5)])
async def test_it_fits_any_terminal(graph, bench, size):
    app = Kingpost(graph, bench)
    async with app.run_test(size=size) as pilot:
        await opened(pilot)
        await pilot.press("g", *"sort", "enter")
        await until(pilot, lambda: app.screen.view == "choice")
