"""What a sitting was about, kept when it ends, so that the next one can go on from there.

Everything is kept by name (measures, settings, columns, ids), so that a table which has changed
since, or a later version of the program, takes up what still fits.  Imports nothing heavy: the
offer to go on stands on the first screen.
"""

from __future__ import annotations

import dataclasses
import datetime
import math
import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from kingpost.core.text import count, visible
from kingpost.tui import places

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings

_FORMAT = 1
_MOST_VALUES = 5_000  # nodes named in one setting that are kept
_MOST_TEXT = 4_000


@dataclass(frozen=True)
class Kept:
    """One sitting.  ``settings`` holds those of every measure solved, by measure and field;
    ``left_out`` the fields that were too large to keep; ``wanted`` how the rows were arranged;
    ``tables`` size and time of every file; ``options`` how the tables were read.
    """

    when: str = ""
    measure: str = ""
    settings: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    left_out: Mapping[str, Sequence[str]] = field(default_factory=dict)
    wanted: Mapping[str, Any] = field(default_factory=dict)
    order: Sequence[str] = ()
    hidden: Sequence[str] = ()
    cursor: str = ""
    view: str = ""
    trail: Sequence[str] = ()
    trail_at: int = 0
    find: str = ""
    marks: int = 0
    tables: Sequence[Sequence[int]] = ()
    options: Mapping[str, Any] = field(default_factory=dict)


def file_of(paths: Sequence[str]) -> Path:
    """Where the sitting over these tables is kept."""
    return places.state_folder() / "sittings" / f"{places.key_of(paths)}.json"


def write(paths: Sequence[str], kept: Kept) -> None:
    """Keep a sitting.

    Raises:
        places.StateError: if it cannot be written.
    """
    about = dataclasses.asdict(kept)
    paths = [os.path.realpath(path) for path in paths]
    places.write_json(file_of(paths), {"format": _FORMAT, "paths": paths, **about})


def forget(paths: Sequence[str]) -> None:
    """Keep no sitting over these tables."""
    try:
        file_of(paths).unlink(missing_ok=True)
    except OSError:
        return  # it will be offered once more, and declined


def read(paths: Sequence[str]) -> Kept | None:
    """The sitting kept over these tables, if there is one.

    Raises:
        places.StateError: if the file cannot be read or is none of ours.
    """
    file = file_of(paths)
    value = places.read_json(file)
    if value is None:
        return None
    if not isinstance(value, dict) or value.get("format") != _FORMAT:
        raise places.StateError(f"the sitting kept is of another version, left out: {file}")
    found: dict[str, Any] = {}
    for item in dataclasses.fields(Kept):
        default = getattr(Kept(), item.name)
        given = value.get(item.name, default)
        if isinstance(default, tuple):
            right = isinstance(given, list) and len(given) <= _MOST_VALUES
        else:
            right = type(given) is type(default)
        if not right:
            raise places.StateError(
                f"the sitting kept is damaged ({item.name}) and left out: {file}"
            )
        found[item.name] = given[:_MOST_TEXT] if isinstance(given, str) else given
    kept = Kept(**found)
    texts = [*kept.trail, *kept.order, *kept.hidden]
    if not all(isinstance(text, str) for text in texts) or not all(
        isinstance(given, dict) for given in kept.settings.values()
    ):
        raise places.StateError(f"the sitting kept is damaged and left out: {file}")
    return kept


def stamps(paths: Sequence[str]) -> list[list[int]]:
    """Size and time of change of every path; of a folder its own, which tells of new files."""
    found = []
    for path in paths:
        try:
            about = os.stat(path)
            found.append([about.st_size, about.st_mtime_ns])
        except OSError:
            found.append([-1, -1])
    return found


def clock(when: str, now: datetime.datetime | None = None) -> str:
    """``today 14:02``, ``yesterday 09:30``, else the date; a dash if it is no time."""
    try:
        then = datetime.datetime.fromisoformat(when)
    except ValueError:
        return "-"
    now = now or datetime.datetime.now().astimezone()
    if then.tzinfo is None:
        then = then.astimezone()
    days = (now.date() - then.astimezone(now.tzinfo).date()).days
    time = then.astimezone(now.tzinfo).strftime("%H:%M")
    if days == 0:
        return f"today {time}"
    return f"yesterday {time}" if days == 1 else then.date().isoformat()


def words(kept: Kept) -> str:
    """The sitting in one sentence, for the offer."""
    parts = [visible(kept.measure, 24)]
    others = len(kept.settings) - 1
    if others > 0:
        parts[0] += f" and {count(others, 'other measure')}"
    if kept.wanted.get("where"):
        parts.append(f"rows where {visible(str(kept.wanted['where']), 40)}")
    sort = str(kept.wanted.get("sort", "rank"))
    if sort != "rank" or kept.wanted.get("turned"):
        parts.append(f"sorted by {visible(sort.replace(':', ' '), 24)}")
    if kept.cursor:
        parts.append(f"at {visible(kept.cursor, 30)}")
    if kept.marks:
        parts.append(count(kept.marks, "mark"))
    return ", ".join(parts)


# ---- settings as JSON and back ----------------------------------------------------------------


def plain_settings(settings: Settings) -> tuple[dict[str, Any], list[str]]:
    """The fields that differ from the defaults and can be kept; the names of those that cannot."""
    kept: dict[str, Any] = {}
    left_out: list[str] = []
    for item in dataclasses.fields(settings):
        value = getattr(settings, item.name)
        if isinstance(value, (int, str, bool, type(None))) or (
            isinstance(value, float) and math.isfinite(value)
        ):
            if value != item.default:
                kept[item.name] = value
        elif isinstance(value, Mapping) and len(value) <= _MOST_VALUES:
            pairs = [[name, float(weight)] for name, weight in value.items()]
            if all(isinstance(name, (str, int)) and math.isfinite(w) for name, w in pairs):
                kept[item.name] = {"pairs": pairs}
            else:
                left_out.append(item.name)
        elif isinstance(value, (list, tuple)) and len(value) <= _MOST_VALUES:
            if all(isinstance(one, (str, int)) for one in value):
                kept[item.name] = {"items": list(value)}
            else:
                left_out.append(item.name)
        else:
            left_out.append(item.name)
    return kept, left_out


def settings_of(kind: Callable[..., Settings], given: Mapping[str, Any]) -> Settings | None:
    """Settings from what was kept; None if they no longer make sense."""
    from kingpost.core.errors import KingpostError

    values: dict[str, Any] = {}
    for name, value in given.items():
        if isinstance(value, dict):
            if isinstance(value.get("pairs"), list):
                value = {pair[0]: pair[1] for pair in value["pairs"] if len(pair) == 2}
            else:
                value = tuple(value.get("items", ()))
        values[name] = value
    try:
        return kind(**values)
    except (KingpostError, TypeError, ValueError):
        return None
