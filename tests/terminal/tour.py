"""A tour of every view of the program on a sample, in a real terminal: for snapshots and pictures.

``python tests/terminal/tour.py`` writes the snapshots anew; look at what changed before it is kept.
"""

from __future__ import annotations

import contextlib
import os
import re
import shutil
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).parents[2]
if __name__ == "__main__":
    sys.path.insert(0, str(ROOT))

from tests.terminal.conftest import Terminal  # noqa: E402

SNAPSHOTS = Path(__file__).parent / "snapshots"
SIZES = ((80, 24), (120, 40))
FILES = ("harbour_calls_failover.parquet", "harbour_services.parquet", "cheese_tastings.parquet")

# Name, keys, and what shows that the view is there with all it has to say.
STOPS: tuple[tuple[str, tuple[str, ...], tuple[str, ...]], ...] = (
    ("standings", ("/", "lease-umpire", "enter"), ("1 of 1 names", "S 11", "standby 86%")),
    ("measures", ("m",), ("Enter take", "N harmonic")),
    ("sorting", ("escape", "s"), ("sort by", "Enter take")),
    ("columns", ("escape", "k"), ("columns in their order", "surfer score")),
    ("filter", ("escape", "f"), ("rows where", "Enter go")),
    ("filtered", ("katz_rank <= 9 or tier = 0", "enter"), ("of 399 nodes", "where katz_rank")),
    ("node", ("enter",), ("▼ lease-umpire", "seat-register")),
    ("details", ("d",), ("neighbourhood", "key-chest")),
    ("asking", ("escape", "A"), ("ask of lease-umpire", "losses one by one")),
    ("why", ("enter",), ("[terms]", "snapshot-replay", "the error bound allows")),
    ("any action", ("escape", "g"), ("any action", "Enter do it")),
    ("found action", ("short",), ("go to  short", "the shortlist")),
    ("noting", ("escape", "i", "asked by the standby"), ("note on lease-umpire", "standby")),
    ("shortlist", ("enter", "o"), ("1 node marked", "asked by the standby", "Enter node")),
    ("way to", ("escape", "u"), ("shortest way to", "Enter go")),
    ("way", ("web-gate", "enter"), ("way from lease-umpire to web-gate", "4  web-gate")),
    ("log", ("escape", "escape", "l"), ("solve log of surfer", "order proven", "certified")),
    ("solves", ("escape", "z"), ("solves of this sitting", "4 done", "degree")),
    ("two solves", ("enter", "down", "enter"), ("katz", "Enter node")),
    ("makeup", ("escape", "escape", "M"), ("[shape", "spectral radius")),
    ("degrees", ("tab",), ("[degrees",)),
    ("strong parts", ("tab",), ("[strong",)),
    ("weak parts", ("tab",), ("[weak",)),
    ("rows read", ("tab",), ("[rows",)),
    ("settings", ("escape", "c"), ("settings of surfer", "Enter solve", "cost:")),
    ("help", ("escape", "?"), ("keys and signs",)),
    ("start", ("escape", "S"), ("choose a table of edges", "399 nodes", "cheese_tastings")),
    ("offer", ("c",), ("read; take up the sitting", "was kept")),
    ("roles", ("F",), ("Enter read it",)),
)


def home() -> Path:
    """A home folder with the samples in it, whose place does not show."""
    folder = Path(tempfile.mkdtemp(prefix="kingpost-tour-"))
    for name in FILES:
        shutil.copyfile(ROOT / "sample_graphs" / name, folder / name)
        os.utime(folder / name, (1_700_000_000, 1_700_000_000))
    return folder


def begin(size: tuple[int, int]) -> Terminal:
    """The program on the failover hour, solved only as far as scores differ anyhow.

    At a wide tolerance every figure is far from what rounding, and so the processor, decides.
    """
    folder = home()
    env = {
        key: value for key, value in os.environ.items() if not key.startswith(("LC_", "TEXTUAL"))
    }
    for name in ("NO_COLOR", "COLORTERM", "COLORFGBG"):
        env.pop(name, None)
    env |= {"TERM": "xterm-256color", "LANG": "C.UTF-8", "HOME": str(folder), "TZ": "UTC"}
    for name in ("XDG_STATE_HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME", "KINGPOST_CACHE_DIR"):
        env[name] = str(folder / ".kept")
    argv = [sys.executable, "-m", "kingpost.tui", FILES[0]]
    argv += ["--nodes", FILES[1], "--tol", "1e-4", "--no-store", "--threads", "2"]
    with contextlib.chdir(folder):
        run = Terminal(argv, size, env)
    run.shows("? all keys", "order proven to", " katz", " eigen", "D 11")
    return run


def tour(run: Terminal) -> Iterator[str]:
    """The names of the views, one after the other, each shown when its name comes."""
    for name, keys, texts in STOPS:
        for key in keys:
            before = run.text
            run.press(key)
            if key == "escape":  # and a letter in one packet would be another key
                run.until(lambda old=before: run.text != old, "what is beneath")
        run.shows(*texts, deadline=30)
        yield name


# ---- what is on the screen, apart from clocks ----------------------------------------------------

_MASKS = (
    (re.compile(r"\b\d\d:\d\d\b"), "##:##"),
    # What is left over when all but rounding is settled.
    (re.compile(r"\d\.\de-(09|[12]\d)"), "#.#e-##"),
    (re.compile(r"\b\d{5}…"), "#####…"),
)


def text_of(run: Terminal) -> list[str]:
    """The rows of the screen, with # for clock times, seconds and what rounding decides."""
    lines = ["" if _charted(run, line) else line for line in run.lines]
    for pattern, instead in _MASKS:
        lines = [pattern.sub(instead, line) for line in lines]
    at = next((line.index("seconds") for line in lines if "seconds  " in line), 0)
    if at:
        lines = [
            f"{line[:at]}#.###{line[at + 7 :]}"
            if re.fullmatch(r" *\d+\.\d+", line[at : at + 7])
            else line
            for line in lines
        ]
    costs = [at for at, line in enumerate(lines) if line.startswith(" cost:")]
    for at in costs:
        for row in range(at, len(lines)):
            if lines[row].startswith("─"):
                break
            lines[row] = " (cost, by the pace of this machine)" if row == at else ""
    return lines


def _charted(run: Terminal, line: str) -> bool:
    """Whether a row is of the log's chart, whose scale goes down to what rounding decides."""
    return " solve log of" in run.lines[0] and "│" in line


def looks_of(run: Terminal) -> list[str]:
    """One letter a cell: its colour, capital where bold; # reverse, _ underlined, . plain."""
    rows = []
    for y in range(run.height):
        if _charted(run, run.lines[y]):
            rows.append("")
            continue
        cells = [run.screen.buffer[y][x] for x in range(run.width)]
        rows.append("".join(_letter(cell) for cell in cells).rstrip("."))
    return rows


def _letter(cell: object) -> str:
    if cell.reverse:
        return "#"
    if cell.underscore:
        return "_"
    if cell.fg == "default":
        return "*" if cell.bold else "."
    letter = {"black": "k", "brown": "y"}.get(cell.fg, cell.fg.removeprefix("bright")[0])
    return letter.upper() if cell.bold else letter


def snapshot(run: Terminal) -> str:
    """Text and looks as they are kept."""
    return "\n".join([*text_of(run), "=" * run.width, *looks_of(run)]) + "\n"


def file_of(name: str, size: tuple[int, int]) -> Path:
    """Where the snapshot of a view is kept."""
    return SNAPSHOTS / f"{size[0]}x{size[1]}" / f"{name.replace(' ', '_')}.txt"


def main() -> None:
    """Write every snapshot anew."""
    for size in SIZES:
        run = begin(size)
        for name in tour(run):
            run.settle(0.6)
            place = file_of(name, size)
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_text(snapshot(run), encoding="utf-8")
            print(place.relative_to(ROOT))
        run.close()


if __name__ == "__main__":
    main()
