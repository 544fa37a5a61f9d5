"""Bytes that a loaded graph holds, by edge and by node: ``python tests/bench/memory.py``.

Both directions of the adjacency and the structure (components, order) count, labels and
attributes do not.  Parallel edges are folded into one edge of weight 1, so that files without a
weight column give unweighted graphs.  The target is 10 bytes an edge and 40 a node: below, as
one number.  What the process holds after loading and its peak are told beside it, since arrays
alone would not show what was left lying about.
"""

from __future__ import annotations

import argparse
import ctypes
import gc
import resource
import subprocess
import sys
from pathlib import Path

from clean import is_directed

GRAPHS = ("rmat20", "citation", "citation_errors", "powerlaw")
EDGE, NODE = 10, 40


def resident() -> int:
    """Bytes of memory this process holds now, after giving back what is free."""
    gc.collect()
    import pyarrow as pa

    pa.default_memory_pool().release_unused()
    if sys.platform == "linux":
        ctypes.CDLL(None).malloc_trim(0)
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith("VmRSS"):
            return int(line.split()[1]) * 1024
    raise OSError("no VmRSS")


def measure(path: Path) -> str:
    """One line about one file."""
    import pyarrow as pa

    from kingpost.core.ingest import from_table, load

    tiny = from_table(pa.table({"source": [1, 2, 3], "target": [2, 1, 1]}))
    assert tiny.structure.count == 2  # loads all code, so that it does not count
    before = resident()
    graph = load(path, directed=is_directed(path), parallel="first", weight_as="none")
    structure = graph.structure
    after = resident()
    arrays = {}
    for side in (graph.outward, graph.inward):
        for array in (side.offsets, side.neighbours, side.weights):
            if array is not None:
                arrays[id(array)] = array.nbytes
    adjacency = sum(arrays.values())
    kept = {id(a): a.nbytes for a in vars(structure).values() if hasattr(a, "nbytes")}
    held = adjacency + sum(kept.values())
    target = EDGE * graph.m + NODE * graph.n
    labels = graph.labels.nbytes
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
    edge_part = (held - NODE * graph.n) / graph.m
    return (
        f"{path.stem:16} {graph.n:>10,} {graph.m:>11,} {adjacency / 1e6:>10,.1f} "
        f"{(held - adjacency) / 1e6:>9,.1f} {held / graph.m:>7.2f} {edge_part:>10.2f} "
        f"{held / target:>7.2f} {labels / 1e6:>8,.1f} {(after - before) / 1e6:>9,.1f} "
        f"{peak / 1e6:>9,.1f}  {'met' if held <= target else 'MISSED'}"
    )


def main() -> None:
    """Each file in a process of its own."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("files", nargs="*", type=Path)
    parser.add_argument("--graphs", type=Path, default=Path(".bench"), metavar="FOLDER")
    parser.add_argument("--here", action="store_true", help=argparse.SUPPRESS)
    asked = parser.parse_args()
    files = asked.files or [asked.graphs / f"{name}.parquet" for name in GRAPHS]
    if asked.here:
        print(measure(files[0]))
        return
    print(f"target: {EDGE} bytes an edge + {NODE} a node; MB = 1e6 bytes")
    print(
        f"{'graph':16} {'nodes':>10} {'edges':>11} {'adjacency':>10} {'structure':>9} "
        f"{'B/edge':>7} {'less nodes':>10} {'/target':>7} {'labels':>8} {'resident':>9} {'peak':>9}"
    )
    for file in files:
        if not file.exists():
            parser.error(f"{file} is missing; python tests/bench/graphs.py {file.parent}")
        subprocess.run([sys.executable, __file__, "--here", str(file)], check=True)


if __name__ == "__main__":
    main()
