"""A Graph as the files of a sealed folder, and back over the memory map."""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa

from kingpost.core.graph import Account, Adjacency, Graph, Origin
from kingpost.core.store.code import libraries, version_of
from kingpost.core.store.sealed import Draft, StoreTrouble, hash_text, read_files, read_manifest
from kingpost.core.structure import Structure, structure_of
from kingpost.core.watch import Watch

KIND = "graph"


def write_graph(graph: Graph, draft: Draft, watch: Watch, more: Mapping[str, Any]) -> None:
    """Write a graph with its structure; ``more`` goes into the manifest.

    Raises:
        StoreTrouble: for labels or attributes that Arrow IPC cannot hold.
        OSError: if the system refuses.
        Interrupted: if the watch was cancelled.
    """
    structure = structure_of(graph, watch)
    try:
        draft.arrays("labels.arrow", {"id": graph.labels})
        _write_adjacency(draft, "outward", graph.outward)
        if graph.inward is not graph.outward:
            _write_adjacency(draft, "inward", graph.inward)
        if graph.attributes is not None:
            table = graph.attributes.unify_dictionaries()
            draft.table("attributes.arrow", table)
    except (pa.ArrowException, NotImplementedError) as error:
        raise StoreTrouble(f"Arrow cannot write it ({str(error).splitlines()[0]})") from None
    content = content_of(graph, draft.digests)
    draft.arrays("structure_nodes.arrow", {"component": structure.component,
                                           "order": structure.order})  # fmt: skip
    draft.arrays("structure_starts.arrow", {"start": structure.starts})
    draft.arrays("structure_cyclic.arrow", {"component": structure.cyclic,
                                            "inner": structure.inner})  # fmt: skip
    draft.seal(
        KIND,
        {
            "name": graph.origin.name,
            "n": graph.n,
            "m": graph.m,
            "stored": graph.stored,
            "loops": graph.loop_count,
            "directed": graph.directed,
            "attributes": graph.attributes is not None,
            "account": dataclasses.asdict(graph.account),
            "origin": dataclasses.asdict(graph.origin),
            "content": content,
            "made": now(),
            "by": version_of("kingpost"),
            "libraries": libraries(),
            **more,
        },
    )


def read_graph(place: Path, watch: Watch, key: str | None = None) -> tuple[Graph, dict[str, Any]]:
    """The graph in a sealed folder and what its manifest says of it.

    Labels, attributes and adjacency stay in the files; the system reads them in and drops them
    again as memory allows.

    Raises:
        Missing: if there is no graph at all.
        StoreTrouble: if what there is must not be believed.
        Interrupted: if the watch was cancelled.
    """
    manifest = read_manifest(place, KIND)
    about = manifest["about"]
    if key is not None and about.get("key") != key:
        raise StoreTrouble("it was made from something else")
    opened = read_files(place, manifest, watch)
    try:
        return _assembled(about, opened), about
    except (pa.ArrowException, ValueError, KeyError, TypeError, IndexError) as error:
        raise StoreTrouble(f"its parts do not fit together ({error})") from None


def now() -> str:
    """This moment in ISO 8601, UTC, to the second."""
    return dt.datetime.now(dt.UTC).isoformat(timespec="seconds").replace("+00:00", "Z")


def content_of(graph: Graph, digests: Mapping[str, str]) -> str:
    """40 hexadecimal digits of everything an answer may depend on or say of a graph.

    Where its files lay plays no part: results go with a graph wherever it is kept.
    """
    account, origin = dataclasses.asdict(graph.account), dataclasses.asdict(graph.origin)
    for name in ("examples", "notes"):
        account.pop(name)
    for name in ("files", "nodes_file"):
        origin.pop(name)
    return hash_text([dict(digests), graph.directed, account, origin])


def _write_adjacency(draft: Draft, name: str, rows: Adjacency) -> None:
    draft.arrays(f"{name}_offsets.arrow", {"offset": rows.offsets})
    columns: dict[str, Any] = {"neighbour": rows.neighbours}
    if rows.weights is not None:
        columns["weight"] = rows.weights
    draft.arrays(f"{name}_edges.arrow", columns)


def _assembled(about: Mapping[str, Any], opened: Mapping[str, Any]) -> Graph:
    n, stored = about["n"], about["stored"]
    labels = opened["labels.arrow"]().column("id")
    labels = labels.chunk(0) if labels.num_chunks == 1 else labels.combine_chunks()
    if len(labels) != n:
        raise ValueError("labels")
    outward = _adjacency(opened, "outward", n, stored)
    inward = _adjacency(opened, "inward", n, stored) if about["directed"] else outward
    attributes = opened["attributes.arrow"]() if about["attributes"] else None
    if attributes is not None and attributes.num_rows != n:
        raise ValueError("attributes")
    account, origin = dict(about["account"]), dict(about["origin"])
    graph = Graph(
        labels=labels,
        outward=outward,
        inward=inward,
        directed=about["directed"],
        attributes=attributes,
        account=Account(**account),
        origin=Origin(**origin),
    )
    nodes = opened["structure_nodes.arrow"]()
    cyclic = opened["structure_cyclic.arrow"]()
    structure = Structure(
        component=_array(nodes, "component", np.uint32, n),
        order=_array(nodes, "order", np.uint32, n),
        starts=_array(opened["structure_starts.arrow"](), "start", np.int64),
        cyclic=_array(cyclic, "component", np.int64),
        inner=_array(cyclic, "inner", np.int64),
        stored=stored,
        _outward=outward,
    )
    # What is worked out on first use elsewhere is known here.
    graph.__dict__.update(structure=structure, m=about["m"], loop_count=about["loops"])
    return graph


def _adjacency(opened: Mapping[str, Any], name: str, n: int, stored: int) -> Adjacency:
    edges = opened[f"{name}_edges.arrow"]()
    weighted = "weight" in edges.column_names
    return Adjacency(
        _array(opened[f"{name}_offsets.arrow"](), "offset", np.int64, n + 1),
        _array(edges, "neighbour", np.uint32, stored),
        _array(edges, "weight", np.float64, stored) if weighted else None,
    )


def _array(table: Any, name: str, kind: Any, size: int | None = None) -> Any:
    """A column as a numpy array over the same memory."""
    column = table.column(name)
    if column.num_chunks == 0:
        found = np.empty(0, dtype=kind)
    else:
        if column.num_chunks != 1:
            raise ValueError(f"{name} is in pieces")
        found = column.chunk(0).to_numpy(zero_copy_only=True)
    if found.dtype != kind or (size is not None and len(found) != size):
        raise ValueError(name)
    return found


def checked_ranges(graph: Graph) -> None:
    """Refuse numbers that would lead loops outside their arrays, or break what they rely on.

    A checksum says that a file is as it was written, not by whom: a graph that came from
    elsewhere is looked through once more.

    Raises:
        StoreTrouble: if any number is outside its range.
    """
    n, structure = graph.n, graph.structure
    for rows in (graph.outward, graph.inward):
        _check(_is_partition(rows.offsets, len(rows.neighbours)), "offsets")
        _check(len(rows.neighbours) == 0 or int(rows.neighbours.max()) < n, "neighbours")
        if rows.weights is not None and len(rows.weights):
            least, greatest = float(rows.weights.min()), float(rows.weights.max())
            _check(least > 0 and np.isfinite(greatest), "weights")
    _check(_is_partition(structure.starts, n), "structure")
    count = structure.count
    if n:
        _check(int(structure.component.max()) < count, "structure")
        _check(int(structure.order.max()) < n, "structure")
        _check(bool((np.bincount(structure.order, minlength=n) == 1).all()), "structure")
    cyclic = structure.cyclic
    if len(cyclic):
        _check(int(cyclic[0]) >= 0 and int(cyclic[-1]) < count, "structure")
        _check(bool((np.diff(cyclic) > 0).all()) and int(structure.inner.min()) > 0, "structure")
    try:
        graph.labels.validate(full=True)
        if graph.attributes is not None:
            graph.attributes.validate(full=True)
    except pa.ArrowException:
        raise StoreTrouble("its texts are damaged") from None


def _is_partition(offsets: Any, total: int) -> bool:
    if len(offsets) == 0 or int(offsets[0]) != 0 or int(offsets[-1]) != total:
        return False
    return bool((offsets[1:] >= offsets[:-1]).all())


def _check(right: bool, what: str) -> None:
    if not right:
        raise StoreTrouble(f"its {what} hold numbers outside their range")
