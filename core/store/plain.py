"""Plain Python values as JSON and back, exactly: what manifests hold.

Only numbers, text, None, tuples, lists and mappings from text: reading can make nothing else,
run nothing and import nothing.  Floats survive bit by bit, tuples stay tuples.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import Any

import numpy as np

_MARK = "$"


class NotPlain(TypeError):
    """A value that is none of the plain kinds."""


def pack(value: Any) -> Any:
    """``value`` in terms of JSON; what JSON has no word for is wrapped as ``{"$": kind, ...}``.

    Numpy numbers become Python's.

    Raises:
        NotPlain: for anything else than the plain kinds.
    """
    if isinstance(value, np.generic):
        value = value.item()
    if value is None or type(value) in (bool, int, str):
        return value
    if isinstance(value, str):  # words of an enumeration, or of a command line
        return str.__str__(value)
    if type(value) is float:
        # repr and back is exact for every finite float.
        return value if math.isfinite(value) else {_MARK: "float", "is": repr(value)}
    if isinstance(value, tuple):
        return {_MARK: "tuple", "is": [pack(item) for item in value]}
    if isinstance(value, list):
        return [pack(item) for item in value]
    if isinstance(value, Mapping) and all(isinstance(key, str) for key in value):
        packed = {str(key): pack(item) for key, item in value.items()}
        return {_MARK: "map", "is": packed} if _MARK in packed else packed
    raise NotPlain(f"{type(value).__name__} is no plain value")


def unpack(value: Any) -> Any:
    """What :func:`pack` was given.

    Raises:
        ValueError: for a wrapping that :func:`pack` does not make.
    """
    if isinstance(value, list):
        return [unpack(item) for item in value]
    if not isinstance(value, dict):
        return value
    if _MARK not in value:
        return {key: unpack(item) for key, item in value.items()}
    kind, inside = value[_MARK], value.get("is")
    if kind == "float" and inside in ("nan", "inf", "-inf"):
        return float(inside)
    if kind == "tuple" and isinstance(inside, list):
        return tuple(unpack(item) for item in inside)
    if kind == "map" and isinstance(inside, dict):
        return {key: unpack(item) for key, item in inside.items()}
    raise ValueError(f"unknown kind {kind!r}")


def text_of(value: Any) -> str:
    """JSON of ``pack(value)``, the same for equal values: keys sorted, nothing but ASCII."""
    return json.dumps(
        pack(value), sort_keys=True, ensure_ascii=True, allow_nan=False, separators=(",", ":")
    )
