"""What goes wrong is a sentence on a usable terminal, in a real pseudo-terminal."""

from __future__ import annotations

import re

FULL_DISK = """
import os
def full(*_):
    raise OSError(28, "No space left on device")
os.fsync = full
"""
CRASH = """
import kingpost.tui.views.standings as standings
def crash(self):
    secret = "row of somebody's table"
    raise RuntimeError("made on purpose")
standings.StandingsView._rested = crash
"""
BROKEN_KEY = """
import kingpost.tui.views.standings as standings
def broken(self):
    raise ValueError("made on purpose")
standings.StandingsView.do_rows_sort = broken
"""
BROKEN_SOLVER = """
import dataclasses
from kingpost.core.measures import measure
import kingpost.core.measures.katz as katz
def broken(graph, settings, watch):
    raise ArithmeticError("made on purpose")
    yield
katz.MEASURE = dataclasses.replace(katz.MEASURE, solver=broken)
"""


def test_a_crash_leaves_the_terminal_usable_and_says_where_the_log_is(terminal, calls, tmp_path):
    run = terminal(calls, code=CRASH)
    run.shows("? all keys")
    run.press("x")
    run.shows("marked berth-007")
    run.press("down")
    assert run.ends() == 70
    assert all(run.left_clean().values()), run.left_clean()
    said = " ".join(run.text.split())
    assert "a fault of the program ended the screen (RuntimeError)" in said
    place = re.search(r"please report (\S+\.log)", run.text.replace("\n", ""))[1]
    assert place.startswith(str(tmp_path / "state"))
    with open(place) as log:
        told = log.read()
    assert "made on purpose" in told
    assert "somebody" not in told.replace('secret = "row of', "")  # no values of variables
    assert "Traceback" not in run.text
    # And the marks were put away on the way out.
    run = terminal(calls)
    run.shows("1 mark")


def test_a_broken_action_is_a_sentence_and_the_screen_goes_on(terminal, calls):
    run = terminal(calls, code=BROKEN_KEY, size=(120, 30))
    run.shows("? all keys")
    run.press("s")
    run.shows("rows.sort failed: ValueError: made on purpose; details are in")
    run.press("enter")
    run.shows("gives to it")
    run.press("q")
    assert run.ends() == 0


def test_a_broken_solver_is_a_sentence_and_the_others_stay(terminal, calls):
    run = terminal(calls, code=BROKEN_SOLVER)
    run.shows("? all keys", "order proven to")
    run.press("m")
    run.shows("K katz")
    run.press("down", "down", "enter")
    run.shows("the solve failed", "made on purpose")
    run.press("escape")
    run.shows("s sort")
    run.press("q")
    assert run.ends() == 0


def test_a_full_disk_is_said_on_the_screen_and_after_it(terminal, calls):
    run = terminal(calls, "--no-store", code=FULL_DISK)
    run.shows("? all keys", "order proven to")
    run.press("x")
    run.shows("nothing can be kept (No space left on device)", "★")
    run.press("down", "q")
    assert run.ends() == 0
    assert all(run.left_clean().values()), run.left_clean()
    assert "the marks are lost: nothing can be kept (No space left on device)" in run.text


def test_a_megabyte_pasted_is_a_sentence_with_or_without_a_line_to_paste_into(terminal, calls):
    run = terminal(calls)
    run.shows("? all keys", "order proven to")
    run.paste("q" * 1_000_000)
    run.shows("nothing takes text here")
    run.press("/")
    run.shows("Enter go")
    run.paste("xy\n\t" * 250_000)
    run.shows("only the first 1,000 characters are taken")
    run.press("escape")
    run.shows("Enter node")
    run.press("q")
    assert run.ends() == 0


def test_a_wrong_configuration_is_said_and_the_defaults_hold(terminal, calls, tmp_path):
    file = tmp_path / "config" / "kingpost" / "config.toml"
    file.parent.mkdir(parents=True)
    file.write_text('[keys]\n"rows.sort" = "ctrl+s"\n')
    run = terminal(calls, size=(120, 30))
    run.shows("config.toml line 2: rows.sort: 'ctrl+s' is no key", "s sort")
    run.press("q")
    assert run.ends() == 0


def test_a_small_terminal_and_a_storm_of_sizes_in_every_view_of_keeping(terminal, calls):
    run = terminal(calls, size=(40, 10))
    run.shows("berth-0", "? all keys")
    run.press("x", "o")
    run.shows("berth-007", "1 node marked")
    for size in [(120, 40), (20, 5), (81, 25), (39, 9), (80, 24)] * 3:
        run.resize(*size)
    run.shows("1 node marked", "Esc back")
    run.press("escape", "g")
    run.shows("any action")
    for size in [(120, 40), (20, 5), (81, 25), (39, 9), (80, 24)] * 3:
        run.resize(*size)
    run.shows("any action", "Enter do it")
    run.press("escape")
    run.shows("s sort")
    run.press("q")
    assert run.ends() == 0
