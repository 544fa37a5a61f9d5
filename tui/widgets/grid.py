"""A drawing of cells made for the size there is."""

from __future__ import annotations

from collections.abc import Callable

from rich.segment import Segment
from rich.style import Style
from textual.strip import Strip
from textual.widget import Widget

from kingpost.tui.models.chart import Cell
from kingpost.tui.terminal import Glyphs
from kingpost.tui.widgets.lines import looks_of
from kingpost.tui.widgets.residual import runs

Make = Callable[[int, int, Glyphs], list[list[Cell]]]


class Grid(Widget):
    """Shows what ``make(width, height, glyphs)`` gives, made anew for every size."""

    DEFAULT_CSS = """
    Grid { height: 1fr; width: 100%; background: ansi_default; color: ansi_default; }
    """

    _make: Make | None = None
    _cells: list[list[Cell]] | None = None
    _made_for = (-1, -1)

    def show(self, make: Make) -> None:
        """Draw by another function."""
        self._make, self._cells = make, None
        self.refresh()

    def render_line(self, y: int) -> Strip:
        width, height = self.size
        if self._make is None or width <= 0:
            return Strip.blank(width)
        looks = looks_of(self)
        if self._cells is None or self._made_for != (width, height):
            self._cells = self._make(width, height, looks.glyphs)
            self._made_for = (width, height)
        if y >= len(self._cells):
            return Strip.blank(width)
        cells = runs(self._cells[y])
        segments = [Segment(text, Style.parse(looks.styles[role])) for text, role in cells]
        return Strip(segments).adjust_cell_length(width)
