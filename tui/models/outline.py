"""A neighbourhood drawn in characters: a row a node, a standing line for everything that flows.

Givers stand above the node and receivers below it, so that score flows down the screen.  Each
standing line is one receiver (or, for the node's own giving, one giver): a dot where a node gives
into the line, an arrowhead where one receives from it.  The two lines of the node in the
middle come first; lines with a row free between them share a column.  The same neighbourhood
always gives the same drawing.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from kingpost.core.insight.nearby import Nearby
from kingpost.tui.terminal import UNICODE, Glyphs

STEP = 2  # cells from one column to the next


@dataclass(frozen=True)
class Strand:
    """One standing line: the rows that give into it and those that receive from it."""

    givers: tuple[int, ...]
    takers: tuple[int, ...]

    @property
    def top(self) -> int:
        """Its first row."""
        return min(*self.givers, *self.takers)

    @property
    def foot(self) -> int:
        """Its last row."""
        return max(*self.givers, *self.takers)


@dataclass(frozen=True)
class Outline:
    """``lines[row]`` is drawn beside ``rows[row]``; ``hidden`` strands found no room."""

    rows: tuple[int, ...]
    lines: tuple[str, ...]
    hidden: int


def strands(near: Nearby) -> list[Strand]:
    """What has to be drawn: into the centre, out of it, then by receiver from the top."""
    row_of = {node: row for row, node in enumerate(near.rows)}
    pairs = sorted((row_of[giver], row_of[taker]) for giver, taker in near.edges)
    middle = len(near.above)
    found = []
    into = tuple(giver for giver, taker in pairs if taker == middle)
    out = tuple(taker for giver, taker in pairs if giver == middle)
    if into:
        found.append(Strand(into, (middle,)))
    if out:
        found.append(Strand((middle,), out))
    for taker in range(len(near.rows)):
        others = tuple(a for a, b in pairs if b == taker and middle not in (a, b))
        if others:
            found.append(Strand(others, (taker,)))
    return found


def columns(found: Sequence[Strand], lead: int = 2) -> list[int]:
    """A column for every strand; those with a row free between them share one.

    The first ``lead`` strands keep the columns they come in.
    """
    taken: list[list[Strand]] = []
    places = []
    for at, strand in enumerate(found):
        free = len(taken)
        for column in range(0 if at >= lead else free, len(taken)):
            if all(s.foot + 1 < strand.top or strand.foot + 1 < s.top for s in taken[column]):
                free = column
                break
        if free == len(taken):
            taken.append([])
        taken[free].append(strand)
        places.append(free)
    return places


def outline(near: Nearby, width: int, glyphs: Glyphs = UNICODE) -> Outline:
    """Draw into at most ``width`` cells a row; strands without room are counted, not drawn."""
    found = strands(near)
    places = columns(found)
    room = max(width // STEP, 0)
    used = min(max(places, default=-1) + 1, room)
    grid = [[" "] * (used * STEP) for _ in near.rows]
    last = [0] * len(near.rows)
    shown = [(s, p * STEP + 1) for s, p in zip(found, places, strict=True) if p < room]
    for strand, x in shown:
        for row in range(strand.top, strand.foot + 1):
            grid[row][x] = glyphs.axis
        for row in (*strand.givers, *strand.takers):
            last[row] = max(last[row], x)
    for row, reach in enumerate(last):  # a thread from the name to its furthest mark
        for x in range(reach):
            if grid[row][x] == " ":
                grid[row][x] = glyphs.track
    for strand, x in shown:
        for row in strand.givers:
            grid[row][x] = glyphs.gives
        for row in strand.takers:
            grid[row][x] = glyphs.takes
    lines = tuple("".join(line).rstrip() for line in grid)
    return Outline(near.rows, lines, len(found) - len(shown))
