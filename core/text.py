"""Text that came from data, made safe for a terminal and for people.

A node may be called anything at all: an escape sequence, a right-to-left override, five
kilobytes of one letter.  Whatever is shown goes through :func:`visible` first; whatever is
exported as data does not.
"""

from __future__ import annotations

import datetime as _dt
import decimal as _decimal
import unicodedata

# Categories that move the cursor, reorder or hide their neighbours, or have no agreed shape.
_HIDDEN = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})
_NAMED = {"\n": "\\n", "\r": "\\r", "\t": "\\t", "\x1b": "\\e", "\x00": "\\0"}


def visible(text: str, limit: int | None = None) -> str:
    """Return ``text`` with every character that could act on a terminal written out.

    Control characters become ``\\e``, ``\\n`` or ``\\xNN``; bidirectional controls, other
    format characters, surrogates and unassigned code points become ``\\u{NNNN}``.  A longer
    text than ``limit`` characters is cut and ends in an ellipsis.
    """
    if limit is not None and len(text) > limit:
        text = text[: max(limit - 1, 0)] + "…"
    if text.isascii() and text.isprintable():
        return text
    return "".join(map(_shown, text))


def _shown(char: str) -> str:
    if char in _NAMED:
        return _NAMED[char]
    if unicodedata.category(char) not in _HIDDEN:
        return char
    code = ord(char)
    return f"\\x{code:02x}" if code < 0x100 else f"\\u{{{code:x}}}"


def id_text(value: object) -> str:
    """The plain text of an id of any type, as it is compared with what a user types.

    Not made safe: pass it through :func:`visible` before it meets a terminal.  Bytes that are
    UTF-8 read as text, other bytes as ``0x`` and hexadecimal digits.
    """
    if isinstance(value, str):
        return value
    if isinstance(value, bytes):
        try:
            return value.decode("utf-8")
        except UnicodeDecodeError:
            return "0x" + value.hex()
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, _dt.date | _dt.datetime | _dt.time):
        return value.isoformat()
    if isinstance(value, _decimal.Decimal):
        return format(value, "f")
    return str(value)


def listed(items: list[str], limit: int = 3) -> str:
    """``a, b, c and 4 more``: the first few of a list, for a sentence."""
    if len(items) <= limit:
        return ", ".join(items)
    return f"{', '.join(items[:limit])} and {len(items) - limit:,} more"


def count(number: int, one: str, many: str | None = None) -> str:
    """``1 node``, ``1,234 nodes``: a count with its noun."""
    return f"{number:,} {one if number == 1 else many or one + 's'}"
