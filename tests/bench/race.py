"""One contestant on one graph: the loosest setting that is right, and the seconds it takes.

The true error of every run is known (:mod:`truth`), so nobody's own idea of a tolerance matters.
Each contestant has a process of its own, so that peak memory is its own too.
"""

from __future__ import annotations

import contextlib
import importlib.util
import json
import os
import resource
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
from clean import Spec
from contestants import SMALL, Contestant, Dial, contestant
from truth import relative_l1, truth_path

GOAL = 1e-9
SLOW = 10.0  # seconds beyond which one run is enough
RUNS = 3
_SEARCHES = 12

Row = dict[str, Any]


def loosest(error: Callable[[int], float], dial: Dial, goal: float = GOAL) -> int | None:
    """The first place of a dial whose error is at most ``goal``, None if there is none.

    Errors are taken to fall geometrically along the dial, so places are guessed by secants on
    their logarithms and the answer closed in on from both sides.
    """
    if dial.kind == "none":
        return 0 if error(0) <= goal else None
    fails, works = dial.first - 1, dial.last + 1
    seen: dict[int, float] = {}
    place = dial.start
    for _ in range(_SEARCHES):
        seen[place] = max(error(place), 1e-17)
        if seen[place] <= goal:
            works = min(works, place)
        else:
            fails = max(fails, place)
            tighter = [p for p in seen if p < place and seen[p] < 2 * seen[place]]
            if tighter and place - max(tighter) >= (8 if dial.kind == "tol" else 200):
                break  # tightening no longer helps
        if works - fails <= 1 or fails >= dial.last:
            break
        place = _guess(seen, fails, works, dial, goal)
    return works if works in seen else None


def _guess(seen: dict[int, float], fails: int, works: int, dial: Dial, goal: float) -> int:
    finite = sorted((abs(np.log10(e / goal)), p) for p, e in seen.items() if np.isfinite(e))
    near = [p for _, p in finite[:2]]
    slope = -0.25 if dial.kind == "tol" else -0.05
    if len(near) == 2 and near[0] != near[1]:
        found = np.log10(seen[near[0]] / seen[near[1]]) / (near[0] - near[1])
        slope = float(np.clip(found, -1.0, -0.002))
    if near:
        guess = near[0] + int(np.ceil(-np.log10(seen[near[0]] / goal) / slope))
    else:
        guess = fails * 2
    reach = 16 if dial.kind == "tol" else max(4 * max(seen), 40)
    guess = min(guess, fails + reach)
    return int(np.clip(guess, fails + 1, works - 1))


def missing(entry: Contestant) -> bool:
    """Whether its library is not installed."""
    return importlib.util.find_spec(entry.needs.split(".")[0]) is None


def run(
    name: str, spec: Spec, measure: str, facts: dict[str, Any], folder: Path,
    tell: Callable[[Row], None] = lambda row: None,
) -> Row:  # fmt: skip
    """Load, search, time; ``tell`` hears of every run, in case the process does not live on."""
    entry = contestant(name)
    reference = np.load(truth_path(folder, spec.name, measure))
    row: Row = {"name": name, "runs": 0}
    began = time.perf_counter()
    entry.load(spec, measure, facts)
    row["build"] = time.perf_counter() - began
    row["parts"] = getattr(entry, "parts", None)
    row["idle"] = _peak()
    tell(row)
    seconds: dict[int, list[float]] = {}
    errors: dict[int, tuple[float, dict[str, Any]]] = {}
    why: list[str] = []

    def attempt(place: int) -> float:
        entry.at = entry.dial.value(place)
        start = time.perf_counter()
        try:
            answer = entry.solve(entry.at)
        except Exception as trouble:
            why.append(f"{type(trouble).__name__}: {trouble}".splitlines()[0][:90])
            errors[place] = (float("inf"), {})
            return float("inf")
        seconds.setdefault(place, []).append(time.perf_counter() - start)
        scores = entry.scores(answer)
        error = relative_l1(scores, reference) if len(scores) == spec.n else float("inf")
        errors[place] = (error, entry.effort(answer))
        row["runs"] += 1
        row["best_error"] = min(error, row.get("best_error", float("inf")))
        row["at_best"] = min((e, entry.dial.words(p)) for p, (e, _) in errors.items())[1]
        tell(row)
        return error

    place = loosest(attempt, entry.dial)
    if place is None:
        row["reached"] = False
        tried = [s for times in seconds.values() for s in times]
        row["seconds"] = max(tried) if tried else None
        if why and not tried:
            row["why"] = why[-1]
    else:
        runs = 1 if spec.m <= SMALL else RUNS  # seconds of small graphs mean little
        while len(seconds[place]) < runs and min(seconds[place]) <= SLOW:
            attempt(place)
        row.update(reached=True, seconds=min(seconds[place]), error=errors[place][0])
        row.update(place=place, setting=entry.dial.words(place), value=entry.dial.value(place))
        row.update(errors[place][1])
    row["peak"] = _peak()
    return row


def _peak() -> int:
    """Bytes this process has held at most."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024


def run_apart(
    name: str, spec: Spec, measure: str, facts: dict[str, Any], folder: Path, limit: float
) -> Row:
    """:func:`run` in a process of its own that is ended after ``limit`` seconds."""
    job = json.dumps([name, asdict(spec), measure, facts, str(folder)])
    command = [sys.executable, str(Path(__file__)), job]
    last: Row = {"name": name}
    with subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as child:
        try:
            out, err = child.communicate(timeout=limit)
        except subprocess.TimeoutExpired:
            child.kill()
            out, err = child.communicate()
            last["why"] = f"ended after {limit:.0f} s"
    rows = [json.loads(line[4:]) for line in out.splitlines() if line.startswith("row ")]
    row = {**(rows[-1] if rows else {}), **last}
    if "reached" not in row:
        row["reached"] = False
        row.setdefault("why", (err.strip().splitlines() or [f"status {child.returncode}"])[-1][:90])
    return row


@contextlib.contextmanager
def quiet() -> Iterator[int]:
    """Lends a copy of standard output, and sends what libraries print there to nowhere."""
    kept = os.dup(1)
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, 1)
    try:
        yield kept
    finally:
        os.dup2(kept, 1)
        os.close(kept)
        os.close(nowhere)


def main() -> None:
    """The child: a job as JSON on the command line, rows on standard output."""
    name, spec, measure, facts, folder = json.loads(sys.argv[1])

    with quiet() as out:

        def tell(row: Row) -> None:
            os.write(out, f"row {json.dumps(row)}\n".encode())

        tell(run(name, Spec(**spec), measure, facts, Path(folder), tell))


if __name__ == "__main__":
    main()
