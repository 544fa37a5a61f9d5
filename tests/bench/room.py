"""Predicted against true peak memory of loading: ``python tests/bench/room.py FILES...``.

Every file is loaded in a process of its own, after small loads have made the compiled loops
ready.  The true peak is the high-water mark of the resident size over what was held before, as
Linux keeps it.  ``--where`` adds a load with a filter, ``--undirected`` one read both ways.
"""

from __future__ import annotations

import argparse
import json
import re
import subprocess
import sys
from pathlib import Path

import pyarrow as pa


def status(key: str) -> int:
    """A figure of this process in bytes."""
    text = Path("/proc/self/status").read_text()
    found = re.search(rf"^{key}:\s+(\d+) kB", text, re.MULTILINE)
    if found is None:
        raise OSError(f"no {key}")
    return int(found[1]) * 1024


def predicted(path: str, options: dict[str, object]) -> dict[str, float]:
    """What is predicted; in a process of its own, for it leaves memory behind."""
    from kingpost.core.ingest import LoadOptions, predict

    found = predict(path, LoadOptions(**options))
    return {"predicted": found.peak, "guessed": found.nodes}


def measured(path: str, options: dict[str, object]) -> dict[str, float]:
    """What one load takes."""
    from kingpost.core.ingest import from_table, load

    for ids in ([1, 2], [1, 10**12], ["a", "b"]):
        for weights in ({}, {"weight": [1.0, 2.0]}):
            table = pa.table({"source": ids, "target": ids[::-1]} | weights)
            for directed in (True, False):
                from_table(table, directed=directed, where="source = source")
    held = status("VmRSS")
    Path("/proc/self/clear_refs").write_text("5")  # the high-water mark begins anew
    graph = load(path, **options)
    true = status("VmHWM") - held
    return {"true": true, "nodes": graph.n, "rows": graph.account.rows_read}


def main() -> None:
    """One line a load."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("files", nargs="+")
    parser.add_argument("--where")
    parser.add_argument("--undirected", action="store_true")
    parser.add_argument("--here", choices=("predicted", "measured"), help=argparse.SUPPRESS)
    asked = parser.parse_args()
    options: dict[str, object] = {}
    if asked.where:
        options["where"] = asked.where
    if asked.undirected:
        options["directed"] = False
    if asked.here:
        work = predicted if asked.here == "predicted" else measured
        print(json.dumps(work(asked.files[0], options)))
        return
    heads = ("rows", "nodes", "guessed", "true MB", "predicted", "ratio", "B/row")
    print(f"{'file':22}" + "".join(f"{head:>12}" for head in heads))
    extra = [word for word in sys.argv[1:] if word not in asked.files]
    for file in asked.files:
        one: dict[str, float] = {}
        for what in ("predicted", "measured"):
            command = [sys.executable, __file__, file, "--here", what, *extra]
            done = subprocess.run(command, check=True, capture_output=True, text=True)
            one |= json.loads(done.stdout)
        print(
            f"{Path(file).name:22}{one['rows']:12,}{one['nodes']:12,}{one['guessed']:12,}"
            f"{one['true'] / 1e6:12,.0f}{one['predicted'] / 1e6:12,.0f}"
            f"{one['predicted'] / one['true']:12.2f}{one['true'] / one['rows']:12.1f}",
            flush=True,
        )


if __name__ == "__main__":
    main()
