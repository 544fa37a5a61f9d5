"""The graph of a bench, as every contestant gets it: ids 0..n-1, every edge once.

Made with numpy alone from the file as written: nodes are renumbered in ascending order of their
ids, rows that name the same edge become one (weight 1 where there is no weight column, else
the sum), an undirected edge is written once with its lower end first.  Kept as Parquet beside
the reference solutions, so that every contestant reads the same file.
"""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Spec:
    """A cleaned graph: where it lies, and how large it is (``m`` counts an edge once)."""

    name: str
    path: str
    raw: str
    n: int
    m: int
    directed: bool
    weighted: bool
    acyclic: bool


@dataclass(frozen=True)
class Edges:
    """Edges in memory, the form every peer's builder starts from."""

    n: int
    source: Ints
    target: Ints
    weight: Floats | None
    directed: bool

    def both_ways(self) -> tuple[Ints, Ints, Floats]:
        """Rows, columns and weights of the matrix: an undirected edge in both directions."""
        source, target = self.source, self.target
        weight = np.ones(len(source)) if self.weight is None else self.weight
        if self.directed:
            return source, target, weight
        once = source != target
        return (
            np.concatenate([source, target[once]]),
            np.concatenate([target, source[once]]),
            np.concatenate([weight, weight[once]]),
        )


def is_directed(path: Path) -> bool:
    """Of the bench graphs, the power law is undirected."""
    return not path.stem.startswith("powerlaw")


def read(path: str | Path, n: int, directed: bool) -> Edges:
    """Read a cleaned file."""
    table = pq.read_table(path)
    weight = table["weight"].to_numpy() if "weight" in table.column_names else None
    return Edges(n, table["source"].to_numpy(), table["target"].to_numpy(), weight, directed)


def read_raw(path: str | Path, directed: bool) -> tuple[Edges, pa.Array | Ints]:
    """Read a file as written, renumber its nodes, keep parallel edges; and the ids by number.

    The quickest way known for libraries that want 0..n-1: counting for integer ids (those of
    the bench are small), a dictionary over both columns for text.
    """
    table = pq.read_table(path)
    weight = table["weight"].to_numpy() if "weight" in table.column_names else None
    if pa.types.is_integer(table.schema.field("source").type):
        source, target = table["source"].to_numpy(), table["target"].to_numpy()
        seen = np.zeros(max(source.max(), target.max()) + 1, dtype=bool)
        seen[source] = True
        seen[target] = True
        ids = np.flatnonzero(seen)
        place = np.cumsum(seen) - 1
        return Edges(len(ids), place[source], place[target], weight, directed), ids
    both = pa.chunked_array(table["source"].chunks + table["target"].chunks)
    coded = pc.dictionary_encode(both)
    names = coded.chunks[-1].dictionary
    codes = np.concatenate([chunk.indices.to_numpy() for chunk in coded.chunks]).astype(np.int64)
    half = len(table)
    return Edges(len(names), codes[:half], codes[half:], weight, directed), names


def prepare(raw: Path, folder: Path) -> Spec:
    """The cleaned graph of a file, made unless it is there already."""
    folder.mkdir(parents=True, exist_ok=True)
    path, facts = folder / f"{raw.stem}.parquet", folder / f"{raw.stem}.json"
    if facts.exists() and facts.stat().st_mtime > raw.stat().st_mtime:
        return Spec(**{**json.loads(facts.read_text()), "path": str(path), "raw": str(raw)})
    directed = is_directed(raw)
    edges, _ = read_raw(raw, directed)
    source, target, n = edges.source, edges.target, edges.n
    if not directed:
        source, target = np.minimum(source, target), np.maximum(source, target)
    keys = source * n + target
    columns = {}
    if edges.weight is None:
        keys = np.unique(keys)
    else:
        keys, place = np.unique(keys, return_inverse=True)
        columns["weight"] = np.bincount(place, edges.weight)
    source, target = np.divmod(keys, n)
    pq.write_table(pa.table({"source": source, "target": target, **columns}), path)
    spec = Spec(
        raw.stem, str(path), str(raw), n, len(source), directed, "weight" in columns,
        directed and _acyclic(n, source, target),
    )  # fmt: skip
    facts.write_text(json.dumps(asdict(spec)))
    return spec


def _acyclic(n: int, source: Ints, target: Ints) -> bool:
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    if (source == target).any():
        return False
    matrix = csr_array((np.ones(len(source), dtype=np.int8), (source, target)), shape=(n, n))
    return int(connected_components(matrix, connection="strong")[0]) == n
