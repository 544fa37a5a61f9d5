"""Kingpost's core: tables of edges in, rankings that prove themselves out.  Knows no screen."""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Graph": "graph",
    "Result": "result",
    "Watch": "watch",
    "KingpostError": "errors",
    "load": "ingest",
    "LoadOptions": "ingest",
    "measure": "measures",
}

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    # Loaded on first use: importing the package must stay cheap over SSH.
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"kingpost.core.{_HOMES[name]}"), name)
