"""What the terminal can show: colours, line-drawing characters, and how much traffic it bears.

Imports nothing heavy.  :func:`prepare_environment` must run before textual is imported, because
textual reads these variables once, at import.
"""

from __future__ import annotations

import contextlib
import locale
import os
import tempfile
import time
from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Glyphs:
    """Every character the screen draws with, in one place, so that ASCII is a choice of set."""

    ascii: bool
    rail: str  # proven, not proven, tied, below the noise floor: indexed by the rail codes
    bar: str  # the partly filled cells, from the thinnest to the full one
    rule: str
    track: str
    pointer: str
    ellipsis: str
    down: str
    way: str
    residual: str
    bound: str
    both: str
    tolerance: str
    step: str
    axis: str
    corner: str
    rising: str
    falling: str
    levels: str  # bars that stand, from the lowest to the full one
    here: str  # where something is on a line of such bars
    gives: str  # into a standing line of a drawing
    takes: str
    mark: str  # beside the name of a node on the shortlist
    density: str  # few to many in one cell of a drawing


UNICODE = Glyphs(
    ascii=False,
    rail="┃╎= ",
    bar="▏▎▍▌▋▊▉█",
    rule="─",
    track="·",
    pointer="▸",
    ellipsis="…",
    down="▼",
    way="›",
    residual="•",
    bound="○",
    both="◉",
    tolerance="┈",
    step="▁",
    axis="│",
    corner="└",
    rising="▴",
    falling="▾",
    levels="▁▂▃▄▅▆▇█",
    here="◆",
    gives="●",
    takes="◀",
    mark="★",
    density="·░▒▓█",
)
ASCII = Glyphs(
    ascii=True,
    rail="|:= ",
    bar="#",
    rule="-",
    track=".",
    pointer=">",
    ellipsis="~",
    down="v",
    way=">",
    residual="x",
    bound="o",
    both="@",
    tolerance=".",
    step="_",
    axis="|",
    corner="+",
    rising="^",
    falling="v",
    levels="._-=*#",
    here="^",
    gives="o",
    takes="<",
    mark="*",
    density=".:+%#",
)

# Only the terminal's own sixteen colours and its own background: they follow the reader's light
# or dark scheme and cost the fewest bytes.  Each role is told apart by glyph or position too.
_COLOURED = {
    "plain": "",
    "strong": "bold",
    "quiet": "dim",
    "head": "bold cyan",
    "title": "dim",
    "cursor": "reverse",
    "bar": "cyan",
    "proven": "green",
    "open": "yellow",
    "tied": "cyan",
    "rule": "dim",
    "news": "bold",
    "bad": "bold red",
    "hit": "underline",
    "mark": "bold",
    "key": "bold",
    "letter": "bold",
    "residual": "cyan",
    "bound": "bold yellow",
    "step": "green",
}
# On a light background yellow and cyan are hard to read.
_ON_LIGHT = _COLOURED | {
    "head": "bold blue",
    "bar": "blue",
    "open": "magenta",
    "tied": "blue",
    "residual": "blue",
    "bound": "bold magenta",
}
_PLAIN = _COLOURED | {
    "head": "bold",
    "bar": "",
    "proven": "",
    "open": "",
    "tied": "",
    "bad": "bold",
    "residual": "",
    "bound": "bold",
    "step": "",
}


@dataclass(frozen=True, slots=True)
class Looks:
    """The decisions taken for this terminal; ``styles`` maps a role to a style in words."""

    glyphs: Glyphs = UNICODE
    colour: bool = True
    slow: bool = False
    styles: Mapping[str, str] = field(default_factory=lambda: dict(_COLOURED))


def decide(
    environ: Mapping[str, str] | None = None,
    codeset: str | None = None,
    *,
    slow: bool = False,
    ascii_only: bool = False,
    coloured: bool = True,
    background: str = "",
) -> Looks:
    """Looks for an environment: ``NO_COLOR`` (any non-empty value) means no colour at all.

    Line drawing falls back to ASCII where the locale is not UTF-8 or ``KINGPOST_ASCII`` is set.
    ``background`` is light or dark; some terminals tell it in ``COLORFGBG``.
    """
    environ = os.environ if environ is None else environ
    if codeset is None:
        codeset = locale_codeset(environ)
    plain = codeset.lower().replace("-", "") != "utf8" or bool(environ.get("KINGPOST_ASCII"))
    plain = plain or ascii_only
    colour = coloured and not environ.get("NO_COLOR")
    colour = colour and environ.get("TERM", "") not in ("dumb", "vt100")
    styles = _COLOURED if (background or background_of(environ)) != "light" else _ON_LIGHT
    return Looks(ASCII if plain else UNICODE, colour, slow, styles if colour else _PLAIN)


def background_of(environ: Mapping[str, str]) -> str:
    """``light`` or ``dark`` where ``COLORFGBG`` (foreground;...;background) tells, else empty."""
    last = environ.get("COLORFGBG", "").rpartition(";")[2]
    if not last.isdigit():
        return ""
    return "light" if int(last) in (7, *range(9, 16)) else "dark"


def locale_codeset(environ: Mapping[str, str]) -> str:
    """The character set the locale's variables ask for.

    Python coerces a C locale to UTF-8 by setting ``LC_CTYPE=C.UTF-8``.  That says nothing about
    what the terminal can draw, so a ``LANG`` of C beside it still means ASCII.
    """
    lang = environ.get("LANG", "")
    ctype = environ.get("LC_CTYPE", "")
    if ctype == "C.UTF-8" and lang in ("C", "POSIX"):
        ctype = ""
    value = environ.get("LC_ALL") or ctype or lang
    if value in ("", "C", "POSIX"):
        return "ascii"
    if "." in value:
        return value.split(".", 1)[1].split("@", 1)[0]
    return locale.getpreferredencoding(False)


def prepare_environment(*, slow: bool = False) -> None:
    """Set what textual reads at import: no animation, few frames, no extended key protocol."""
    settings = {
        "TEXTUAL_ANIMATIONS": "none",
        "TEXTUAL_FPS": "12" if slow else "30",
        "TEXTUAL_SMOOTH_SCROLL": "0",
        "TEXTUAL_DISABLE_KITTY_KEY": "1",
        # Nothing here uses a colour beyond the terminal's own sixteen.
        "TEXTUAL_COLOR_SYSTEM": "standard",
    }
    for name, value in settings.items():
        os.environ.setdefault(name, value)


def keep_fault(trace: str) -> str:
    """Write a traceback to a log file of its own; its place, or "" where none can be written."""
    state = os.environ.get("XDG_STATE_HOME") or os.path.expanduser("~/.local/state")
    name = f"fault-{time.strftime('%Y%m%d-%H%M%S')}-{os.getpid()}.log"
    for folder in (os.path.join(state, "kingpost"), tempfile.gettempdir()):
        with contextlib.suppress(OSError):
            os.makedirs(folder, exist_ok=True)
            path = os.path.join(folder, name)
            with open(path, "a", encoding="utf-8", errors="backslashreplace") as log:
                log.write(trace + "\n")
            return path
    return ""
