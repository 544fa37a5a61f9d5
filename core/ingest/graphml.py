"""GraphML, read by networkx: edges with their data, and the data of the nodes.

The whole document and the graph networkx makes of it are held in memory, so there is a limit.
Before networkx sees the document it goes through a parser that refuses a document type: no
entity is ever expanded, and nothing outside the file is looked at.
"""

from __future__ import annotations

import io
import warnings
from dataclasses import replace
from typing import Any
from xml.parsers import expat

import pyarrow as pa

from kingpost.core.errors import InputError
from kingpost.core.ingest.formats import Source
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, parts_of_table
from kingpost.core.text import visible
from kingpost.core.watch import Watch

MOST_BYTES = 100_000_000
_BLOCK = 1 << 20
_NEEDED = {"edge": ("source", "target"), "node": ("id",)}


def open_graphml(source: Source, options: LoadOptions, watch: Watch) -> Part:
    """Read a GraphML file; an undirected one is read both ways if edges are directed.

    Edges become the columns ``source``, ``target`` and one for each sort of data; the data of
    nodes becomes the part's ``attributes``.

    Raises:
        InputError: if it is larger than ``MOST_BYTES``, holds a document type, or is no GraphML.
        Interrupted: if the watch is cancelled.
    """
    document = _document(source, watch)
    _check(source, document, watch)
    watch.report("reading GraphML", 0, len(document), "bytes")
    import networkx as nx

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            graph = nx.read_graphml(io.BytesIO(document), node_type=str, force_multigraph=True)
    except Exception as error:  # networkx raises whatever its parser meets
        raise InputError(
            f"{source.name} cannot be read as GraphML: {visible(first_line(error), 120)}"
        ) from None
    watch.check()
    edges = [(u, v, data) for u, v, data in graph.edges(data=True)]
    if not edges:
        raise InputError(f"{source.name} holds no edges; a graph needs at least one")
    notes = []
    if not graph.is_directed() and options.directed:
        mirrored = [(v, u, data) for u, v, data in edges if u != v]
        notes.append(
            f"{source.name} is undirected: {len(mirrored):,} of its {len(edges):,} edges lead from "
            "one node to another and were read both ways"
        )
        edges += mirrored
    columns = {"source": pa.array([e[0] for e in edges]), "target": pa.array([e[1] for e in edges])}
    columns |= _data(source, [e[2] for e in edges], set(columns))
    nodes = {"id": pa.array(list(graph.nodes), pa.string())}
    nodes |= _data(source, [data for _, data in graph.nodes(data=True)], set(nodes))
    part = parts_of_table(pa.table(columns), source.name)[0]
    attributes = pa.table(nodes) if len(nodes) > 1 else None
    return replace(part, notes=tuple(notes), attributes=attributes)


def _document(source: Source, watch: Watch) -> bytes:
    pieces, size = [], 0
    try:
        with source.stream() as stream:
            while block := bytes(stream.read(_BLOCK)):
                watch.check()
                size += len(block)
                if size > MOST_BYTES:
                    raise InputError(
                        f"{source.name} holds more than {MOST_BYTES:,} bytes; GraphML is read "
                        "whole and up to that size only: write the edges as Parquet or CSV"
                    )
                pieces.append(block)
    except (pa.ArrowException, OSError) as error:
        raise InputError(f"{source.name} is damaged: {first_line(error)}") from None
    return b"".join(pieces)


def _check(source: Source, document: bytes, watch: Watch) -> None:
    """Refuse a document type, and whatever is no well-formed GraphML document."""
    parser = expat.ParserCreate()
    roots: list[str] = []

    def refuse(*_: Any) -> None:
        raise InputError(
            f"{source.name} line {parser.CurrentLineNumber:,} declares a document type or an "
            "entity, which is not read; take the declaration out"
        )

    def begin(name: str, given: dict[str, str]) -> None:
        if not roots:
            roots.append(name)
        # networkx would make a node called None of what is missing.
        lacking = [word for word in _NEEDED.get(name.rpartition(":")[2], ()) if word not in given]
        if lacking:
            raise InputError(
                f"{source.name} line {parser.CurrentLineNumber:,} holds <{name}> without its "
                f"{lacking[0]}; it cannot be read as GraphML"
            )

    parser.StartDoctypeDeclHandler = refuse
    parser.EntityDeclHandler = refuse
    parser.StartElementHandler = begin
    try:
        for start in range(0, len(document), _BLOCK):
            watch.check()
            parser.Parse(document[start : start + _BLOCK], False)
        parser.Parse(b"", True)
    except expat.ExpatError as error:
        raise InputError(
            f"{source.name} line {error.lineno:,} is no well-formed XML: "
            f"{expat.ErrorString(error.code)}"
        ) from None
    if roots[0].rpartition(":")[2] != "graphml":
        raise InputError(f"{source.name} holds <{visible(roots[0], 40)}>, which is no GraphML")


def _data(source: Source, rows: list[dict[str, Any]], taken: set[str]) -> dict[str, pa.Array]:
    """One column for each sort of data, null where an element has none."""
    names = list(dict.fromkeys(name for row in rows for name in row))
    columns: dict[str, pa.Array] = {}
    for name in names:
        values = [row.get(name) for row in rows]
        called = str(name)
        while called in taken or called in columns:
            called += "_"
        try:
            columns[called] = pa.array(values)
        except (pa.ArrowException, OverflowError):
            columns[called] = pa.array([None if v is None else str(v) for v in values])
    return columns
