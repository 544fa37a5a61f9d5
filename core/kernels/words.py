"""Loops over text cells: which are whole numbers in their plainest spelling."""

from __future__ import annotations

from typing import Any

from kingpost.core.kernels._compile import kernel

OTHER, NEGATIVE, BEYOND_SIGNED, BEYOND_UNSIGNED = 1, 2, 4, 8
_ZERO, _NINE, _MINUS = 48, 57, 45


@kernel()
def whole(offsets: Any, letters: Any, valid: Any) -> int:
    """What the cells that are not null hold, as flags; 0 for whole numbers from 0 to 2^63 - 1.

    ``OTHER``: something else than a whole number as a computer writes it (no leading zeros or
    plus sign, no blanks); ``NEGATIVE``, ``BEYOND_SIGNED`` (above 2^63 - 1) and
    ``BEYOND_UNSIGNED`` (above 2^64 - 1, or below -2^63) for numbers.  ``valid`` is empty where
    nothing is null.
    """
    flags = 0
    for i in range(len(offsets) - 1):
        if len(valid) and not valid[i]:
            continue
        at, end = offsets[i], offsets[i + 1]
        minus = at < end and letters[at] == _MINUS
        if minus:
            at += 1
            flags |= NEGATIVE
        size = end - at
        if size == 0 or (letters[at] == _ZERO and (size > 1 or minus)):
            return flags | OTHER
        for k in range(at, end):
            if letters[k] < _ZERO or letters[k] > _NINE:
                return flags | OTHER
        if size < 19:
            continue
        signed = 1  # the number against 2^63 (or 2^63 - 1, above 0): by its digits
        if size == 19:
            signed = _against(letters, at, b"9223372036854775807")
            if minus and signed > 0:
                signed = _against(letters, at, b"9223372036854775808")
        if signed > 0:
            flags |= BEYOND_UNSIGNED if minus else BEYOND_SIGNED
        if size > 20 or (size == 20 and _against(letters, at, b"18446744073709551615") > 0):
            flags |= BEYOND_UNSIGNED
    return flags


@kernel()
def _against(letters: Any, at: int, digits: Any) -> int:
    """-1, 0 or 1 as the digits from ``at`` on are below, equal to or above others."""
    for k in range(len(digits)):
        if letters[at + k] != digits[k]:
            return -1 if letters[at + k] < digits[k] else 1
    return 0
