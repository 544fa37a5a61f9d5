"""Text and bars measured in terminal cells: fitting names, share bars, the rank ruler."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Mapping, Sequence

from rich.cells import cell_len

from kingpost.tui.terminal import UNICODE, Glyphs

_MARKS_EACH = 2  # combining marks kept on one character; more only pile up on the line above


def tame(text: str, glyphs: Glyphs = UNICODE) -> str:
    """Printable text whose width in cells can be relied on.

    Variation selectors are dropped and combining marks limited, because terminals disagree
    about their width; in ASCII other characters are written out.  The text must have gone
    through :func:`kingpost.core.text.visible`.
    """
    if text.isascii():
        return text
    if glyphs.ascii:
        return text.encode("ascii", "backslashreplace").decode("ascii")
    out: list[str] = []
    marks = 0
    for char in text:
        if unicodedata.combining(char) or unicodedata.category(char) in ("Mn", "Me"):
            marks += 1
            if marks > _MARKS_EACH or 0xFE00 <= ord(char) <= 0xFE0F or ord(char) >= 0xE0100:
                continue
        else:
            marks = 0
        out.append(char)
    return "".join(out)


def fit(text: str, width: int, right: bool = False, glyphs: Glyphs = UNICODE) -> str:
    """``text`` in exactly ``width`` cells: padded, or cut with an ellipsis."""
    if width <= 0:
        return ""
    text = tame(text[: 8 * width + 16], glyphs)
    size = len(text) if text.isascii() else cell_len(text)
    if size > width:
        text = cut(text, width - 1) + glyphs.ellipsis
        size = cell_len(text)
    pad = " " * (width - size)
    return pad + text if right else text + pad


def cut(text: str, width: int) -> str:
    """The longest beginning of ``text`` that takes at most ``width`` cells."""
    if text.isascii():
        return text[: max(width, 0)]
    used = 0
    for at, char in enumerate(text):
        used += cell_len(char)
        if used > width:
            return text[:at]
    return text


def bar(share: float, width: int, glyphs: Glyphs = UNICODE) -> str:
    """A bar for a share of 0..1, at most ``width`` cells; anything positive shows something."""
    if not share > 0.0 or width <= 0:
        return ""
    steps = len(glyphs.bar)
    filled = max(1, min(round(share * width * steps), width * steps))
    whole, part = divmod(filled, steps)
    return glyphs.bar[-1] * whole + (glyphs.bar[part - 1] if part else "")


def ruler(ranks: Mapping[str, int], n: int, width: int, glyphs: Glyphs = UNICODE) -> str:
    """Where a node stands in every measure, on a logarithmic axis from rank 1 to rank n.

    ``ranks`` maps a measure's letter to a rank.  Letters that fall on one cell stand beside
    each other, in the order of their ranks.
    """
    track = max(len(ranks), width)
    cells = [glyphs.track] * track
    span = math.log(n) if n > 1 else 1.0
    for letter, rank in sorted(ranks.items(), key=lambda item: (item[1], item[0])):
        wanted = round(math.log(max(rank, 1)) / span * (track - 1)) if n > 1 else 0
        at = _free(cells, min(max(wanted, 0), track - 1), glyphs.track)
        cells[at] = letter
    return "".join(cells)


def _free(cells: Sequence[str], wanted: int, track: str) -> int:
    """The free cell nearest to the wanted one, the right one first."""
    for reach in range(len(cells)):
        for at in (wanted + reach, wanted - reach):
            if 0 <= at < len(cells) and cells[at] == track:
                return at
    return wanted


def wrap(text: str, width: int) -> list[str]:
    """Words of a sentence in lines of at most ``width`` cells; a longer word is broken."""
    lines: list[str] = []
    line = ""
    for word in text.split():
        while cell_len(word) > width:
            if line:
                lines.append(line)
                line = ""
            part = cut(word, width) or word[0]
            lines.append(part)
            word = word[len(part) :]
        joined = f"{line} {word}" if line else word
        if cell_len(joined) > width:
            lines.append(line)
            line = word
        else:
            line = joined
    if line:
        lines.append(line)
    return lines
