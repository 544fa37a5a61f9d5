"""The two lists of the first screen as sources of row-window tables."""

from __future__ import annotations

import datetime
import os
from collections.abc import Sequence

from kingpost.core.standing import UNRANKED
from kingpost.core.text import count
from kingpost.tui import places
from kingpost.tui.models import folders
from kingpost.tui.models.columns import Column
from kingpost.tui.models.folders import Entry
from kingpost.tui.models.numbers import compact
from kingpost.tui.models.recent import Recent
from kingpost.tui.models.resumption import clock

_NAME = 60
_KINDS = {
    folders.UP: "the folder above",
    folders.WHOLE: "this folder as one table",
    folders.FOLDER: "folder",
    folders.PACK: "pack",
    folders.TABLE: "",
}


class _Rows:
    """What every list here has in common."""

    head: list[Column]

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """No rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is found here."""
        return False


class RecentRows(_Rows):
    """Tables opened lately, the newest first; those that are gone say so."""

    def __init__(self, entries: Sequence[Recent]) -> None:
        self.entries = list(entries)
        names = [self.name(at) for at in range(len(entries))]
        longest = min(max(map(len, names), default=6), _NAME)
        self.head = [
            Column("name", "", min(max(longest, 6), 26), self.name, frozen=True, stretch=longest),
            Column("when", "", 15, lambda at: clock(self.entries[at].when)),
            Column("size", "", 24, self._size),
            Column("place", "", 40, self._place),
        ]

    def name(self, at: int) -> str:
        """The file's name; of several tables the first and how many more."""
        paths = self.entries[at].paths
        first = folders.safe(paths[0].rstrip("/").rsplit("/", 1)[-1])
        return first if len(paths) == 1 else f"{first} +{len(paths) - 1}"

    def _size(self, at: int) -> str:
        entry = self.entries[at]
        if entry.missing:
            return "no longer there"
        nodes = f"{compact(entry.nodes)} nodes"
        return f"{nodes} {compact(entry.edges)} edges"

    def _place(self, at: int) -> str:
        return places.home_short(os.path.dirname(self.entries[at].paths[0]))

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.entries)


class FolderRows(_Rows):
    """The rows of a folder, as far as they are not narrowed out."""

    def __init__(self, entries: Sequence[Entry]) -> None:
        self.entries = list(entries)
        longest = max((len(entry.name) for entry in self.entries[:2_000]), default=6) + 1
        longest = min(longest, _NAME)
        self.head = [
            Column("name", "", min(max(longest, 6), 26), self._name, frozen=True, stretch=longest),
            Column("size", "", 8, self._size, right=True),
            Column("when", "", 24, self._when),
        ]

    def _name(self, at: int) -> str:
        entry = self.entries[at]
        name = folders.safe(entry.name)
        return f"{name}/" if entry.kind in (folders.FOLDER, folders.PACK) else name

    def _size(self, at: int) -> str:
        return folders.size_words(self.entries[at].size)

    def _when(self, at: int) -> str:
        entry = self.entries[at]
        if entry.changed < 0:
            return _KINDS[entry.kind]
        try:
            then = datetime.datetime.fromtimestamp(entry.changed).astimezone()
        except (OverflowError, ValueError, OSError):
            return ""
        return clock(then.isoformat())

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.entries)


def told(rows: FolderRows, words: str, text: str) -> str:
    """How many rows there are, narrowed or not."""
    return f"{count(len(rows.entries), 'name')} with {text!r}" if text else words
