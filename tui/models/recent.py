"""Tables opened lately: what the first screen offers.  Imports nothing heavy."""

from __future__ import annotations

import glob
import os
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from kingpost.tui import places

MOST = 40
_FORMAT = 1


@dataclass(frozen=True)
class Recent:
    """One entry: the tables, when they were opened, how large the graph was, how it was read."""

    paths: tuple[str, ...]
    when: str = ""
    nodes: int = 0
    edges: int = 0
    options: Mapping[str, Any] = field(default_factory=dict)
    size: int = -1  # bytes now, -1 where a path is missing; filled in by :func:`read`

    @property
    def missing(self) -> bool:
        """Whether a path is no longer there."""
        return self.size < 0


def read() -> list[Recent]:
    """The entries, newest first, with their sizes now; for a job, as a disk may be slow.

    Raises:
        places.StateError: if the file cannot be read or is none of ours.
    """
    path = places.state_folder() / "recent.json"
    value = places.read_json(path)
    if value is None:
        return []
    listed = value.get("tables") if isinstance(value, dict) else None
    if not isinstance(listed, list) or value.get("format") != _FORMAT:
        raise places.StateError(f"the list of recent tables is of another version: {path}")
    found = []
    for item in listed[:MOST]:
        try:
            entry = Recent(
                tuple(str(one) for one in item["paths"]),
                str(item["when"]),
                int(item["nodes"]),
                int(item["edges"]),
                dict(item["options"]),
            )
        except (KeyError, TypeError, ValueError):
            raise places.StateError(f"the list of recent tables is damaged: {path}") from None
        if entry.paths:
            found.append(
                Recent(
                    entry.paths,
                    entry.when,
                    entry.nodes,
                    entry.edges,
                    entry.options,
                    _size(entry.paths),
                )
            )
    return found


def _size(paths: Sequence[str]) -> int:
    total = 0
    for path in paths:
        names = glob.glob(path) if glob.has_magic(path) and not os.path.exists(path) else [path]
        try:
            total += sum(os.stat(name).st_size for name in names if not os.path.isdir(name))
        except (OSError, ValueError):
            return -1
        if not names:
            return -1
    return total


def note(paths: Sequence[str], nodes: int, edges: int, options: Mapping[str, Any]) -> None:
    """Put tables first on the list.

    Raises:
        places.StateError: if the list cannot be written.
    """
    try:
        entries = read()
    except places.StateError:
        entries = []  # a damaged list is begun anew: nothing in it is anybody's work
    fresh = Recent(tuple(paths), places.now(), nodes, edges, options)
    entries = [fresh, *(entry for entry in entries if entry.paths != fresh.paths)][:MOST]
    places.write_json(
        places.state_folder() / "recent.json",
        {
            "format": _FORMAT,
            "tables": [
                {
                    "paths": list(entry.paths),
                    "when": entry.when,
                    "nodes": entry.nodes,
                    "edges": entry.edges,
                    "options": dict(entry.options),
                }
                for entry in entries
            ],
        },
    )
