"""A graph of hundreds of millions of edges, made, ranked and opened again.

    python tests/bench/large.py FOLDER [--edges 200M] [--limit GIB]

Every step is the installed command as a user would type it, in a process of its own; seconds are
of the clock and of the processor over all threads, memory is the greatest resident size (what
of it are pages of a file that is mapped, the system may take back).  ``--limit`` bounds the
address space of each step.  The store is kept in FOLDER; the three rankings must be the same.
"""

from __future__ import annotations

import argparse
import os
import resource
import subprocess
import sys
import time
from dataclasses import dataclass
from pathlib import Path

GIB = 2**30


@dataclass(frozen=True)
class Step:
    """What one command took, and what it printed."""

    seconds: float
    cpu: float
    peak: int
    out: str


def run(words: list[str], folder: Path, limit: float | None) -> Step:
    """Run the installed command; ends the bench where it fails."""
    program = Path(sys.executable).with_name("kingpost")

    def bounded() -> None:
        if limit is not None:
            resource.setrlimit(resource.RLIMIT_AS, (int(limit * GIB),) * 2)

    environment = {**os.environ, "XDG_CACHE_HOME": str(folder / "cache")}
    began = time.perf_counter()
    with (folder / "out.txt").open("w+") as out:
        child = subprocess.Popen(
            [str(program), *words], stdout=out, env=environment, preexec_fn=bounded
        )
        _, status, used = os.wait4(child.pid, 0)
        child.returncode = os.waitstatus_to_exitcode(status)
        seconds = time.perf_counter() - began
        out.seek(0)
        text = out.read()
    if child.returncode:
        sys.exit(f"kingpost {' '.join(words)} ended with status {child.returncode}")
    return Step(seconds, used.ru_utime + used.ru_stime, used.ru_maxrss * 1024, text)


def main() -> None:
    """Print one line a step."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    parser.add_argument("--edges", default="200M")
    parser.add_argument("--limit", type=float)
    given = parser.parse_args()
    given.folder.mkdir(parents=True, exist_ok=True)
    table = str(given.folder / "large.parquet")
    rank = ["rank", table, "--top", "20", "--format", "csv"]
    steps = {
        "synth": ["synth", "rmat", "--edges", given.edges, "--seed", "1", "--out", table],
        "rank, nothing kept": [*rank, "--no-store"],
        "rank, graph and result kept": rank,
        "rank again": rank,
        "other damping, graph kept": [*rank, "--damping", "0.9"],
    }
    rankings = set()
    for name, words in steps.items():
        step = run(words, given.folder, given.limit)
        print(
            f"{name:28} {step.seconds:8.1f} s {step.cpu:8.1f} s cpu {step.peak / GIB:6.1f} GiB",
            flush=True,
        )
        if words is rank or "--no-store" in words:
            rankings.add(step.out)
    print(f"file {Path(table).stat().st_size / GIB:.1f} GiB; rankings alike: {len(rankings) == 1}")


if __name__ == "__main__":
    main()
