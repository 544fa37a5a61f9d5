"""Marks: the nodes put on a shortlist, each with a note, kept from sitting to sitting.

Nodes are kept by the text of their ids, so that marks outlive a new version of the table; those
that the present graph does not hold are kept for the day it does.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from kingpost.core.labels import as_text
from kingpost.core.text import id_text
from kingpost.tui import places

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.tui.models.sitting import Sitting

NOTE_LIMIT = 1_000
MOST_MARKS = 10_000
_FORMAT = 1
_MOST_FILES = 500  # files of marks looked through for a graph that has moved


@dataclass
class Mark:
    """One node put on the shortlist; ``node`` is None where the present graph has none such."""

    name: str
    note: str = ""
    when: str = ""
    node: int | None = None


class Marks:
    """The shortlist of one graph, in the order of marking."""

    def __init__(self, marks: Sequence[Mark] = ()) -> None:
        self._marks = {mark.name: mark for mark in marks}
        self._by_node = {mark.node: mark for mark in marks if mark.node is not None}
        # What was taken off in this sitting: marked again, it has its note again.
        self._taken_off: dict[str, Mark] = {}

    def __len__(self) -> int:
        return len(self._marks)

    def __iter__(self) -> Iterator[Mark]:
        return iter(self._marks.values())

    def __contains__(self, node: object) -> bool:
        return node in self._by_node

    def of(self, node: int) -> Mark | None:
        """The mark of a node."""
        return self._by_node.get(node)

    def holds(self, mark: Mark) -> bool:
        """Whether a mark is still on the list."""
        return self._marks.get(mark.name) is mark

    def add(self, graph: Graph, node: int) -> Mark:
        """Mark a node; with the note it had if it was marked before in this sitting.

        Raises:
            places.StateError: if there are too many to be a shortlist.
        """
        found = self._by_node.get(node)
        if found is not None:
            return found
        if len(self._marks) >= MOST_MARKS:
            raise places.StateError(f"a shortlist holds at most {MOST_MARKS:,} marks; remove some")
        name = id_text(graph.label(node))
        mark = self._taken_off.pop(name, None) or Mark(name, when=places.now(), node=node)
        self.put(mark)
        return mark

    def put(self, mark: Mark) -> None:
        """Put a mark on the list, again."""
        self._taken_off.pop(mark.name, None)
        self._marks[mark.name] = mark
        if mark.node is not None:
            self._by_node[mark.node] = mark

    def remove(self, mark: Mark) -> None:
        """Take a mark off the list."""
        if self._marks.pop(mark.name, None) is not None:
            self._taken_off[mark.name] = mark
        if mark.node is not None:
            self._by_node.pop(mark.node, None)

    def as_json(self) -> list[dict[str, str]]:
        """The list as it is kept."""
        return [{"node": mark.name, "note": mark.note, "when": mark.when} for mark in self]


def marks_file(paths: Sequence[str]) -> Path:
    """Where the marks of these tables are kept."""
    return places.state_folder() / "marks" / f"{places.key_of(paths)}.json"


def save(
    rows: Sequence[dict[str, str]], paths: Sequence[str], graph: Graph, fingerprint: str | None
) -> None:
    """Write marks (see :meth:`Marks.as_json`) of these tables; none where there never were any.

    Raises:
        places.StateError: if they cannot be written.
    """
    path = marks_file(paths)
    if not rows and not path.exists():
        return
    places.write_json(
        path,
        {
            "format": _FORMAT,
            "paths": [os.path.realpath(item) for item in paths],
            "nodes": graph.n,
            "edges": graph.m,
            "fingerprint": fingerprint,
            "marks": list(rows),
        },
    )


def read(paths: Sequence[str]) -> list[Mark]:
    """The marks kept for these paths, not yet looked up in a graph.

    Raises:
        places.StateError: if the file cannot be read or is none of ours.
    """
    path = marks_file(paths)
    return _marks_in(places.read_json(path), path)


def read_moved(graph: Graph) -> list[Mark]:
    """The marks of the same graph under other paths, by its fingerprint; the newest ones.

    The fingerprint takes a pass over the graph: it is worked out only if some file tells of a
    graph of the same size.
    """
    folder = places.state_folder() / "marks"
    try:
        files = sorted(folder.glob("*.json"), key=lambda file: -file.stat().st_mtime)
    except OSError:
        return []
    size = (graph.n, graph.m)
    for file in files[:_MOST_FILES]:
        try:
            value = places.read_json(file)
            if not isinstance(value, dict) or not value.get("fingerprint"):
                continue
            same_size = (value.get("nodes"), value.get("edges")) == size
            if same_size and value["fingerprint"] == graph.fingerprint:
                return _marks_in(value, file)
        except places.StateError:
            continue
    return []


def _marks_in(value: Any, path: Path) -> list[Mark]:
    if value is None:
        return []
    listed = value.get("marks") if isinstance(value, dict) else None
    if not isinstance(listed, list) or value.get("format") != _FORMAT:
        raise places.StateError(f"{path} holds no marks that this version can read; left alone")
    marks = []
    for item in listed[:MOST_MARKS]:
        if not isinstance(item, dict) or not isinstance(item.get("node"), str):
            raise places.StateError(f"{path} is damaged: a mark names no node; left alone")
        note, when = item.get("note", ""), item.get("when", "")
        marks.append(Mark(item["node"], str(note)[:NOTE_LIMIT], str(when)[:40]))
    return marks


def locate(graph: Graph, marks: Sequence[Mark]) -> Marks:
    """Look the marked names up in a graph: one pass over its ids, to be run in a job."""
    if marks and graph.n:
        import pyarrow as pa
        import pyarrow.compute as pc

        texts = as_text(graph.labels)
        wanted = pa.array([mark.name for mark in marks], texts.type)
        hits = np.flatnonzero(pc.is_in(texts, value_set=wanted).to_numpy(zero_copy_only=False))
        by_name = {id_text(graph.label(int(node))): int(node) for node in hits}
        for mark in marks:
            mark.node = by_name.get(mark.name)
    return Marks(marks)


def csv_table(marks: Sequence[Mark], sitting: Sitting) -> bytes:
    """The shortlist as CSV: node, note, and the rank in every measure shown (``4-9`` for a
    range), empty for a node that this graph does not hold.  Names and notes are written exactly.
    """
    import csv
    import io

    measures = sitting.measures_shown()
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(["node", "note", *(f"rank_{name}" for name in measures)])
    for mark in marks:
        ranks = rank_texts(mark, sitting)
        writer.writerow([mark.name, mark.note, *(ranks.get(name, "") for name in measures)])
    return out.getvalue().encode("utf-8", "surrogateescape")


def rank_texts(mark: Mark, sitting: Sitting) -> dict[str, str]:
    """Measure -> rank, or range of ranks, of a marked node."""
    if mark.node is None:
        return {}
    return {
        name: str(first) if first == last else f"{first}-{last}"
        for name, first, last in sitting.ranks(mark.node).values()
    }
