"""Looking nodes up by the text of their ids, over Arrow arrays, without a loop over all rows."""

from __future__ import annotations

import difflib
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.text import id_text, visible


def as_text(labels: pa.Array) -> pa.Array:
    """Ids as an Arrow string array for searching; binary that is no UTF-8 becomes ``0x...``."""
    kind = labels.type
    if pa.types.is_string(kind) or pa.types.is_large_string(kind):
        return labels
    if pa.types.is_integer(kind) or pa.types.is_boolean(kind) or pa.types.is_date(kind):
        return pc.cast(labels, pa.string())
    return pa.array([id_text(value) for value in labels.to_pylist()], pa.large_string())


def locate(labels: pa.Array, text: str) -> int | None:
    """Position of the label that reads ``text`` exactly, or None."""
    kind = labels.type
    if len(labels) == 0:
        return None
    if pa.types.is_integer(kind) or pa.types.is_string(kind) or pa.types.is_large_string(kind):
        wanted: Any
        try:
            wanted = pa.scalar(int(text) if pa.types.is_integer(kind) else text, kind)
        except (ValueError, OverflowError, UnicodeEncodeError, pa.ArrowException):
            return None
        at = pc.index(labels, wanted).as_py()
    else:
        at = pc.index(as_text(labels), text).as_py()
    return None if at < 0 else int(at)


def containing(labels: pa.Array, text: str) -> NDArray[np.bool_]:
    """Which labels contain ``text``, letter case apart; shape (n,)."""
    hits = pc.match_substring(as_text(labels), text, ignore_case=True)
    return np.asarray(hits.to_numpy(zero_copy_only=False), dtype=bool)


def suggest(labels: pa.Array, text: str, limit: int = 3) -> list[str]:
    """A few labels that look like ``text``, safe to show: those containing it, or similar."""
    if len(labels) == 0 or not text:
        return []
    inside = np.flatnonzero(containing(labels, text))[:limit]
    if len(inside):
        return [visible(id_text(labels[int(i)].as_py()), 60) for i in inside]
    sample = [id_text(value) for value in labels.slice(0, 20_000).to_pylist()]
    return [visible(name, 60) for name in difflib.get_close_matches(text, sample, limit, 0.6)]
