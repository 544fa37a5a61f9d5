"""The installed program in a real pseudo-terminal, from opening a sample to a clean exit."""

from __future__ import annotations

import os
import re
import signal
import time
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
HOSTILE = [
    "\x1b[31mred",
    "[bold]x[/bold]",
    "\u202egnp.exe",
    "n" * 5_000,
    "🚢-ferry",
    "a\tb\nc",
    "日本の港",
]


def rows(terminal):
    """The table's rows as words, between its headings and the rule below; none before they show."""
    lines = terminal.lines
    heads = [at for at, line in enumerate(lines) if " node " in line and " rank" in line]
    return [line.split() for line in lines[heads[0] + 1 : heads[0] + 10]] if heads else []


def cursor_name(terminal):
    found = re.search(r"▸ *[\d,-]+ +(\S+)", terminal.text)
    return found[1] if found else ""


def choose(terminal, name):
    """Take the row of a choice that begins with ``name``."""
    terminal.until(
        lambda: any(line[1:].startswith(name) for line in terminal.lines), f"the choice {name}"
    )
    lines = terminal.lines
    marked = next(at for at, line in enumerate(lines) if re.match(r"▸\S", line))
    wanted = next(at for at, line in enumerate(lines) if line[1:].startswith(name))
    step = "down" if wanted > marked else "up"
    terminal.press(*[step] * abs(wanted - marked), "enter")


def all_solved(terminal):
    """Wait until the measures that are solved unasked are no longer at work."""
    end = time.monotonic() + 60
    while True:
        terminal.press("m")
        terminal.shows("Enter take")
        company = [line for line in terminal.lines if re.match(r".[SEKD] \w", line)]
        busy = any("being solved" in line or "not solved yet" in line for line in company)
        terminal.press("escape")
        terminal.shows("Enter node")
        if not busy:
            return
        assert time.monotonic() < end, terminal.text
        terminal.pump(0.5)


def ends(terminal, first, last):
    """Where the rows of the screen end, in cells; a wide character takes two."""
    blank = terminal.screen.default_char.data
    return {
        max(x for x in range(terminal.width) if terminal.screen.buffer[y][x].data != blank)
        for y in range(first, last)
    }


def test_a_sample_from_opening_to_leaving(terminal):
    run = terminal(
        SAMPLES / "harbour_calls.parquet", "--nodes", SAMPLES / "harbour_services.parquet"
    )
    run.shows("harbour_calls.parquet", "399 nodes", "along caller -> callee", "order proven to")
    # The sample's README: audit-trail is first by surfer.
    first = ["┃▸", "1", "audit-trail"]
    run.until(lambda: rows(run) and rows(run)[0][:3] == first, "the first by surfer")
    run.shows("eigen", "katz")  # the other measures, solved beside it
    run.until(lambda: rows(run) and rows(run)[0][4:6] == ["5", "5"], "the README's ranks by them")

    run.press("s")
    run.shows("sort by", "turns the order round")
    choose(run, "in ")
    run.lacks("sort by")
    run.shows("in▾")

    def falling():
        headings = run.line_with("in▾").split()
        counts = [int(row[headings.index("in▾") + 1].replace(",", "")) for row in rows(run)]
        return len(counts) == 9 and counts == sorted(counts, reverse=True)

    run.until(falling, "the rows by falling in-degree")

    run.press("/", "STANDBY", "enter")
    run.shows("names with 'STANDBY'")
    run.until(lambda: cursor_name(run).startswith("seat-inventory-standby"), "the row found")

    run.press("/", *["backspace"] * 7, "guest-store", "enter")
    run.until(lambda: cursor_name(run) == "guest-store", "guest-store")
    run.press("enter")
    run.shows("▼ guest-store", "gives to it", "it gives to", "share")
    run.press("down", "up")
    feeder = "identity"  # the README: one of its callers is identity at full volume
    run.shows(f"▸{feeder}")
    run.press("enter")
    run.shows(f"▼ {feeder}", "came by: guest-store")
    run.press("b")
    run.shows("▼ guest-store")
    run.press("escape")
    run.shows("Enter node")
    run.until(lambda: cursor_name(run) == "guest-store", "the row it was left at")

    run.press("m")
    run.shows("E eigenvector", "K katz", "D degree")
    choose(run, "K katz")
    run.until(lambda: run.lines[1].startswith(" katz"), "Katz in the second line")
    run.press("s", "t", "enter")
    run.shows("rank▴")
    run.press("t")
    by_katz = ["1", "guest-store"]
    run.until(lambda: rows(run) and rows(run)[0][1:3] == by_katz, "the first by Katz")

    run.press("l")
    run.shows("solve log of katz", "residual", "order proven", "converged")
    run.until(lambda: "◉" in run.text or "○" in run.text, "the points of the chart")
    run.shows("sweep")
    run.press("escape")
    run.shows("Enter node")
    run.press("q")
    assert run.ends() == 0
    assert all(run.left_clean().values()), run.left_clean()


def test_changed_settings_solve_while_the_old_standings_stay(terminal, calls):
    run = terminal(calls)
    run.shows("surfer d=0.85", "? all keys")
    run.press("c")
    run.shows("settings of surfer", "Enter solve")
    run.press("down", "backspace", "backspace", "x")
    run.shows("damping is '0.x'; it takes a number")
    run.press("backspace", "5", "enter")
    run.shows("surfer d=0.5", "rank▴")
    run.press("ctrl+c")
    assert run.ends() == 130
    assert all(run.left_clean().values())


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
def test_a_signal_leaves_the_terminal_clean(terminal, calls, number):
    run = terminal(calls)
    run.shows("? all keys")
    os.kill(run.process.pid, number)
    assert run.ends() == 128 + number
    assert all(run.left_clean().values()), run.left_clean()


def test_an_interrupt_while_loading_leaves_the_terminal_clean(terminal, calls):
    run = terminal(calls)
    run.shows("ferry_calls.parquet", "opening")
    os.kill(run.process.pid, signal.SIGINT)
    assert run.ends() == 130
    assert all(run.left_clean().values()), run.left_clean()


def test_a_dropped_connection_ends_the_program(terminal, calls):
    run = terminal(calls)
    run.shows("? all keys")
    assert run.hang_up() == 128 + signal.SIGHUP


def test_what_cannot_be_read_is_one_sentence_on_a_clean_terminal(terminal, tmp_path):
    broken = tmp_path / "broken.parquet"
    broken.write_bytes(b"PAR1 this is none PAR1")
    run = terminal(broken)
    assert run.ends() == 2
    assert all(run.left_clean().values())
    said = bytes(run.raw).rpartition(b"\x1b[?1004l")[2].decode()
    assert "broken.parquet" in said
    assert "Traceback" not in said


def test_hostile_names_cannot_act(terminal, tmp_path):
    path = tmp_path / "hostile.parquet"
    pq.write_table(pa.table({"source": HOSTILE, "target": [HOSTILE[0]] * len(HOSTILE)}), path)
    run = terminal(path)
    run.shows("\\e[31mred", "[bold]x[/bold]", "\\u{202e}gnp.exe", "a\\tb\\nc", "? all keys")
    run.shows("nnnnnnnn…")
    run.until(lambda: "日本の港" in run.text.replace(" ", ""), "the wide name")
    raw = bytes(run.raw).decode()
    assert "\u202e" not in raw
    assert "\x1b[31mred" not in raw
    # Every row ends where the others do: the columns right of the names stay aligned.
    run.until(lambda: len(ends(run, 4, 4 + len(HOSTILE))) == 1, "rows of one width")
    run.press("enter")
    run.shows("gives to it")
    run.press("q")
    assert run.ends() == 0


def colours(run):
    """Every colour that was selected, as the numbers of the escape sequences."""
    found = re.findall(rb"\x1b\[([0-9;]+)m", bytes(run.raw))
    numbers = {int(part) for group in found for part in group.split(b";") if part}
    return numbers - {0, 1, 2, 4, 7, 39, 49}


@pytest.mark.parametrize("term", ["xterm-256color", "screen"])
def test_only_sixteen_colours_whatever_the_terminal_claims(terminal, calls, term):
    run = terminal(calls, TERM=term, COLORTERM="truecolor")
    run.shows("? all keys", "order proven to")
    run.press("q")
    assert run.ends() == 0
    assert colours(run)
    assert all(30 <= number <= 37 or 90 <= number <= 97 for number in colours(run))


def test_no_color_shows_everything_without_a_colour(terminal, calls):
    run = terminal(calls, NO_COLOR="1")
    run.shows("? all keys", "order proven to", "┃▸")
    run.press("enter")
    run.shows("gives to it", "▼ berth-007")
    run.press("escape", "l")  # in one packet
    run.shows("solve log")
    run.press("q")
    assert run.ends() == 0
    assert colours(run) == set()


def test_ascii_where_the_locale_is_not_utf8(terminal, calls):
    run = terminal(calls, LANG="C", LC_ALL="C")
    run.shows("? all keys", "order proven to", "|>")
    run.press("enter")
    run.shows("gives to it", "v berth-007 ---")
    run.press("escape", "l")  # in one packet
    run.shows("solve log", "x residual")
    run.press("q")
    assert run.ends() == 0
    assert bytes(run.raw).isascii()


def test_forty_by_ten_and_a_storm_of_sizes(terminal, calls):
    run = terminal(calls, size=(40, 10))
    run.shows("berth-0", "? all keys")
    for size in [(120, 40), (20, 5), (81, 25), (39, 9), (160, 50), (80, 24)] * 3:
        run.resize(*size)
    run.shows("held up by", "? all keys", "along caller -> callee")
    run.press("q")
    assert run.ends() == 0


def test_bytes_of_a_key(terminal, calls):
    """A key costs at most 500 bytes without scrolling: bytes, unlike seconds, do not vary."""
    run = terminal(calls, size=(120, 40))
    run.shows("? all keys", "order proven to")
    all_solved(run)
    for _ in range(3):  # the table with the last measure's column may still be on its way
        run.press("down")
        run.settle()
    start = len(run.raw)
    for _ in range(20):
        run.press("down")
        run.settle(0.15)
    assert (len(run.raw) - start) / 20 <= 500


def test_nothing_is_sent_while_nothing_happens(terminal, calls):
    run = terminal(calls, size=(120, 40))
    run.shows("? all keys", "order proven to")
    all_solved(run)
    run.press("down")
    run.settle()
    size = len(run.raw)
    run.pump(2.2)  # longer than any tick of a clock
    assert len(run.raw) == size
