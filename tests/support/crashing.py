"""Run as a program: children of one warm process that are killed, or race each other.

``python crashing.py kill EDGES SHELF SEED`` forks children that read a table, keep it, solve it
and keep the result, and kills each at another of all the moments at which it does anything with
the store or reports progress; after each a whole run must answer as without a store.
``python crashing.py race EDGES SHELF ROUNDS`` lets children do all that at the same time, with one
that keeps taking everything away.  Prints JSON.
"""

from __future__ import annotations

import hashlib
import json
import os
import random
import signal
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from kingpost.core import ingest
from kingpost.core.measures import measure
from kingpost.core.measures.base import finish
from kingpost.core.open import open_graph
from kingpost.core.store import sealed
from kingpost.core.store.results import keep_result, solve
from kingpost.core.store.shelf import Shelf
from kingpost.core.watch import Watch

SURFER = measure("surfer")
MOMENTS = ("open", "fsync", "rename", "mkdir", "unlink", "replace", "utime", "close")
READS = [0]  # how often the table itself was read
_honest_load = ingest.load


def counted_load(*given: Any) -> Any:
    """``ingest.load``, counted."""
    READS[0] += 1
    return _honest_load(*given)


ingest.load = counted_load


class Counted(Watch):
    """Counts every report and every look at the flag."""

    def __init__(self, tick: Callable[[], None]) -> None:
        super().__init__(threads=1)
        self._tick = tick

    @property
    def cancelled(self) -> bool:
        self._tick()
        return False

    def check(self) -> None:
        self._tick()

    def report(self, stage: str, done: int = 0, total: Any = None, unit: str = "") -> None:
        self._tick()


def whole_run(edges: str, shelf: Any, tick: Callable[[], None] = lambda: None) -> dict[str, Any]:
    """Everything a command does between its start and its answer."""
    told: list[str] = []
    watch, before = Counted(tick), READS[0]
    graph = open_graph(edges, store=shelf, watch=watch, tell=told.append)
    result = finish(solve(SURFER, graph, None, watch))
    bits = hashlib.sha256(result.scores.tobytes() + result.standing.order.tobytes())
    note = keep_result(SURFER, graph, result, watch)
    return {
        "answer": f"{bits.hexdigest()} {graph.n} {graph.m} {result.proven_order}",
        "kept graph": graph.drawer is not None,
        "read anew": READS[0] > before,
        "kept result": result.solved_on is not None,
        "told": told + ([note] if note else []),
    }


def child(work: Callable[[], Any]) -> tuple[int, int]:
    """Fork; (process, the end of a pipe that its answer comes out of)."""
    out, into = os.pipe()
    process = os.fork()
    if process == 0:
        status = 1
        try:
            os.write(into, json.dumps(work()).encode())
            status = 0
        except BaseException as error:
            os.write(into, json.dumps({"error": repr(error)}).encode())
        finally:
            os._exit(status)
    os.close(into)
    return process, out


def answer_of(one: tuple[int, int]) -> tuple[int, Any]:
    """Wait for a child; its status and its answer."""
    process, out = one
    with os.fdopen(out, "rb") as pipe:
        data = pipe.read()
    return os.waitpid(process, 0)[1], json.loads(data) if data else None


def counting(last: int | None, count: list[int]) -> Callable[[], None]:
    """A tick that counts, and kills this very process at the ``last`` one."""

    def tick() -> None:
        count[0] += 1
        if count[0] == last:
            os.kill(os.getpid(), signal.SIGKILL)

    return tick


def watched_run(edges: str, shelf: str, last: int | None) -> dict[str, Any]:
    """A whole run in which calls of the system count as moments too."""
    count = [0]
    tick = counting(last, count)

    def watched(honest: Callable[..., Any]) -> Callable[..., Any]:
        def call(*given: Any, **named: Any) -> Any:
            tick()
            value = honest(*given, **named)
            tick()
            return value

        return call

    for name in MOMENTS:
        setattr(os, name, watched(getattr(os, name)))
    sealed._Sink.write = watched(sealed._Sink.write)  # type: ignore[method-assign]
    return whole_run(edges, shelf, tick) | {"moments": count[0]}


def kill(edges: str, folder: str, seed: str) -> list[dict[str, Any]]:
    """Twenty kills; what each left and what the next run said."""
    clean = whole_run(edges, False)["answer"]
    moments = answer_of(child(lambda: watched_run(edges, f"{folder}-0", None)))[1]["moments"]
    rng = random.Random(int(seed))
    found: list[dict[str, Any]] = [{"clean": clean, "moments": moments}]
    for number in range(1, 21):
        # One in each twentieth of a run, so that no stretch of it goes untried.
        low, high = (number - 1) * moments // 20 + 1, number * moments // 20
        last, shelf = rng.randint(low, high), f"{folder}-{number}"
        status, _ = answer_of(child(lambda last=last, shelf=shelf: watched_run(edges, shelf, last)))
        left = [path.name for path in Path(shelf).rglob(".making-*")]
        for path in Path(shelf).rglob(".making-*"):
            os.utime(path, (0, 0))  # as if it had been left yesterday
        after, again = whole_run(edges, shelf), whole_run(edges, shelf)
        found.append(
            {
                "moment": last,
                "killed": os.WIFSIGNALED(status) and os.WTERMSIG(status) == signal.SIGKILL,
                "left": left,
                "still left": [path.name for path in Path(shelf).rglob(".making-*")],
                "after": after,
                "again": again,
            }
        )
    return found


def race(edges: str, folder: str, rounds: str) -> list[dict[str, Any]]:
    """Rounds of four whole runs at once while a fifth process clears the shelf."""
    found: list[dict[str, Any]] = [{"clean": whole_run(edges, False)["answer"]}]
    for number in range(int(rounds)):
        shelf = f"{folder}-{number % 2}"
        start, go = os.pipe()

        def at_once(start: int = start, go: int = go, shelf: str = shelf) -> dict[str, Any]:
            os.close(go)
            os.read(start, 1)  # returns when the parent closes its end
            return whole_run(edges, shelf)

        def clearing(start: int = start, go: int = go, shelf: str = shelf) -> dict[str, Any]:
            os.close(go)
            os.read(start, 1)
            return {"gone": sum(len(Shelf(shelf).clear()) for _ in range(20))}

        children = [child(at_once) for _ in range(4)]
        if number % 2:
            children.append(child(clearing))
        os.close(start)
        os.close(go)
        answers = [answer_of(one) for one in children]
        found.append(
            {
                "statuses": [status for status, _ in answers],
                "runs": [said for _, said in answers[:4]],
                "left": [path.name for path in Path(shelf).rglob(".*")],
                "after": whole_run(edges, shelf),
            }
        )
    return found


if __name__ == "__main__":
    print(json.dumps({"kill": kill, "race": race}[sys.argv[1]](*sys.argv[2:])))
