"""What is in a folder, for choosing a table: folders, tables, packs; everything else is left out.

:func:`listed` and :func:`narrowed` are for jobs: folders may hold any number of entries and lie on
disks that are slow to answer.
"""

from __future__ import annotations

import os
from dataclasses import dataclass

from kingpost.core.errors import InputError
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch

UP, WHOLE, FOLDER, PACK, TABLE = "up", "whole", "folder", "pack", "table"
_PACKS_LOOKED_FOR = 2_000  # folders that are opened to see whether they are packs


@dataclass(frozen=True, slots=True)
class Entry:
    """One row: its kind, name, bytes and time of change (-1 where not known)."""

    kind: str
    name: str
    size: int = -1
    changed: float = -1.0

    @property
    def hidden(self) -> bool:
        """Whether its name begins with a dot."""
        return self.name.startswith(".") and self.kind in (FOLDER, PACK, TABLE)


@dataclass(frozen=True)
class Listing:
    """A folder's rows: the way up, the folder as one table, folders, tables by name."""

    folder: str
    entries: tuple[Entry, ...]

    def path(self, entry: Entry) -> str:
        """The path of a row."""
        if entry.kind == UP:
            return os.path.dirname(self.folder)
        return self.folder if entry.kind == WHOLE else os.path.join(self.folder, entry.name)

    @property
    def words(self) -> str:
        """How many of what there are, hidden ones apart."""
        shown = [entry.kind for entry in self.entries if not entry.hidden]
        tables, folders = shown.count(TABLE) + shown.count(PACK), shown.count(FOLDER)
        return f"{count(tables, 'table')}, {count(folders, 'folder')}"


def is_table(name: str) -> bool:
    """Whether a file is a table that can be read, going by its name."""
    from kingpost.core.ingest.formats import ENDINGS, ending_format

    return ending_format(name) in ENDINGS


def listed(folder: str, watch: Watch | None = None) -> Listing:
    """List a folder.

    Raises:
        InputError: if it cannot be read.
        Interrupted: if ``watch`` was cancelled.
    """
    watch = watch or Watch()
    folder = os.path.abspath(os.path.expanduser(folder))
    folders: list[Entry] = []
    tables: list[Entry] = []
    try:
        with os.scandir(folder) as found:
            for at, item in enumerate(found):
                if at % 1024 == 0:
                    watch.check()
                    watch.report("listing the folder", at, None, "entries")
                try:
                    if item.is_dir():
                        folders.append(Entry(FOLDER, item.name))
                    elif is_table(item.name):
                        about = item.stat()
                        tables.append(Entry(TABLE, item.name, about.st_size, about.st_mtime))
                except OSError:
                    continue  # gone in the meantime, or a link to nowhere
    except (OSError, ValueError) as error:
        why = getattr(error, "strerror", None) or error
        raise InputError(f"{folder} cannot be listed: {why}") from None
    folders = _packs_told(folder, folders, watch)
    folders.sort(key=lambda entry: (entry.kind != FOLDER, entry.name.casefold(), entry.name))
    tables.sort(key=lambda entry: (entry.name.casefold(), entry.name))
    head = [] if os.path.dirname(folder) == folder else [Entry(UP, "..")]
    parted = any("=" in entry.name for entry in folders)
    if len([entry for entry in tables if not entry.hidden]) > 1 or parted:
        head.append(Entry(WHOLE, "."))
    return Listing(folder, (*head, *folders, *tables))


def _packs_told(folder: str, folders: list[Entry], watch: Watch) -> list[Entry]:
    from kingpost.core.store.sealed import is_pack

    told = []
    for at, entry in enumerate(folders):
        watch.check()
        looked = at < _PACKS_LOOKED_FOR and is_pack(os.path.join(folder, entry.name))
        told.append(Entry(PACK, entry.name) if looked else entry)
    return told


def narrowed(listing: Listing, text: str) -> list[Entry]:
    """The rows whose name contains ``text``, letter case apart; those that begin with it first.

    Hidden ones only if the text begins with a dot.
    """
    if not text:
        return [entry for entry in listing.entries if not entry.hidden]
    wanted = text.casefold()
    begins, holds = [], []
    for entry in listing.entries:
        if entry.kind in (UP, WHOLE) or (entry.hidden and not text.startswith(".")):
            continue
        name = entry.name.casefold()
        if name.startswith(wanted):
            begins.append(entry)
        elif wanted in name:
            holds.append(entry)
    return begins + holds


def nearest(folder: str) -> str:
    """The folder itself, else the nearest one above it that is there."""
    folder = os.path.abspath(os.path.expanduser(folder))
    while not os.path.isdir(folder) and os.path.dirname(folder) != folder:
        folder = os.path.dirname(folder)
    return folder


def size_words(size: int) -> str:
    """``1.2 MB``: bytes by thousands, nothing where not known."""
    if size < 0:
        return ""
    amount, unit = float(size), "B"
    for larger in ("kB", "MB", "GB", "TB"):
        if amount < 1000:
            break
        amount, unit = amount / 1000, larger
    return f"{amount:,.0f} {unit}" if unit == "B" or amount >= 10 else f"{amount:.1f} {unit}"


def safe(name: str) -> str:
    """A name from the disk, safe to show, whatever its bytes."""
    return visible(name.encode("utf-8", "surrogateescape").decode("utf-8", "backslashreplace"))
