"""Columns of text under headings, as a terminal table or as a Markdown table."""

from __future__ import annotations

import re
from dataclasses import dataclass

from kingpost.core.export.cells import cut, left, right, width


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a table whose texts are already safe to show.

    ``align`` is ``<`` or ``>``; a column with ``least`` may be narrowed to that many columns;
    an ``optional`` one is left out where there is no room.
    """

    title: str
    cells: list[str]
    align: str = "<"
    least: int | None = None
    optional: bool = False

    @property
    def full(self) -> int:
        """Columns it takes uncut."""
        return max([width(self.title), *map(width, self.cells)])


GAP = "  "
USUAL = 32  # columns that a column which may be narrowed gets before optional ones get theirs


def terminal_table(columns: list[Column], limit: int, ellipsis: str = "…") -> tuple[list[str], int]:
    """Lines of a table at most ``limit`` columns wide, and how many optional columns it left out.

    Columns that may be narrowed begin at no more than 32 columns and are narrowed further
    where even that is too wide; optional columns are taken from the left while they fit at
    their full width or at 12; what is left then goes back to the first that were narrowed.
    """
    must = [column for column in columns if not column.optional]
    flexible = [column for column in must if column.least is not None]
    widths = {
        id(column): column.full if column.least is None else min(column.full, USUAL)
        for column in must
    }

    def spare() -> int:
        return limit - sum(widths.values()) - len(GAP) * (len(widths) - 1)

    for column in sorted(flexible, key=lambda c: -widths[id(c)]):
        if spare() < 0:
            widths[id(column)] = max(column.least or 1, widths[id(column)] + spare())
    left_out = 0
    for column in columns:
        if column.optional:
            room = spare() - len(GAP)
            if min(column.full, 12) <= room and not left_out:
                widths[id(column)] = min(column.full, room)
            else:
                left_out += 1
    for column in flexible:
        if spare() > 0:
            widths[id(column)] = min(column.full, widths[id(column)] + spare())
    shown = [column for column in columns if id(column) in widths]
    lines = [_line([c.title for c in shown], shown, widths, ellipsis)]
    for row in range(max((len(c.cells) for c in shown), default=0)):
        lines.append(_line([c.cells[row] for c in shown], shown, widths, ellipsis))
    return lines, left_out


def _line(texts: list[str], columns: list[Column], widths: dict[int, int], ellipsis: str) -> str:
    parts = []
    for text, column in zip(texts, columns, strict=True):
        room = widths[id(column)]
        text = cut(text, room, ellipsis)
        parts.append(right(text, room) if column.align == ">" else left(text, room))
    return GAP.join(parts).rstrip()


def markdown_table(columns: list[Column]) -> list[str]:
    """Lines of a pipe table with every cell escaped."""
    rules = ["---:" if column.align == ">" else "---" for column in columns]
    lines = [_pipes([escaped(column.title) for column in columns]), _pipes(rules)]
    for row in range(max((len(c.cells) for c in columns), default=0)):
        lines.append(_pipes([escaped(column.cells[row].strip()) for column in columns]))
    return lines


def _pipes(cells: list[str]) -> str:
    return "| " + " | ".join(cells) + " |"


_SPECIAL = re.compile(r"[\\`*_\[\]<>|~$!]|(?<=www)\.|:(?=//)")


def escaped(text: str) -> str:
    """``text`` as Markdown that reads as the same text: no markup, links, entities or HTML.

    Backslash escapes as in CommonMark 0.31, section 2.4; ``&`` and ``@`` as entities, because
    not every renderer takes an escape for them.
    """
    text = text.replace("&", "&amp;").replace("@", "&#64;")
    return _SPECIAL.sub(lambda match: "\\" + match[0], text)
