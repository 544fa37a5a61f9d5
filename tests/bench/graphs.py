"""Write the bench graphs as Parquet: ``python tests/bench/graphs.py [FOLDER] [--only NAME ...]``.

FOLDER defaults to ``.bench/`` (ignored by git).  Files that are there already are kept unless
``--again`` is given.  Edges stream from :mod:`kingpost.core.gallery` in row groups of 1,048,576
rows, so that memory stays at one group; rows are written as generated: parallel edges and
self-loops are in them, and the one who loads them chooses the policy.

==================  ==========================================================================
rmat20              R-MAT, 2^20 ids, 16 million rows, int64 ids
rmat20_text         the same rows with ids of 25 characters
citation            copying model, 2 million papers, 30 million references, acyclic
citation_errors     the same with 0.1 % of the references pointing forward in time
layered             calls between 200,000 services in 8 layers, 4 million rows, weighted
powerlaw            undirected (each edge once), 1 million nodes, 10 million rows
==================  ==========================================================================
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from kingpost.core.gallery import EdgeList, Recipe, recipe

SEED = 20
GROUP = 1 << 20


def recipes() -> dict[str, Recipe]:
    """Name -> graph not yet made."""
    rmat = recipe("rmat", 16_000_000, seed=SEED, nodes=1 << 20)
    return {
        "rmat20": rmat,
        "rmat20_text": rmat,
        "citation": recipe("citation", 30_000_000, seed=SEED),
        "citation_errors": recipe("citation", 30_000_000, seed=SEED, errors=0.001),
        "layered": recipe("layered", 4_000_000, seed=SEED),
        "powerlaw": recipe("powerlaw", 10_000_000, seed=SEED),
    }


def text_ids(count: int) -> pa.Array:
    """Ids of 25 characters whose order has nothing to do with the numbers they stand for."""
    numbers = np.arange(count, dtype=np.uint64) * np.uint64(0x9E3779B97F4A7C15)
    return pa.array([f"node-{number:020d}" for number in numbers.tolist()], pa.string())


def table(part: EdgeList, names: pa.Array | None) -> pa.Table:
    """Columns source, target and, where there are weights, weight."""
    ends = {"source": pa.array(part.source), "target": pa.array(part.target)}
    if names is not None:
        ends = {key: names.take(column) for key, column in ends.items()}
    if part.weight is not None:
        ends["weight"] = pa.array(part.weight)
    return pa.table(ends)


def write(path: Path, graph: Recipe, names: pa.Array | None = None) -> None:
    """Stream a graph into a file, which gets its name only when it is complete."""
    unfinished = path.with_suffix(".part")
    schema = table(graph.part(0, 1), names).schema
    with pq.ParquetWriter(unfinished, schema) as writer:
        for part in graph.stream(GROUP):
            writer.write_table(table(part, names))
    unfinished.replace(path)


def main() -> None:
    """Write what is missing and print rows, bytes and seconds."""
    parser = argparse.ArgumentParser(description="Write the bench graphs as Parquet.")
    parser.add_argument("folder", nargs="?", default=".bench", type=Path)
    parser.add_argument("--only", nargs="+", choices=sorted(recipes()), metavar="NAME")
    parser.add_argument("--again", action="store_true", help="write files that are there already")
    asked = parser.parse_args()
    asked.folder.mkdir(parents=True, exist_ok=True)
    for name, graph in recipes().items():
        path = asked.folder / f"{name}.parquet"
        if asked.only and name not in asked.only:
            continue
        started = time.perf_counter()
        if asked.again or not path.exists():
            write(path, graph, text_ids(graph.n) if name.endswith("_text") else None)
        print(
            f"{name:16} {graph.n:>10,} ids {graph.edges:>11,} rows "
            f"{path.stat().st_size:>13,} bytes {time.perf_counter() - started:6.1f} s",
            flush=True,
        )


if __name__ == "__main__":
    main()
