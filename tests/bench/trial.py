"""One node taken out: residual updates against solves from scratch.

``python tests/bench/trial.py [FILE]``; FILE is the citation graph of ``tests/bench/graphs.py``
unless given.  What counts for an update: finding the changed columns, pushing the residuals, and
the certificate of every score, from the result before in memory.  It is held against

* the solve alone: the changed graph and its strong components are there already;
* the whole way: making the changed graph from the one in memory, its strong components, the solve.

Both times are the best of three, taken in turns.  Nodes: some of the highest ranks, and of 25
chosen at random the median and the slowest.  Every update is checked to lie within its bound of
the solve from scratch for the first rank.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
from clean import is_directed

from kingpost.core.graph import Graph
from kingpost.core.ingest import load
from kingpost.core.insight.edit import edit_of, edited
from kingpost.core.insight.update import Updated, Updates
from kingpost.core.measures import measure
from kingpost.core.watch import Watch

RANKS = (1, 2, 10, 100, 1_000, 10_000, 100_000)
CHOSEN = 25
AGAIN = 3


def timed(work: Callable[[], Any]) -> tuple[float, Any]:
    """Seconds and what came of it."""
    began = time.perf_counter()
    found = work()
    return time.perf_counter() - began, found


def scratch(
    graph: Graph, node: int, name: str, options: dict[str, Any]
) -> tuple[float, float, Any]:
    """Seconds of making the changed graph, seconds of the solve, and its scores by old number."""
    made, (left, old) = timed(lambda: edited(graph, edit_of(graph, [node])))
    shape, _ = timed(lambda: left.structure)
    solve, result = timed(lambda: measure(name).rank(left, measure(name).settings(**options)))
    scores = np.zeros(graph.n)
    scores[old] = result.scores
    slack = float(result.bound.value) * float(result.scores.sum())
    return made + shape, solve, (scores, slack)


def main() -> None:
    """Print one line a node."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("file", nargs="?", type=Path, default=Path(".bench/citation.parquet"))
    parser.add_argument("--measures", default="surfer,katz")
    asked = parser.parse_args()
    graph = load(asked.file, directed=is_directed(asked.file))
    acyclic = graph.structure.acyclic
    print(f"{asked.file.name}: {graph.n:,} nodes, {graph.m:,} edges, acyclic {acyclic}")
    for name in asked.measures.split(","):
        result = measure(name).rank(graph)
        options = {"alpha": result.facts["alpha"]} if name == "katz" else {}
        updates = Updates(graph, result)
        order = np.argsort(-result.scores, kind="stable")
        first = int(order[0])
        updates.after(edit_of(graph, [first]), Watch())  # compiles, touches the memory
        tries = [scratch(graph, first, name, options) for _ in range(AGAIN)]
        build = min(made for made, _, _ in tries)
        solve = min(taken for _, taken, _ in tries)
        print(f"{name}: from scratch {solve:.3f} s the solve, {build + solve:.3f} s the whole way")

        def once(node: int, updates: Updates = updates) -> tuple[float, Updated | None]:
            edit = edit_of(graph, [node])
            found = [timed(lambda: updates.after(edit, Watch())) for _ in range(AGAIN)]
            return min(seconds for seconds, _ in found), found[-1][1]

        def line(words: str, seconds: float, found: Updated | None, solve: float = solve,
                 build: float = build) -> None:  # fmt: skip
            if found is None:
                print(f"  {words:24} {seconds:.3f} s, given up: solved from scratch")
                return
            print(
                f"  {words:24} {seconds:.3f} s  {seconds / solve:6.3f} of the solve "
                f"{seconds / (build + solve):6.3f} of the whole way  "
                f"{found.edge_visits / graph.stored:.3f} visits an edge  "
                f"bound {found.bound.value:.1e}",
                flush=True,
            )

        for rank in RANKS:
            if rank <= graph.n:
                line(f"rank {rank:,}", *once(int(order[rank - 1])))
        _, found = once(first)
        truth, slack = tries[0][2]
        if found is not None:
            off = float(np.abs(found.scores - truth).sum())
            allowed = float(found.bound.value) * float(found.scores.sum()) + slack
            assert off <= allowed, (off, allowed)
            print(f"  off by {off:.1e} in all, {allowed:.1e} allowed")
        chance = np.random.default_rng(1).integers(0, graph.n, CHOSEN)
        taken = sorted((once(int(node)) for node in chance), key=lambda item: item[0])
        line(f"median of {CHOSEN} at random", *taken[CHOSEN // 2])
        line(f"slowest of {CHOSEN} at random", *taken[-1])


if __name__ == "__main__":
    main()
