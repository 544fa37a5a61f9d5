"""The rule above the standings: the filter in force, and how the scores are spread."""

from __future__ import annotations

import math

from rich.cells import cell_len
from textual.geometry import Region
from textual.strip import Strip

from kingpost.tui.models.drawing import fit
from kingpost.tui.models.spread import WIDTH, Spread
from kingpost.tui.widgets.lines import Line, Piece, looks_of, strip_of

_LEAST = 12  # cells of the histogram below which it is left out


class SpreadRule(Line):
    """A rule with a histogram on the left, a cell of it marked, and a title behind it.

    A terminal is sent a line from its beginning to what changed: the histogram stands first, so
    that moving the mark costs little.
    """

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._title = ""
        self._spread: Spread | None = None
        self._score = math.nan

    def show_spread(self, title: str, spread: Spread) -> None:
        """Show another title and the spread of other scores."""
        if (title, id(spread)) != (self._title, id(self._spread)):
            self._title, self._spread = title, spread
            self.refresh()

    def mark(self, score: float | None) -> None:
        """Mark where a score is."""
        before, self._score = self._place(), math.nan if score is None else float(score)
        here = self._place()
        if before != here:
            both = [x for x in (before, here) if x is not None]
            self.refresh(Region(min(both), 0, max(both) - min(both) + 1, 1))

    def _bars(self) -> tuple[int, int]:
        """Where the histogram begins, and how many cells it has; none where there is no room."""
        spread, width = self._spread, self.size.width
        if spread is None or not math.isfinite(spread.low):
            return 0, 0
        start = 1 + cell_len(self._before())
        title = min(cell_len(self._title) + 4, width // 2) if self._title else 2
        room = min(width - start - cell_len(self._after()) - title, WIDTH)
        return (start, room) if room >= _LEAST else (0, 0)

    def _before(self) -> str:
        assert self._spread is not None
        zeros = f"{self._spread.zeros:,} at 0, " if self._spread.zeros else ""
        return f" scores {zeros}{self._spread.low:.2g} "

    def _after(self) -> str:
        assert self._spread is not None
        return f" {self._spread.high:.2g} "

    def _place(self) -> int | None:
        start, cells = self._bars()
        if self._spread is None or not cells:
            return None
        at = self._spread.cell(self._score, cells)
        return None if at is None else start + at

    @property
    def plain(self) -> str:
        return "".join(text for text, _ in self._pieces())

    def _pieces(self) -> list[Piece]:
        looks, width = looks_of(self), self.size.width
        rule = looks.glyphs.rule
        start, cells = self._bars()
        spread = self._spread
        if spread is None or not cells:
            shown = fit(self._title, min(cell_len(self._title), max(width - 4, 0)))
            title = f" {shown} " if shown else ""
            rest = max(width - 1 - cell_len(title), 0)
            return [(rule, "rule"), (title, "strong"), (rule * rest, "rule")]
        pieces: list[Piece] = [(rule, "rule"), (self._before(), "plain")]
        bars = spread.bars(cells, looks.glyphs)
        at = spread.cell(self._score, cells)
        if at is None:
            pieces.append((bars, "bar"))
        else:
            pieces += [(bars[:at], "bar"), (looks.glyphs.here, "cursor"), (bars[at + 1 :], "bar")]
        pieces.append((self._after(), "plain"))
        room = width - start - cells - cell_len(self._after())
        if self._title:
            shown = fit(self._title, min(cell_len(self._title), room - 4), glyphs=looks.glyphs)
            pieces += [(rule, "rule"), (f" {shown} ", "strong")]
            room -= cell_len(shown) + 3
        return [*pieces, (rule * max(room, 0), "rule")]

    def render_line(self, y: int) -> Strip:
        return strip_of(self._pieces(), self.size.width, looks_of(self))
