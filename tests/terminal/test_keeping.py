"""Marks, notes and sittings that outlive the connection, and Start, in a real pseudo-terminal."""

from __future__ import annotations

import base64
import re
import signal

import pyarrow as pa
import pyarrow.parquet as pq


def copied(run):
    """What the terminal was asked to copy."""
    found = re.findall(rb"\x1b\]52;c;([A-Za-z0-9+/=]*)\x07", bytes(run.raw))
    return [base64.b64decode(text).decode() for text in found]


def by_name(run):
    """Whether the table is sorted by the nodes' names."""
    return re.search(r"node +▴", run.text)


def test_a_dropped_connection_loses_nothing(terminal, calls):
    run = terminal(calls)
    run.shows("? all keys", "order proven to", "katz")
    run.press("x")
    run.shows("marked berth-007", "★")
    run.press("down", "i")
    run.shows("note on")
    run.press("carries the shortcuts", "enter")
    run.shows("noted on berth-008")
    run.press("s")
    run.shows("turns the order round")
    run.press("down", "enter")
    run.until(lambda: by_name(run), "the order by name")
    run.press("enter")
    run.shows("▼ berth-008 ★ carries the shortcuts")
    assert run.hang_up() == 128 + signal.SIGHUP

    run = terminal(calls)
    run.shows("a sitting of", "sorted by node", "at berth-008", "2 marks", "Enter take it up")
    run.press("enter")
    run.shows("▼ berth-008 ★ carries the shortcuts", "took up the sitting")
    run.press("escape")
    run.shows("s sort")
    run.until(lambda: by_name(run), "the order by name")
    run.press("o")
    run.shows("2 nodes marked", "carries the shortcuts")
    run.press("q")
    assert run.ends() == 0
    assert all(run.left_clean().values()), run.left_clean()


def test_fresh_and_resume_ask_nothing(terminal, calls):
    run = terminal(calls)
    run.shows("? all keys", "order proven to")
    run.press("down", "s")
    run.shows("turns the order round")
    run.press("down", "enter")
    run.until(lambda: by_name(run), "the order by name")
    run.process.terminate()
    assert run.ends() == 128 + signal.SIGTERM

    run = terminal(calls, "--resume")
    run.until(lambda: by_name(run), "the order by name")
    run.shows("took up the sitting")
    run.press("ctrl+c")
    run.ends()
    run = terminal(calls, "--fresh")
    run.shows("rank▴")
    run.press("q")
    assert run.ends() == 0
    run = terminal(calls, "--fresh", "--resume")
    assert run.ends() == 2
    assert "give one of them" in run.text


def test_a_name_is_copied_by_the_terminal_and_cannot_act(terminal, tmp_path):
    path = tmp_path / "names.parquet"
    pq.write_table(pa.table({"source": ["a", "b"], "target": ["x\x1b]2;y\x07\nrm"] * 2}), path)
    run = terminal(path)
    run.shows("x\\e]2;y\\x07\\nrm", "? all keys")
    run.press("C")
    run.shows("went to the terminal's clipboard")
    assert copied(run) == ["x\\e]2;y\\x07\\nrm"]
    run.press("C")
    run.until(lambda: len(copied(run)) == 2, "the whole row")
    assert copied(run)[1].split("\t")[1] == "x\\e]2;y\\x07\\nrm"
    run.press("q")
    assert run.ends() == 0


def test_start_offers_tables_and_what_was_opened(terminal, calls):
    run = terminal(cwd=calls.parent)
    run.shows("nothing was opened yet", "ferry_calls.parquet", "Enter open")
    run.press("/")
    run.shows("name or path")
    run.press("ferry")
    run.shows("1 name with")
    run.press("enter")
    run.shows("60 nodes", "order proven to")
    run.press("S")
    run.shows("opened lately", "60 nodes", "today", "? all keys")
    run.press("q")
    assert run.ends() == 0
    assert all(run.left_clean().values()), run.left_clean()


def test_nothing_named_and_no_terminal_is_a_sentence(terminal):
    run = terminal(code="import sys; sys.stdin = open('/dev/null')")
    assert run.ends() == 2
    assert "no edge table was named" in run.text


FRAMES = """
import atexit, sys
def told():
    from textual import constants
    print("frames", constants.MAX_FPS, "animation", constants.TEXTUAL_ANIMATIONS)
atexit.register(told)
"""


def test_a_slow_link_has_fewer_frames_no_animation_and_no_mouse(terminal, calls):
    for options, frames in ((), 30), (("--slow-link",), 12):
        run = terminal(calls, "--fresh", *options, code=FRAMES)
        run.shows("? all keys", "order proven to")
        run.press("down")
        run.shows("held up by  berth-007")
        run.press("q")
        assert run.ends() == 0
        assert f"frames {frames} animation none" in run.text
        assert not re.search(rb"\x1b\[\?(1000|1003|1006)h", bytes(run.raw))
