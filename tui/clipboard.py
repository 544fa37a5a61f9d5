"""Copying by the terminal itself (OSC 52), which reaches the reader's own machine over SSH."""

from __future__ import annotations

import base64

from kingpost.core.text import visible

# Terminals cut or drop longer sequences without a word.
LIMIT = 4_096


def sequence(text: str) -> str | None:
    """The escape sequence that asks a terminal to copy ``text``; None if it is too long.

    Control characters are written out, so that pasting into a shell runs nothing; tabs between
    the cells of a row stay.
    """
    safe = "\t".join(visible(cell) for cell in text.split("\t"))
    data = safe.encode("utf-8", "replace")
    if len(data) > LIMIT:
        return None
    return f"\x1b]52;c;{base64.b64encode(data).decode('ascii')}\x07"
