"""How wide text stands on a terminal, and cutting and padding it to a width.

Widths follow Unicode Standard Annex 11 (East Asian Width): wide and full-width characters take
two columns, combining marks none, everything else one.  Text is expected to have gone through
:func:`kingpost.core.text.visible` already.
"""

from __future__ import annotations

import unicodedata


def width(text: str) -> int:
    """Columns that ``text`` takes."""
    if text.isascii():
        return len(text)
    return sum(map(_columns, text))


def _columns(char: str) -> int:
    if unicodedata.combining(char) or unicodedata.category(char) in ("Mn", "Me"):
        return 0
    return 2 if unicodedata.east_asian_width(char) in ("W", "F") else 1


def cut(text: str, limit: int, ellipsis: str = "…") -> str:
    """``text`` if it fits into ``limit`` columns, else its beginning and an ellipsis."""
    if width(text) <= limit:
        return text
    room = limit - len(ellipsis)
    if room < 0:
        return ellipsis[:limit]
    used, kept = 0, []
    for char in text:
        used += _columns(char)
        if used > room:
            break
        kept.append(char)
    return "".join(kept) + ellipsis


def left(text: str, columns: int) -> str:
    """``text`` padded on its right."""
    return text + " " * (columns - width(text))


def right(text: str, columns: int) -> str:
    """``text`` padded on its left."""
    return " " * (columns - width(text)) + text


def wrap(text: str, limit: int, indent: str = "") -> list[str]:
    """``text`` broken at spaces into lines of at most ``limit`` columns.

    Lines after the first begin with ``indent``; a word longer than a line is cut.
    """
    body = text.lstrip(" ")
    line = " " * (len(text) - len(body))
    lines: list[str] = []
    for word in body.split(" "):
        longer = f"{line} {word}" if line.strip() else line + word
        if line.strip() and width(longer) > limit:
            lines.append(line)
            longer = indent + word
        line = cut(longer, limit)
    lines.append(line)
    return lines


def plain_ascii(text: str) -> str:
    """``text`` with every character outside ASCII written as ``\\u{...}``.

    The few signs this package puts into sentences of its own have ASCII twins.
    """
    if text.isascii():
        return text
    return "".join(
        char if char.isascii() else _TWINS.get(char, f"\\u{{{ord(char):x}}}") for char in text
    )


_TWINS = {
    "…": "~",
    "┃": "|",
    "╎": ":",
    "─": "-",
    "→": "->",
    "×": "x",
    "≤": "<=",
    "–": "-",
    "·": ".",
}
