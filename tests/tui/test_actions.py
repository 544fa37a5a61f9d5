"""The registry of actions holds together, and the views do what it says."""

from __future__ import annotations

import importlib
import inspect

import pytest

from kingpost.tui import actions, keymaps, rooms
from kingpost.tui.app import _VIEWS, KingpostApp
from kingpost.tui.views.base import View

VIEWS = ("loading", *_VIEWS)


def view_classes():
    for name in VIEWS:
        module = importlib.import_module(f"kingpost.tui.views.{name}")
        for _, found in inspect.getmembers(module, inspect.isclass):
            if issubclass(found, View) and found.view and found.__module__ == module.__name__:
                yield found


def test_ids_are_unique():
    assert len(actions.BY_ID) == len(actions.ACTIONS)


@pytest.mark.parametrize("found", list(view_classes()), ids=lambda found: found.__name__)
def test_every_action_of_a_view_can_be_done(found):
    missing = [
        action.id
        for action in actions.ACTIONS
        if found.view in action.views
        and not hasattr(found, "do_" + action.id.replace(".", "_"))
        and not any(
            hasattr(one, "do_" + action.id.replace(".", "_"))
            for one in (KingpostApp, *KingpostApp.HELPERS)
        )
    ]
    assert missing == []


@pytest.mark.parametrize("found", list(view_classes()), ids=lambda found: found.__name__)
def test_no_key_means_two_things_in_one_view(found):
    keys = [key for a in actions.ACTIONS if found.view in a.views for key in a.keys]
    assert len(keys) == len(set(keys))


def test_only_plain_keys_are_used():
    allowed = {"up", "down", "left", "right", "enter", "escape", "tab", "slash", "question_mark"}
    extra = {"pageup", "pagedown", "home", "end"}  # each has a letter beside it
    for action in actions.ACTIONS:
        if action.id == "quit.now" or not action.keys:  # in a sheet and among all actions
            continue
        assert all(len(key) == 1 or key in allowed | extra for key in action.keys), action.id
        assert any(len(key) == 1 or key in allowed for key in action.keys), action.id


def test_letters_are_not_taken_where_text_is_typed():
    for view in (rooms.FORM, rooms.PROMPT):
        assert not [key for key in keymaps.keymap(view) if len(key) == 1]


def test_help_lists_every_action():
    assert len(keymaps.help_rows()) == len(actions.ACTIONS)


def test_keys_can_be_rebound():
    keymap = keymaps.keymap(rooms.STANDINGS, {"rows.sort": ("z",)})
    assert keymap["z"] == "rows.sort"
    assert "s" not in keymap


def test_the_key_line_names_what_is_possible():
    line = keymaps.key_line(rooms.STANDINGS, ["node.open", "rows.sort"])
    assert line == [("Enter", "node"), ("s", "sort")]
