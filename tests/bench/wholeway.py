"""From a Parquet file to the first twenty names, as a whole process.

    python tests/bench/wholeway.py CONTESTANT FILE MEASURE VALUE FACTS

runs the way of a library: pyarrow reads the columns, ids are numbered (the file as written:
parallel edges add up, on every side), its own builder and its own solver do the rest.
Kingpost's way is the installed command itself.
"""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import numpy as np
from clean import is_directed, read_raw
from contestants import contestant

TOP = 20


def peer(name: str, file: str, measure: str, value: float, facts: dict[str, Any]) -> list[str]:
    """The first ids, the highest first."""
    edges, ids = read_raw(file, is_directed(Path(file)))
    entry = contestant(name)
    entry.measure, entry.facts, entry.at = measure, facts, value
    entry.build(edges)
    scores = entry.scores(entry.solve(value))
    scores = scores * np.sign(scores.sum())
    top = np.argpartition(-scores, TOP)[:TOP]
    top = top[np.argsort(-scores[top], kind="stable")]
    return [str(ids[int(node)]) for node in top]


def kingpost_command(file: str, measure: str, facts: dict[str, Any]) -> list[str]:
    """The installed command as a user would type it."""
    found = Path(sys.executable).with_name("kingpost")
    program = str(found) if found.exists() else (shutil.which("kingpost") or "kingpost")
    command = [program, "rank", file, "--top", str(TOP), "--no-store"]
    if not is_directed(Path(file)):
        command.append("--undirected")
    if measure != "surfer":
        command += ["--measure", measure]
    if measure == "katz":
        # The peers' graph has no repeated edges, and alpha was chosen for that one.
        command += ["--alpha", repr(facts["alpha"]), "--parallel", "max"]
    return command


def peer_command(
    name: str, file: str, measure: str, value: float, facts: dict[str, Any]
) -> list[str]:
    """The same way of a library."""
    rest = [name, file, measure, json.dumps(value), json.dumps(facts)]
    return [sys.executable, str(Path(__file__)), *rest]


def timed(command: list[str], runs: int, slow: float, limit: float) -> tuple[float, str]:
    """Best seconds of a whole process, and what it printed."""
    best, out = float("inf"), ""
    for _ in range(runs):
        began = time.perf_counter()
        try:
            done = subprocess.run(command, capture_output=True, text=True, timeout=limit)
        except subprocess.TimeoutExpired:
            return float("inf"), ""
        if done.returncode not in (0, 4):
            return float("inf"), done.stderr.strip()[-200:]
        best, out = min(best, time.perf_counter() - began), done.stdout
        if best > slow:
            break
    return best, out


def kingpost_ids(command: list[str]) -> list[str]:
    """The ids the command answers with (a run of its own, as data)."""
    done = subprocess.run([*command, "--format", "json"], capture_output=True, text=True)
    return [str(row["node"]) for row in json.loads(done.stdout)["rows"]]


def main() -> None:
    """The child of a library."""
    name, file, measure, value, facts = sys.argv[1:]
    for line in peer(name, file, measure, json.loads(value), json.loads(facts)):
        print(line)


if __name__ == "__main__":
    main()
