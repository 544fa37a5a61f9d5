"""Kill -9 at random moments of whole commands; the next one must give the ranking of a clean one.

    .venv/bin/python tests/bench/kills.py .bench/layered.parquet [--kills 20] [--seed 1]

A run without the store gives the ranking to compare with.  Then, every time with an empty cache,
``kingpost rank`` is started and killed after a random part of the time a whole run takes, and run
again to its end.  tests/core/store/test_crashes.py does the same by steps instead of by seconds.
"""

from __future__ import annotations

import argparse
import hashlib
import os
import random
import subprocess
import sys
import tempfile
import time
from pathlib import Path


def command(path: str, *more: str) -> list[str]:
    """A whole ranking, every digit of it."""
    return [sys.executable, "-m", "kingpost.tui", "rank", path, "--format", "csv", *more]


def main() -> None:
    """Kill, rank, compare; print what was found."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("path")
    parser.add_argument("--kills", type=int, default=20)
    parser.add_argument("--seed", type=int, default=1)
    given = parser.parse_args()
    rng = random.Random(given.seed)

    with tempfile.TemporaryDirectory(dir=Path(given.path).parent) as folder:

        def ranking(cache: str, *more: str) -> str:
            env = os.environ | {"KINGPOST_CACHE_DIR": os.path.join(folder, cache)}
            done = subprocess.run(command(given.path, *more), env=env, capture_output=True)
            if done.returncode:
                raise SystemExit(done.stderr.decode())
            return hashlib.sha256(done.stdout).hexdigest()

        clean = ranking("none", "--no-store")
        began = time.perf_counter()
        same = ranking("whole") == clean
        whole = time.perf_counter() - began
        same = same and ranking("whole") == clean
        print(
            f"{given.path}: {whole:.1f} s a run; from the store {'the same' if same else 'OTHER'}"
        )
        wrong = half = kept = 0
        for number in range(given.kills):
            cache = f"cache-{number}"
            env = os.environ | {"KINGPOST_CACHE_DIR": os.path.join(folder, cache)}
            process = subprocess.Popen(
                command(given.path), env=env, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
            )
            moment = rng.uniform(0, whole)
            time.sleep(moment)
            process.kill()
            process.wait()
            shelf = Path(folder, cache, "shelf")
            under_way = len(list(shelf.rglob(".making-*")))
            graphs = len(list(shelf.glob("graphs/[!.]*")))
            half, kept = half + bool(under_way), kept + bool(graphs)
            right = ranking(cache) == clean
            wrong += not right
            words = f"killed after {moment:5.2f} s: {graphs} graph kept, {under_way} half-written"
            print(f"{words}; then {'the same' if right else 'ANOTHER'} ranking", flush=True)
        print(
            f"{given.kills} kills, {half} with a folder half-written, {kept} after the graph was "
            f"kept; {wrong} wrong rankings"
        )
        raise SystemExit(1 if wrong or not same else 0)


if __name__ == "__main__":
    main()
