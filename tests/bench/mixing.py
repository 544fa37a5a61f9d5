"""Sweeps with and without Anderson mixing: ``python tests/bench/mixing.py [FILE]``.

FILE is the R-MAT graph of ``tests/bench/graphs.py`` unless given; parallel edges are folded into
one.  Katz at 0.85 and 0.99 of 1/rho and the random surfer at d = 0.85 and 0.99 are swept until a
sweep moves less than 1e-11 of the scores' sum, and then asked for a proven error of 1e-10.
Without mixing the same sweeps are simply repeated; the surfer's mass balance is kept.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any
from unittest.mock import patch

from clean import is_directed

from kingpost.core.graph import Graph
from kingpost.core.ingest import load
from kingpost.core.measures import measure
from kingpost.core.measures.base import finish
from kingpost.core.measures.radius import spectral_radius
from kingpost.core.solvers import linear
from kingpost.core.watch import Watch

MOVED = 1e-11


@contextmanager
def mixing(on: bool) -> Iterator[None]:
    """Sweeps are extrapolated, or left as they are."""
    if on:
        yield
    else:
        with patch.multiple(linear, SLOW=float("inf"), SLOW_BY_ENTRY=float("inf")):
            yield


def until_still(name: str, graph: Graph, options: dict[str, Any]) -> tuple[str, str]:
    """Sweeps until the movement falls below the mark, and visits an edge of the whole solve."""
    lines = []
    chosen = measure(name)
    began = time.perf_counter()
    # An error far below the mark, so that the solver never stops on its own before it.
    settings = chosen.settings(tol=1e-13, max_sweeps=5_000, **options)
    work = chosen.solve(graph, settings)
    still = None
    for line in work:
        lines.append(line)
        if line.residual < MOVED and not line.part:
            still = line.index
            break
    work.close()
    seconds = time.perf_counter() - began
    return (f"{still}" if still is not None else f"> {lines[-1].index}"), f"{seconds:.2f} s"


def main() -> None:
    """Print one line a problem."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("file", nargs="?", type=Path, default=Path(".bench/rmat20.parquet"))
    file = parser.parse_args().file
    graph = load(file, directed=is_directed(file), parallel="first")
    assert graph.structure is not None
    radius = finish(spectral_radius(graph, 1e-12, Watch()))
    assert radius is not None
    print(f"{file.name}: {graph.n:,} nodes, {graph.m:,} edges, rho {radius.high:.9g}")
    problems: list[tuple[str, dict[str, Any]]] = []
    if radius.high > 0:
        problems += [("katz", {"alpha": share / radius.high}) for share in (0.85, 0.99)]
    problems += [("surfer", {"damping": d}) for d in (0.85, 0.99)]
    for name, options in problems:
        words = f"{name} " + ", ".join(f"{k} {v:.6g}" for k, v in options.items())
        for on in (True, False):
            with mixing(on):
                sweeps, seconds = until_still(name, graph, options)
                settings = measure(name).settings(tol=1e-10, max_sweeps=5_000, **options)
                result = measure(name).rank(graph, settings)
            print(
                f"{words:24} {'mixed' if on else 'plain'}: {sweeps:>5} sweeps to a movement of "
                f"{MOVED:.0e} ({seconds}); {result.sweeps} to a proven {result.bound.value:.1e}, "
                f"{result.edge_visits / graph.stored:.1f} visits an edge",
                flush=True,
            )


if __name__ == "__main__":
    main()
