"""Kingpost's core: tables of edges in, rankings that prove themselves out.  Knows no screen.

In a notebook or script::

    import kingpost.core as kp

    graph = kp.load("calls.parquet", weight="calls_per_min")
    result = graph.rank("katz", alpha_fraction=0.5)
    result.top(20)                     # an Arrow table: ranks, nodes, scores, bounds, rail
    kp.why(graph, result, graph.find("identity"))

:mod:`kingpost.core.library` has examples that run.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

# name -> module, and the name it has there where that is another
_HOMES = {
    "Graph": "graph",
    "Result": "result",
    "Watch": "watch",
    "KingpostError": "errors",
    "load": "ingest",
    "load_together": "ingest",
    "LoadOptions": "ingest",
    "from_arrow": "ingest:from_table",
    "from_edges": "ingest.memory",
    "from_networkx": "ingest.memory",
    "from_scipy": "ingest.memory",
    "measure": "measures",
    "open_graph": "open",
    "agree": "insight.agree",
    "audit": "insight.audit:examine",
    "drift": "insight.drift",
    "look": "insight.node",
    "read_scores": "ingest.scores",
    "spectrum": "insight.spectrum",
    "sweep": "insight.sweep",
    "than": "insight.why",
    "trial": "insight.trial",
    "verify": "insight.verify",
    "walk": "insight.walk",
    "why": "insight.why",
    "within": "insight.cohorts",
}

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    # Loaded on first use: importing the package must stay cheap over SSH.
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    home, _, other = _HOMES[name].partition(":")
    return getattr(import_module(f"kingpost.core.{home}"), other or name)


def __dir__() -> list[str]:
    return __all__
