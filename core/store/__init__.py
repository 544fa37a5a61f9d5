"""Compiled graphs and finished results kept on disk, so that a table is read and solved once.

What is kept is Arrow IPC files beside a manifest that holds a checksum of each.  All of them are
checked whenever they are opened: what was tampered with, cut short or left behind by an older
version is never believed.  Light to import: Arrow is loaded on first use.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Shelf": "shelf",
    "StoreTrouble": "sealed",
    "is_pack": "sealed",
    "keep_result": "results",
    "open_pack": "pack",
    "solve": "results",
    "write_pack": "pack",
}

__all__ = sorted(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_HOMES[name]}"), name)
