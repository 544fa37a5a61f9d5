"""Python values as JSON (RFC 8259): no NaN, ids of their own type where JSON has it.

Integers, booleans and text stay what they are; decimals and dates become text (ISO 8601);
bytes become text where they are UTF-8, else ``0x`` and hexadecimal digits.
"""

from __future__ import annotations

import datetime as dt
import decimal
import enum
import json
import math
import re
import unicodedata
from collections.abc import Mapping
from typing import Any

import numpy as np

from kingpost.core.text import id_text

_BEYOND_ASCII = re.compile(r"[\x7f-\U0010ffff]")


def jsonable(value: Any) -> Any:
    """``value`` in terms of what JSON has; NaN and infinities become None."""
    if isinstance(value, enum.Enum):
        return jsonable(value.value)
    if value is None or isinstance(value, (str, bool, int)):
        return value
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, np.generic):
        return jsonable(value.item())
    if isinstance(value, np.ndarray):
        return f"{len(value):,} values" if value.ndim == 1 and len(value) > 64 else _items(value)
    if isinstance(value, Mapping):
        return {id_text(key): jsonable(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return _items(value)
    if isinstance(value, dt.timedelta):
        return value.total_seconds()
    if isinstance(value, (bytes, decimal.Decimal, dt.date, dt.time)):
        return id_text(value)
    return str(value)


def _items(values: Any) -> list[Any]:
    return [jsonable(item) for item in values]


def dumps(value: Any, *, indent: int | None = None, ascii_only: bool = False) -> str:
    """JSON text of a value, exact and harmless on a terminal.

    Characters that would act on a terminal or reorder a line are written as ``\\uXXXX``, which
    every JSON reader turns back; all others stay readable unless ``ascii_only``.
    """
    text = json.dumps(jsonable(value), indent=indent, ensure_ascii=ascii_only, allow_nan=False)
    return tamed(text)


def tamed(text: str) -> str:
    """JSON text with what would act on a terminal escaped; reads as the same value."""
    if text.isascii() and "\x7f" not in text:
        return text
    return _BEYOND_ASCII.sub(_escaped, text)


def _escaped(match: re.Match[str]) -> str:
    char = match[0]
    if unicodedata.category(char)[0] not in "CZ":
        return char
    units = char.encode("utf-16-be", "surrogatepass")
    return "".join(f"\\u{units[i]:02x}{units[i + 1]:02x}" for i in range(0, len(units), 2))
