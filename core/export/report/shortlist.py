"""The nodes a report tells more about: a file of names and notes, or names alone.

The file is CSV with the columns ``node`` and ``note`` (others are passed over), or JSON: a list of
``{"node": ..., "note": ...}``, or an object whose ``marks`` is one, as the screen keeps them.
"""

from __future__ import annotations

import csv
import json
import os
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from kingpost.core.errors import InputError
from kingpost.core.graph import Graph
from kingpost.core.labels import as_text
from kingpost.core.text import visible

MOST = 200  # a report that a person reads
NOTE_LIMIT = 1_000
_BYTES = 10_000_000


@dataclass(frozen=True)
class Entry:
    """One node of the shortlist; ``node`` is -1 where the graph holds none of that name."""

    name: str
    note: str = ""
    node: int = -1


def read_shortlist(path: str) -> list[tuple[str, str]]:
    """Names and notes from a CSV or JSON file.

    Raises:
        InputError: for a file that is missing, too large or of neither kind.
    """
    try:
        if os.path.getsize(path) > _BYTES:
            raise InputError(f"{path} is {os.path.getsize(path):,} bytes; a shortlist is short")
        with open(path, encoding="utf-8-sig", newline="") as source:
            text = source.read()
    except FileNotFoundError:
        raise InputError(f"there is no file {path}") from None
    except OSError as trouble:
        raise InputError(f"{path} cannot be read: {trouble.strerror or trouble}") from trouble
    except UnicodeDecodeError:
        raise InputError(f"{path} is not UTF-8 text; a shortlist is CSV or JSON") from None
    if text.lstrip()[:1] in ("[", "{"):
        return _json(text, path)
    return _csv(text, path)


def _csv(text: str, path: str) -> list[tuple[str, str]]:
    try:
        rows = csv.DictReader(text.splitlines(keepends=True), strict=True)
        if "node" not in (rows.fieldnames or ()):
            have = ", ".join(visible(name or "", 40) for name in rows.fieldnames or ())
            raise InputError(
                f"{path} has no column node (its first line reads {have or 'nothing'}); a "
                "shortlist has the columns node and note"
            )
        return [(row["node"] or "", row.get("note") or "") for row in rows]
    except csv.Error as trouble:
        raise InputError(f"{path} cannot be read as CSV: {trouble}") from None


def _json(text: str, path: str) -> list[tuple[str, str]]:
    try:
        value: Any = json.loads(text)
    except (ValueError, RecursionError) as trouble:
        raise InputError(f"{path} cannot be read as JSON: {trouble}") from None
    listed = value.get("marks") if isinstance(value, dict) else value
    if not isinstance(listed, list):
        raise InputError(f"{path} holds no list of marks; a shortlist lists node and note")
    found = []
    for number, item in enumerate(listed, 1):
        if isinstance(item, str):
            item = {"node": item}
        if not isinstance(item, dict) or not isinstance(item.get("node"), str | int):
            raise InputError(f"{path}: entry {number:,} names no node")
        found.append((str(item["node"]), str(item.get("note") or "")))
    return found


def entries(graph: Graph, listed: list[tuple[str, str]]) -> list[Entry]:
    """Names looked up in a graph; the first of repeated names counts.

    Raises:
        InputError: for more than :data:`MOST` names.
    """
    notes: dict[str, str] = {}
    for name, note in listed:
        notes.setdefault(name, note[:NOTE_LIMIT])
    if len(notes) > MOST:
        raise InputError(f"the shortlist names {len(notes):,} nodes; a report takes {MOST}")
    if not notes or not graph.n:
        return [Entry(name, note) for name, note in notes.items()]
    texts = as_text(graph.labels)
    wanted = pa.array([n.encode("utf-8", "replace").decode() for n in notes], texts.type)
    hits = np.flatnonzero(pc.is_in(texts, value_set=wanted).to_numpy(zero_copy_only=False))
    by_name = {texts[int(node)].as_py(): int(node) for node in hits}
    return [Entry(name, note, by_name.get(name, -1)) for name, note in notes.items()]
