"""The user's own settings of the screen: other keys, other defaults.

``config.toml`` in the user's configuration folder, read once at the start.  What is wrong in it is
told in one sentence with its line, and everything it says is left out of account: half of a
configuration would be harder to understand than none.  Commands that print (``rank`` and the
others) read no configuration, so that a script does the same for everyone.

    [keys]
    "rows.sort" = "z"            # action ids are in the help; one key or a list of keys
    "mark.toggle" = ["x", "X"]

    [screen]
    slow_link = true             # as with --slow-link
    ascii = true                 # draw in ASCII
    colour = false               # as with NO_COLOR
    background = "light"         # or "dark"; guessed from COLORFGBG otherwise
    folder = "~/graphs"          # where the file chooser starts

    [open]
    measure = "katz"             # what is solved first
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from kingpost.core.measures import NAMES
from kingpost.core.text import visible
from kingpost.tui import actions, keymaps, places, rooms

MOST_BYTES = 200_000
_NAMED_KEYS = {
    "/": "slash",
    "?": "question_mark",
    "Enter": "enter",
    "Esc": "escape",
    "Tab": "tab",
    "Up": "up",
    "Down": "down",
    "Left": "left",
    "Right": "right",
}
# Without these there would be no way out.
_FIXED = ("quit.now", "step.back")
_SCREEN: dict[str, type] = {
    "slow_link": bool,
    "ascii": bool,
    "colour": bool,
    "background": str,
    "folder": str,
}
_OPEN: dict[str, type] = {"measure": str}
_TYPES = {bool: "true or false", str: "a text in quotes"}


@dataclass(frozen=True)
class Config:
    """What the file says; ``trouble`` is the sentence if it is wrong, and the rest is as if it
    did not exist.
    """

    keys: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    slow_link: bool = False
    ascii: bool = False
    colour: bool = True
    background: str = ""
    folder: str = ""
    measure: str = ""
    trouble: str = ""


class _Wrong(Exception):
    """What is wrong: a sentence, and the name by which its line is found."""

    def __init__(self, sentence: str, name: str) -> None:
        super().__init__(sentence)
        self.name = name


def read(path: Path | None = None) -> Config:
    """Read the file; never raises."""
    path = path or places.config_file()
    try:
        with open(path, "rb") as source:
            data = source.read(MOST_BYTES + 1)
    except FileNotFoundError:
        return Config()
    except OSError as error:
        return Config(trouble=_sentence(path, None, f"cannot be read: {error.strerror or error}"))
    if len(data) > MOST_BYTES:
        return Config(trouble=_sentence(path, None, f"is larger than {MOST_BYTES:,} bytes"))
    return parse(data, path)


def parse(data: bytes, path: Path) -> Config:
    """What the bytes of a configuration file say."""
    import tomllib

    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        return Config(trouble=_sentence(path, line, "is not text in UTF-8"))
    try:
        value = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        found = re.search(r"\(at line (\d+), column \d+\)", str(error))
        line = int(found[1]) if found else text.count("\n") + 1
        words = re.sub(r" \(at .*\)$", "", str(error))
        return Config(trouble=_sentence(path, line, f"is no TOML: {words[:1].lower()}{words[1:]}"))
    try:
        return _config(value)
    except _Wrong as wrong:
        return Config(trouble=_sentence(path, _line_of(text, wrong.name), str(wrong)))


def _sentence(path: Path, line: int | None, what: str) -> str:
    where = f"config.toml line {line}" if line else "config.toml"
    return visible(f"{where}: {what}; the defaults are used ({path})", 500)


def _line_of(text: str, name: str) -> int | None:
    """The line on which a key or table of that name stands."""
    word = re.compile(rf"""^\s*\[?\s*["']?{re.escape(name)}["']?\s*(=|\]|$)""")
    for at, line in enumerate(text.splitlines(), 1):
        if word.search(line):
            return at
    return next((at for at, line in enumerate(text.splitlines(), 1) if name in line), None)


def _config(value: Mapping[str, Any]) -> Config:
    for name in value:
        if name not in ("keys", "screen", "open"):
            raise _Wrong(f"[{name}] is none of [keys], [screen], [open]", name)
        if not isinstance(value[name], dict):
            raise _Wrong(f"{name} is no table; write [{name}] on a line of its own", name)
    screen = _typed(value.get("screen", {}), _SCREEN, "screen")
    opening = _typed(value.get("open", {}), _OPEN, "open")
    if screen.get("background", "dark") not in ("light", "dark"):
        raise _Wrong('background takes "light" or "dark"', "background")
    if opening.get("measure", NAMES[0]) not in NAMES:
        raise _Wrong(f"measure is none of {', '.join(NAMES)}", "measure")
    return Config(keys=_keys(value.get("keys", {})), **screen, **opening)


def _typed(table: Mapping[str, Any], known: Mapping[str, type], heading: str) -> dict[str, Any]:
    for name, item in table.items():
        if name not in known:
            raise _Wrong(f"[{heading}] has no {name!r}; it takes {', '.join(known)}", name)
        if type(item) is not known[name]:
            raise _Wrong(f"{name} takes {_TYPES[known[name]]}", name)
    return dict(table)


def _keys(table: Mapping[str, Any]) -> dict[str, tuple[str, ...]]:
    bound: dict[str, tuple[str, ...]] = {}
    for name, given in table.items():
        if isinstance(given, dict):
            raise _Wrong(f'write the action id in quotes: "{name}.{next(iter(given), "")}"', name)
        if name not in actions.BY_ID:
            near = _near(name)
            raise _Wrong(f"there is no action {name!r}{near}", name)
        if name in _FIXED:
            raise _Wrong(f"{name} keeps its key: it is the way out", name)
        given = [given] if isinstance(given, str) else given
        if not isinstance(given, list) or not given:
            raise _Wrong(f"{name} takes a key in quotes, or a list of them", name)
        bound[name] = tuple(_key(item, name) for item in given)
    _check_apart(bound)
    return bound


def _near(name: str) -> str:
    import difflib

    near = difflib.get_close_matches(name, list(actions.BY_ID), 1, 0.5)
    return f"; did you mean {near[0]!r}?" if near else ""


def _key(given: Any, name: str) -> str:
    if isinstance(given, str):
        if given in _NAMED_KEYS:
            return _NAMED_KEYS[given]
        if len(given) == 1 and given.isascii() and given.isalpha():
            return given
    raise _Wrong(
        f"{name}: {str(given)!r} is no key; keys are single letters, / ? Enter Esc Tab and arrows",
        name,
    )


def _check_apart(bound: Mapping[str, tuple[str, ...]]) -> None:
    """Refuse a key that would mean two things in one view, and one that is needed to get out.

    A letter that an action not named in the file has by default may be given away: the action is
    then without it, and can still be done by name.
    """
    for view in rooms.VIEW_WORDS:
        taken: dict[str, str] = {}
        where = rooms.VIEW_WORDS[view]
        for action in actions.ACTIONS:
            if view not in action.views or action.id not in (*bound, *_FIXED):
                continue
            keys = bound.get(action.id, action.keys)
            for key in keys:
                other = taken.setdefault(key, action.id)
                if other != action.id:
                    name = action.id if action.id in bound else other
                    word = keymaps.key_words(key)
                    raise _Wrong(f"{word} would mean both {other} and {action.id} in {where}", name)
            if not keymaps.keys_in(view, action, bound) and action.id in bound:
                raise _Wrong(
                    f"{action.id} needs a key that is no letter: in {where} letters are typed",
                    action.id,
                )
