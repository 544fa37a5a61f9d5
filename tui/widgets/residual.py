"""The convergence chart as a widget; the drawing itself is in ``models.chart``."""

from __future__ import annotations

from rich.segment import Segment
from rich.style import Style
from textual.strip import Strip
from textual.widget import Widget

from kingpost.tui.models.chart import Cell, Series, chart
from kingpost.tui.widgets.lines import looks_of


class ResidualChart(Widget):
    """Residual, bound, tolerance and proven order against the sweep."""

    DEFAULT_CSS = """
    ResidualChart { height: 1fr; width: 100%; background: ansi_default; color: ansi_default; }
    """

    _series: Series | None = None
    _grid: list[list[Cell]] | None = None

    def show(self, series: Series) -> None:
        """Draw these series."""
        self._series, self._grid = series, None
        self.refresh()

    def on_resize(self) -> None:
        self._grid = None

    def render_line(self, y: int) -> Strip:
        width, height = self.size
        if self._series is None:
            return Strip.blank(width)
        looks = looks_of(self)
        if self._grid is None:
            self._grid = chart(self._series, width, height, looks.glyphs)
        if y >= len(self._grid):
            return Strip.blank(width)
        segments: list[Segment] = []
        for text, role in runs(self._grid[y]):
            segments.append(Segment(text, Style.parse(looks.styles[role])))
        return Strip(segments).adjust_cell_length(width)


def runs(cells: list[Cell]) -> list[Cell]:
    """Neighbouring cells of one style joined: fewer escape sequences on the wire."""
    runs: list[Cell] = []
    for char, role in cells:
        if runs and runs[-1][1] == role:
            runs[-1] = (runs[-1][0] + char, role)
        else:
            runs.append((char, role))
    return runs
