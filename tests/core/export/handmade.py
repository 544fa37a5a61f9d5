"""Small graphs and results made by hand, so that exports are tested apart from any solver."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa

from kingpost.core.graph import Account, Adjacency, Graph, Origin
from kingpost.core.measures.base import Settings
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Stop

HOSTILE = [
    "\x00nul",
    "\x1b[31mred",
    "",
    "5k" + "y" * 4998,
    "=1+1",
    "[bold]x[/bold]",
    'a "quoted" name',
    "a,b\tc",
    "new\nline\r\nand more",
    "pipe | star * tick ` <b>",
    "\N{RIGHT-TO-LEFT OVERRIDE}txt.exe",
    "\N{LATIN SMALL LETTER E WITH ACUTE}t\N{LATIN SMALL LETTER E WITH ACUTE}",
    "\N{CJK UNIFIED IDEOGRAPH-6E2F}\N{CJK UNIFIED IDEOGRAPH-53E3}",
    "\N{FERRY} ferry",
]


def adjacency(n: int, pairs: list[tuple[int, int]], weights: Any = None) -> Adjacency:
    order = sorted(range(len(pairs)), key=lambda i: pairs[i])
    offsets = np.zeros(n + 1, dtype=np.int64)
    for row, _ in pairs:
        offsets[row + 1] += 1
    near = np.array([pairs[i][1] for i in order], dtype=np.uint32)
    kept = None if weights is None else np.array([weights[i] for i in order], dtype=np.float64)
    return Adjacency(np.cumsum(offsets), near, kept)


def make_graph(
    labels: pa.Array,
    pairs: list[tuple[int, int]],
    weights: Any = None,
    attributes: pa.Table | None = None,
    **more: Any,
) -> Graph:
    n = len(labels)
    back = [(v, u) for u, v in pairs]
    return Graph(
        labels=labels,
        outward=adjacency(n, pairs, weights),
        inward=adjacency(n, back, weights),
        attributes=attributes,
        account=Account(rows_read=len(pairs), rows_kept=len(pairs)),
        origin=Origin(files=("calls.parquet",), source="caller", target="callee", weight="load"),
        **more,
    )


def make_result(scores: Any, **about: Any) -> Result:
    given: dict[str, Any] = {
        "measure": "made",
        "settings": Settings(),
        "stop": Stop.CONVERGED,
        "reason": "the bound fell below what was asked for",
        "bound": Bound(BoundKind.COMPONENTWISE, 1e-11, relative=1e-11),
        "log": (
            Iteration(1, 0.5, float("nan"), 9, 0.25),
            Iteration(2, 1e-12, 1e-11, 18, 0.5, proven=3, eigenvalue=(1.5, 2.0), part="core"),
        ),
        "conventions": {"dangling": "no node is"},
    }
    return Result(scores=np.array(scores, dtype=np.float64), **(given | about))
