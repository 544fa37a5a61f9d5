"""Packs: a compiled graph with its results in a folder of its own, to be carried elsewhere."""

from __future__ import annotations

import dataclasses
import os
import shutil
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from kingpost.core.errors import InputError, OutputError, SettingsError
from kingpost.core.graph import Graph
from kingpost.core.ingest.about import ColumnAbout, TableAbout
from kingpost.core.store.graphs import checked_ranges, read_graph, write_graph
from kingpost.core.store.results import KIND, Drawer
from kingpost.core.store.sealed import (
    FORMAT,
    MANIFEST,
    StoreTrouble,
    is_pack,
    making,
    read_files,
    read_manifest,
)
from kingpost.core.store.shelf import Shelf, plain_options
from kingpost.core.watch import Watch

RESULTS = "results"


def pack_among(paths: Sequence[str]) -> str | None:
    """The pack that ``paths`` name, or None.

    Raises:
        InputError: for a pack together with anything else: it is a whole graph.
    """
    packs = [path for path in paths if is_pack(path)]
    if not packs:
        return None
    if len(paths) > 1:
        raise InputError(f"{packs[0]} is a pack, a whole graph by itself; name it alone")
    return packs[0]


def open_pack(
    path: str, options: Any = None, watch: Watch | None = None, shelf: Shelf | None = None
) -> Graph:
    """Open a pack; results solved on it are kept on ``shelf``, never in the pack.

    Raises:
        InputError: if it is damaged, or was made by another version.
        SettingsError: for loading options other than those it was made with.
        Interrupted: if the watch was cancelled.
    """
    watch = watch or Watch()
    try:
        graph, about = read_graph(Path(path), watch)
        checked_ranges(graph)
    except StoreTrouble as error:
        raise InputError(
            f"the pack {path} cannot be used: {error}; make it again with kingpost pack"
        ) from None
    if options is not None:
        _same_options(path, options, about.get("options", {}))
    also = Path(path) / RESULTS
    graph.__dict__["drawer"] = Drawer(str(about["content"]), shelf, also if also.is_dir() else None)
    return graph


def describe(path: str) -> TableAbout:
    """What the edge table of a pack held, as it was when the pack was made.

    Raises:
        InputError: if it is damaged.
    """
    try:
        table = dict(read_manifest(Path(path), "graph")["about"]["table"])
        columns = tuple(ColumnAbout(**column) for column in table.pop("columns"))
        return TableAbout(columns=columns, **table)
    except (StoreTrouble, KeyError, TypeError) as error:
        raise InputError(
            f"the pack {path} cannot be used: {error}; make it again with kingpost pack"
        ) from None


def check_place(folder: str) -> None:
    """Refuse early what a pack could not be written to.

    Raises:
        OutputError: if there is something other than a pack or an empty folder, or no folder
            around it.
    """
    place = Path(folder)
    if place.is_dir():
        if not is_pack(place) and any(place.iterdir()):
            raise OutputError(f"{folder} is a folder that holds other things; name a new one")
    elif os.path.lexists(place):
        raise OutputError(f"{folder} is a file; name a new folder")
    parent = place.absolute().parent
    if not parent.is_dir():
        raise OutputError(f"{folder} cannot be written: there is no folder {parent}")
    if not os.access(parent, os.W_OK):
        raise OutputError(f"{folder} cannot be written: {parent} is not open for writing")


def write_pack(
    graph: Graph,
    folder: str,
    options: Any,
    table: TableAbout,
    watch: Watch | None = None,
) -> int:
    """Write a graph, with the results kept of it, as a pack; the number of results.

    ``table`` describes the edge table for later audits.  The pack appears whole or not at all;
    a pack that stood there is replaced.

    Raises:
        OutputError: if it cannot be written.
        Interrupted: if the watch was cancelled.
    """
    watch = watch or Watch()
    check_place(folder)
    place = Path(folder).absolute()
    more = {"options": plain_options(options), "table": dataclasses.asdict(table)}
    try:
        with making(place, watch, private=False, over=is_pack) as draft:
            write_graph(graph, draft, watch, more)
            return _copy_results(graph, draft.folder, watch)
    except OSError as error:
        raise OutputError(f"{folder} cannot be written: {error.strerror or error}") from None
    except StoreTrouble as error:
        raise OutputError(f"{folder} cannot be written: {error}") from None


def _copy_results(graph: Graph, into: Path, watch: Watch) -> int:
    """Copy the sound results of this very graph; nothing says that they must be there."""
    drawer = graph.drawer
    if drawer is None or read_manifest(into, "graph")["about"]["content"] != drawer.content:
        return 0
    sources = [drawer.also] if drawer.also is not None else []
    if drawer.shelf is not None:
        sources.append(drawer.shelf.results / drawer.content)
    names: set[str] = set()
    for folder in sources:
        for place in sorted(folder.iterdir()) if folder.is_dir() else []:
            if place.name.startswith(".") or place.name in names:
                continue
            try:
                manifest = read_manifest(place, KIND)
                read_files(place, manifest, watch)
            except StoreTrouble:
                continue
            target = into / RESULTS / place.name
            target.mkdir(parents=True)
            for name in (*manifest["files"], MANIFEST):
                watch.check()
                with (place / name).open("rb") as source, (target / name).open("xb") as sink:
                    shutil.copyfileobj(source, sink)
                    sink.flush()
                    os.fsync(sink.fileno())
            names.add(place.name)
    return len(names)


def _same_options(path: str, options: Any, made: dict[str, Any]) -> None:
    plain = type(options)()
    for item in dataclasses.fields(options):
        value = getattr(options, item.name)
        if value in (getattr(plain, item.name), made.get(item.name)):
            continue
        raise SettingsError(
            f"{path} is a pack, made with {item.name}={made.get(item.name)}; loading options are "
            "for edge tables: leave them out, or pack the table again"
        )


__all__ = ["FORMAT", "check_place", "describe", "open_pack", "pack_among", "write_pack"]
