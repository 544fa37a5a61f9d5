"""The user's config.toml: what it can say, and one sentence with the line where it is wrong."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.tui import actions, config, keymaps, places, rooms
from kingpost.tui.config import Config, parse
from tests.tui.test_journeys import Kingpost, opened, until

PLACE = Path("config.toml")


def read(text):
    return parse(text.encode(), PLACE)


def test_no_file_is_no_configuration():
    assert config.read() == Config()


def test_keys_defaults_and_the_folder():
    found = read(
        '[keys]\n"rows.sort" = "Z"\n"mark.toggle" = ["X", "Enter"]\n"node.open" = "Tab"\n'
        '[screen]\nslow_link = true\nascii = true\ncolour = false\nbackground = "light"\n'
        'folder = "~/graphs"\n[open]\nmeasure = "katz"\n'
    )
    assert found.trouble == ""
    assert found.keys == {
        "rows.sort": ("Z",),
        "mark.toggle": ("X", "enter"),
        "node.open": ("tab",),
    }
    assert (found.slow_link, found.ascii, found.colour) == (True, True, False)
    assert (found.background, found.folder, found.measure) == ("light", "~/graphs", "katz")


@pytest.mark.parametrize(
    ("text", "line", "words"),
    [
        ('[keys]\n"rows.sort" = "Z', 2, "is no TOML"),
        ("[keys]\n\n[keys]\n", 3, "is no TOML"),
        ('# a\n[colours]\nred = "blue"\n', 2, "[colours] is none of [keys], [screen], [open]"),
        ("keys = 3\n", 1, "keys is no table"),
        ('[keys]\n# b\n"rows.sorted" = "Z"\n', 3, "did you mean 'rows.sort'?"),
        ('[keys]\n"rows.sort" = "ctrl+s"\n', 2, "'ctrl+s' is no key"),
        ('[keys]\n"rows.sort" = "F5"\n', 2, "'F5' is no key"),
        ('[keys]\n"rows.sort" = "7"\n', 2, "'7' is no key"),
        ('[keys]\n"rows.sort" = 7\n', 2, "takes a key in quotes"),
        ('[keys]\n"rows.sort" = []\n', 2, "takes a key in quotes"),
        ('[keys]\nrows.sort = "Z"\n', 2, 'write the action id in quotes: "rows.sort"'),
        ('[keys]\n"step.back" = "Z"\n', 2, "keeps its key"),
        ('[keys]\n"rows.sort" = "Esc"\n', 2, "Esc would mean both"),
        ('[keys]\n"rows.sort" = "Z"\n"rows.filter" = "Z"\n', 3, "would mean both"),
        ('[keys]\n"form.solve" = "Z"\n', 2, "letters are typed"),
        ("[screen]\nslow_link = 1\n", 2, "slow_link takes true or false"),
        ("[screen]\nmouse = true\n", 2, "[screen] has no 'mouse'"),
        ('[screen]\nbackground = "blue"\n', 2, 'background takes "light" or "dark"'),
        ('[open]\nmeasure = "best"\n', 2, "measure is none of surfer"),
    ],
)
def test_what_is_wrong_is_one_sentence_with_its_line(text, line, words):
    found = read(text)
    assert f"config.toml line {line}: " in found.trouble
    assert words in found.trouble
    assert "the defaults are used" in found.trouble
    assert found == Config(trouble=found.trouble)


def test_text_that_is_no_utf8_tells_its_line():
    assert "line 2: is not text in UTF-8" in parse(b'[keys]\n"\xff" = 1\n', PLACE).trouble


@given(st.binary(max_size=120))
def test_no_bytes_stop_the_program(data):
    found = parse(data, PLACE)
    assert "\n" not in found.trouble


@given(st.text(alphabet='[]keyscrn=".\n trueu1', max_size=60))
def test_no_text_stops_the_program(text):
    assert "\x1b" not in read(text).trouble


def test_a_key_given_away_is_no_longer_its_former_owners():
    bound = {"rows.sort": ("f",)}
    assert keymaps.keymap(rooms.STANDINGS, bound)["f"] == "rows.sort"
    assert keymaps.keys_in(rooms.STANDINGS, actions.BY_ID["rows.filter"], bound) == ()
    line = keymaps.key_line(rooms.STANDINGS, ["rows.sort", "rows.filter"], bound)
    assert line == [("f", "sort")]


async def test_the_screen_goes_by_it(graph, bench):
    app = Kingpost(graph, bench)
    app.config = read('[keys]\n"rows.sort" = "Z"\n')
    async with app.run_test(size=(100, 30)) as pilot:
        await opened(pilot)
        assert "Z sort" in app.shown()
        await pilot.press("s")
        assert app.screen.view == "standings"
        await pilot.press("Z")
        await until(pilot, lambda: "sort by" in app.shown())
        await pilot.press("escape", "question_mark")
        await until(pilot, lambda: app.screen.view == "help")
        await until(pilot, lambda: any(x.startswith("▸") for x in app.shown().splitlines()))
        rows = app.screen.table.source.rows
        assert ("Looking", "Z") in [row[:2] for row in rows]


async def test_trouble_is_said_on_the_first_view(graph, bench):
    app = Kingpost(graph, bench)
    app._trouble = read("[keys]\nx").trouble
    async with app.run_test(size=(100, 30)) as pilot:
        await opened(pilot)
        assert "config.toml line 2: is no TOML" in app.shown()


def test_the_file_is_where_the_system_says(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    assert places.config_file() == tmp_path / "kingpost" / "config.toml"
    places.config_file().parent.mkdir()
    places.config_file().write_text('[open]\nmeasure = "katz"\n')
    assert config.read().measure == "katz"
