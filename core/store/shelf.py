"""The shelf: the folder in the user's cache where graphs and results are kept, and its limits.

``graphs/KEY/`` is a graph, ``results/CONTENT/KEY/`` a result of the graph with that content.
When the shelf would outgrow its limit, what was used longest ago goes first.  Everything here
can be made again: taking any of it away costs time, never an answer.
"""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
import stat
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from kingpost.core.store.sealed import StoreTrouble, making, read_manifest, remove, sweep
from kingpost.core.watch import Watch

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.store.identity import Identity

LIMIT = 20 * 10**9  # bytes
SPARE = 250 * 10**6  # bytes left free on the disk for everybody else


@dataclass(frozen=True)
class Entry:
    """One thing that is kept: a graph, or a result of one.

    ``bytes`` is what it takes on the disk; ``used`` when it was last opened, in seconds since
    1970.  ``about`` is what its manifest says; empty where that is damaged.
    """

    kind: str
    place: Path
    bytes: int
    used: float
    about: dict[str, Any]

    @property
    def name(self) -> str:
        """The name of the graph it is, or belongs to."""
        return str(self.about.get("name" if self.kind == "graph" else "graph", "(damaged)"))

    @property
    def content(self) -> str:
        """What ties a result to its graph."""
        if self.kind == "result":
            return self.place.parent.name
        return str(self.about.get("content", ""))


class Shelf:
    """The shelf in a folder, by default the user's own."""

    def __init__(self, folder: str | os.PathLike[str] | None = None, limit: int = LIMIT) -> None:
        self.root = Path(folder) if folder is not None else default_folder()
        self.limit = limit
        self.graphs, self.results = self.root / "graphs", self.root / "results"

    # ---- writing ---------------------------------------------------------------------------

    def prepare(self) -> None:
        """Make the folders, for their owner alone.

        Raises:
            StoreTrouble: if somebody else could have written there.
            OSError: if the system refuses.
        """
        self.root.parent.mkdir(parents=True, exist_ok=True)
        for folder in (self.root, self.graphs, self.results):
            self.folder(folder)
        self.check_owner()
        with contextlib.suppress(OSError):
            self.root.chmod(0o700)

    def check_owner(self) -> None:
        """Refuse a shelf that others can write to: what they put there is not to be believed.

        Raises:
            StoreTrouble: for another owner, or permissions beyond the owner's.
        """
        if not hasattr(os, "geteuid") or not self.root.exists():
            return
        about = self.root.stat()
        if about.st_uid != os.geteuid():
            raise StoreTrouble(f"{self.root} belongs to another user")
        if about.st_mode & (stat.S_IWGRP | stat.S_IWOTH):
            raise StoreTrouble(f"{self.root} is open for writing to others")

    def folder(self, place: Path) -> None:
        """Make one folder for its owner alone, if there is none."""
        with contextlib.suppress(FileExistsError):
            place.mkdir(mode=0o700)

    def keep_graph(
        self, graph: Graph, identity: Identity, options: Any, watch: Watch
    ) -> tuple[Graph, str]:
        """Keep a graph; it is handed back over the files just written, with where it is kept.

        Raises:
            StoreTrouble, OSError: if it cannot be kept; nothing is left behind.
            Interrupted: if the watch was cancelled.
        """
        from kingpost.core.store.graphs import read_graph, write_graph

        self.prepare()
        self.make_room(estimate(graph))
        more = {
            "key": identity.key,
            "inputs": [list(pair) for pair in identity.files],
            "options": plain_options(options),
        }
        place = self.graphs / identity.key
        with making(place, watch) as draft:
            write_graph(graph, draft, watch, more)
        self._drop_older(graph.origin.files, more)
        kept, about = read_graph(place, watch, identity.key)
        return kept, str(about["content"])

    def _drop_older(self, files: Sequence[str], made: dict[str, Any]) -> None:
        """Take away copies of the same tables as they were before, which nobody will ask for."""
        paths = [path for path, _ in made["inputs"]]
        for entry in self.entries():
            about = entry.about
            if (
                entry.kind == "graph"
                and about
                and about["key"] != made["key"]
                and about["options"] == made["options"]
                and [path for path, _ in about["inputs"]] == paths
                and tuple(about["origin"]["files"]) == tuple(files)
            ):
                self.take_away(entry)

    def make_room(self, size: int) -> None:
        """Let go of what was used longest ago until ``size`` more bytes fit.

        Raises:
            StoreTrouble: if they cannot fit.
            OSError: if the system cannot tell.
        """
        if size > self.limit:
            raise StoreTrouble(
                f"it would take {in_bytes(size)}, the shelf holds {in_bytes(self.limit)}"
            )
        for parent in (self.graphs, self.results, *_folders(self.results)):
            sweep(parent)
        entries = sorted(self.entries(about=False), key=lambda entry: entry.used)
        total = sum(entry.bytes for entry in entries)
        for entry in entries:
            if total + size <= self.limit and self._free() >= size + SPARE:
                break
            self.take_away(entry)
            total -= entry.bytes
        if self._free() < size + SPARE:
            raise StoreTrouble(
                f"it would take {in_bytes(size)}, and the disk has {in_bytes(self._free())} left"
            )

    def _free(self) -> int:
        return shutil.disk_usage(self.root).free

    def used(self, place: Path) -> None:
        """Note that something was of use just now."""
        with contextlib.suppress(OSError):
            os.utime(place)

    # ---- looking and clearing ----------------------------------------------------------------

    def entries(self, *, about: bool = True) -> list[Entry]:
        """Everything that is kept, graphs first, the latest used first.

        Manifests are read only if ``about``.
        """
        found = [_entry("graph", place, about) for place in _folders(self.graphs)]
        for content in _folders(self.results):
            found.extend(_entry("result", place, about) for place in _folders(content))
        kept = [entry for entry in found if entry is not None]
        return sorted(kept, key=lambda entry: (entry.kind, -entry.used, entry.place))

    def take_away(self, entry: Entry) -> None:
        """Take one entry off the shelf; whoever reads it at the moment keeps what was opened."""
        remove(entry.place)
        if entry.kind == "result":
            with contextlib.suppress(OSError):
                entry.place.parent.rmdir()  # only if it was the last

    def chosen(self, names: Sequence[str] = ()) -> list[Entry]:
        """All entries, or the graphs of these names (or keys) with their results.

        Raises:
            StoreTrouble: for a name that nothing on the shelf has.
        """
        entries = self.entries()
        if not names:
            return entries
        contents, places = set(), set()
        for name in names:
            meant = [entry for entry in entries if _is_called(entry, name)]
            if not meant:
                raise StoreTrouble(f"nothing on the shelf is called {name}")
            places |= {entry.place for entry in meant}
            contents |= {entry.content for entry in meant if entry.kind == "graph"} - {""}
        return [e for e in entries if e.place in places or e.content in contents]

    def clear(self, names: Sequence[str] = ()) -> list[Entry]:
        """Take away what :meth:`chosen` names, by default all; what has gone.

        Raises:
            StoreTrouble: for a name that nothing on the shelf has.
        """
        gone = self.chosen(names)
        for entry in gone:
            self.take_away(entry)
        if not names:
            for folder in (self.graphs, self.results, *_folders(self.results)):
                sweep(folder)
        return gone

    def why(self, error: Exception) -> str:
        """A reason in words, for a note."""
        if isinstance(error, OSError):
            if error.errno in (errno.ENOSPC, errno.EDQUOT):
                return f"the disk of {self.root} is full"
            return f"{self.root} cannot be written to ({error.strerror or error})"
        return str(error)


def default_folder() -> Path:
    """``$KINGPOST_CACHE_DIR/shelf``, else ``kingpost/shelf`` in the user's cache folder."""
    own = os.environ.get("KINGPOST_CACHE_DIR")
    if own:
        return Path(own) / "shelf"
    from platformdirs import user_cache_path

    return user_cache_path("kingpost", appauthor=False) / "shelf"


def estimate(graph: Graph) -> int:
    """About how many bytes a graph will take on the disk."""
    rows = [graph.outward] if graph.outward is graph.inward else [graph.outward, graph.inward]
    size = sum(
        array.nbytes
        for one in rows
        for array in (one.offsets, one.neighbours, one.weights)
        if array is not None
    )
    size += 24 * graph.n + int(graph.labels.nbytes)
    size += int(graph.attributes.nbytes) if graph.attributes is not None else 0
    return size + 65_536


def plain_options(options: Any) -> dict[str, Any]:
    """Loading options by name."""
    import dataclasses

    return {item.name: getattr(options, item.name) for item in dataclasses.fields(options)}


def in_bytes(size: float) -> str:
    """``3.4 MB``: a size in words, in powers of 1000."""
    for unit in ("bytes", "kB", "MB", "GB"):
        if size < 1000:
            return f"{size:,.0f} {unit}" if unit == "bytes" else f"{size:,.1f} {unit}"
        size /= 1000
    return f"{size:,.1f} TB"


def _folders(parent: Path) -> list[Path]:
    try:
        with os.scandir(parent) as items:
            return [Path(item.path) for item in items
                    if item.is_dir() and not item.name.startswith(".")]  # fmt: skip
    except OSError:
        return []


def _entry(kind: str, place: Path, read: bool) -> Entry | None:
    try:
        with os.scandir(place) as items:
            size = sum(item.stat().st_size for item in items if item.is_file())
        used = place.stat().st_mtime
    except OSError:
        return None  # somebody took it away this moment
    about: dict[str, Any] = {}
    if read:
        with contextlib.suppress(StoreTrouble):
            about = read_manifest(place, kind)["about"]
    return Entry(kind, place, size, used, about)


def _is_called(entry: Entry, name: str) -> bool:
    return entry.name == name or (len(name) >= 6 and entry.place.name.startswith(name))
