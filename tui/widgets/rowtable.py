"""The table by row window: asks its source for the few rows on the screen, whatever their number.

A cursor move repaints only the frozen part (rail, rank, name) of two rows; at the edge the
window jumps half a page instead of scrolling line by line, which over a slow line costs a
tenth of the bytes.
"""

from __future__ import annotations

from typing import Protocol

from rich.style import Style
from textual.geometry import Region
from textual.message import Message
from textual.strip import Strip
from textual.widget import Widget

from kingpost.tui.models.columns import Column
from kingpost.tui.models.drawing import fit
from kingpost.tui.widgets.lines import Piece, looks_of, strip_of

_GAP = "  "
_LEAST_NAME = 8
_SLIVER = 8  # a column of which fewer cells than this are in sight is not shown
_UNDERLINED = Style(underline=True)
_RAIL_ROLES = ("proven", "open", "tied", "quiet")


class Source(Protocol):
    """What a table shows: ``count`` rows, each an item that the columns turn into text.

    A source may also have ``kept(item)``: whether the item is on the shortlist, and ``settled``:
    the row under which a line is drawn.
    """

    head: list[Column]

    @property
    def count(self) -> int: ...

    def item(self, row: int) -> int: ...

    def rail(self, row: int) -> int: ...

    def marked(self, row: int) -> bool: ...


class RowTable(Widget):
    """Rows of a :class:`Source` under a line of headings."""

    DEFAULT_CSS = "RowTable { height: 1fr; width: 100%; }"

    class Moved(Message):
        """The cursor stands on another row."""

        def __init__(self, table: RowTable) -> None:
            super().__init__()
            self.table = table

    def __init__(
        self,
        id: str | None = None,
        *,
        headings: bool = True,
        rail: bool = True,
        active: bool = True,
    ) -> None:
        super().__init__(id=id)
        self._source: Source | None = None
        self._headings = headings
        self._rail = rail
        self._active = active
        self._empty = ""
        self._sorted: tuple[str, bool] = ("", False)
        self._top = 0
        self._row = 0
        self._first = 0  # the first of the scrolling columns that is shown
        self._widths: list[int] = []
        self._measured: tuple[int, int] = (-1, -1)  # the size the widths were chosen for

    # ---- what it shows -------------------------------------------------------------------

    def show(
        self,
        source: Source,
        row: int = 0,
        *,
        sorted_by: tuple[str, bool] = ("", False),
        empty: str = "",
    ) -> None:
        """Show a source with the cursor on ``row``; ``empty`` is said where it has no rows."""
        height = self._page
        offset = self._row - self._top
        self._source, self._empty, self._sorted = source, empty, sorted_by
        self._row = min(max(row, 0), max(source.count - 1, 0))
        if not self._top <= self._row < self._top + height:
            # Keep the cursor at the same height on the screen where that is possible.
            self._top = self._row - min(max(offset, 0), height - 1)
        self._top = min(max(self._top, 0), max(source.count - height, 0))
        self._measured = (-1, -1)
        self.refresh()

    @property
    def source(self) -> Source | None:
        """What it shows."""
        return self._source

    @property
    def row(self) -> int:
        """The row under the cursor."""
        return self._row

    @property
    def count(self) -> int:
        """Number of rows."""
        return self._source.count if self._source else 0

    @property
    def active(self) -> bool:
        """Whether its cursor is shown."""
        return self._active

    def headings(self, shown: bool) -> None:
        """Show a line of headings over the rows, or not."""
        if shown != self._headings:
            self._headings = shown
            self._measured = (-1, -1)
            self.refresh()

    def activate(self, active: bool) -> None:
        """Show or hide the cursor."""
        if active != self._active:
            self._active = active
            self._paint(self._row)

    def repaint(self) -> None:
        """Repaint the row under the cursor: its mark has changed."""
        self._paint(self._row)

    def item(self) -> int | None:
        """The item under the cursor."""
        return self._source.item(self._row) if self._source and self.count else None

    # ---- moving ----------------------------------------------------------------------------

    @property
    def _page(self) -> int:
        return max(self.size.height - (1 if self._headings else 0), 1)

    def move(self, rows: int) -> bool:
        """Move the cursor; False if it stands at the end already."""
        return self.go(self._row + rows)

    def page(self, pages: int) -> bool:
        """Move the cursor by whole pages."""
        return self.go(self._row + pages * max(self._page - 1, 1))

    def go(self, row: int) -> bool:
        """Put the cursor on a row, jumping half a page where it is out of sight."""
        row = min(max(row, 0), max(self.count - 1, 0))
        if row == self._row:
            return False
        before, self._row = self._row, row
        height = self._page
        if self._top <= row < self._top + height:
            self._paint(before)
            self._paint(row)
        else:
            half = height // 2
            beyond = row - half if abs(row - before) > height else None
            if beyond is None:
                beyond = self._top + half if row >= self._top + height else self._top - half
            self._top = min(max(beyond, 0, row - height + 1), max(self.count - height, 0), row)
            self.refresh()
        self.post_message(self.Moved(self))
        return True

    def sideways(self, columns: int) -> None:
        """Scroll the columns that are not frozen."""
        self._measure()
        scrolling = sum(not column.frozen for column in self._source.head) if self._source else 0
        last = self._last_first(scrolling)
        first = min(max(self._first + columns, 0), last)
        if first != self._first:
            self._first = first
            self.refresh()

    # ---- painting --------------------------------------------------------------------------

    def _measure(self) -> None:
        """Choose widths for the present size, if they are not chosen yet: the name column takes
        what is left, within reason.  Done on painting, because the first painting may come
        before the news of the size.
        """
        if self._source is None or self._measured == tuple(self.size):
            return
        self._measured = (self.size.width, self.size.height)
        height = self._page
        if not self._top <= self._row < self._top + height:
            self._top = self._row - height // 2
        self._top = min(max(self._top, 0), max(self.count - height, 0))
        head = self._source.head
        self._widths = [max(column.width, 1) for column in head]
        lead = 2 if self._rail else 1
        spare = self.size.width - lead - sum(self._widths) - len(_GAP) * (len(head) - 1) - 1
        for at, column in enumerate(head):
            if column.stretch and spare > 0:
                extra = min(spare, column.stretch - column.width)
                self._widths[at] += max(extra, 0)
                spare -= max(extra, 0)
        room = self.size.width - lead - 10  # at least the score beside the frozen part
        for at, column in enumerate(head):
            over = (
                sum(w + len(_GAP) for w, c in zip(self._widths, head, strict=True) if c.frozen)
                - room
            )
            if column.frozen and column.stretch and over > 0:
                self._widths[at] = max(self._widths[at] - over, _LEAST_NAME)
        scrolling = sum(not column.frozen for column in head)
        self._first = min(self._first, self._last_first(scrolling))

    def _last_first(self, scrolling: int) -> int:
        """The furthest the columns may be scrolled: the last one comes into full view."""
        if self._source is None:
            return 0
        head = self._source.head
        room = self.size.width - (2 if self._rail else 1)
        room -= sum(w + len(_GAP) for w, c in zip(self._widths, head, strict=True) if c.frozen)
        used, shown = 0, 0
        for width, column in zip(reversed(self._widths), reversed(head), strict=True):
            if column.frozen:
                continue
            used += width + len(_GAP)
            if used - len(_GAP) > room:
                break
            shown += 1
        return max(scrolling - max(shown, 1), 0)

    def _shown_columns(self) -> list[tuple[int, Column]]:
        assert self._source is not None
        out, scrolled = [], 0
        room = self.size.width - (2 if self._rail else 1)
        for at, column in enumerate(self._source.head):
            if not column.frozen:
                scrolled += 1
                if scrolled <= self._first:
                    continue
                # A sliver of a column says nothing; a good part of a wide one does.
                if room < min(self._widths[at], _SLIVER) and scrolled > self._first + 1:
                    break
            room -= self._widths[at] + len(_GAP)
            out.append((at, column))
        return out

    def _paint(self, row: int) -> None:
        """Repaint the frozen part of a row: all that a cursor move changes."""
        if self._source is None:
            return
        self._measure()
        y = row - self._top + (1 if self._headings else 0)
        lead = 2 if self._rail else 1
        frozen = [w for w, c in zip(self._widths, self._source.head, strict=True) if c.frozen]
        # One cell more than the names take: the mark of a shortlisted node.
        width = lead + sum(frozen) + len(_GAP) * (len(frozen) - 1) + 1
        self.refresh(Region(0, y, min(width, self.size.width), 1))

    def render_line(self, y: int) -> Strip:
        width = self.size.width
        if self._source is None or width <= 0:
            return Strip.blank(width)
        self._measure()
        looks = looks_of(self)
        if self._headings and y == 0:
            return strip_of(self._heading_pieces(), width, looks)
        row = self._top + y - (1 if self._headings else 0)
        if row < self.count:
            strip = strip_of(self._row_pieces(row), width, looks)
            # The one line in the table: it costs no row and shows without a colour.
            settled = row == getattr(self._source, "settled", -1)
            return strip.apply_style(_UNDERLINED) if settled else strip
        if self.count == 0 and y == (1 if self._headings else 0):
            return strip_of([("  " + self._empty, "plain")], width, looks)
        return Strip.blank(width)

    def _heading_pieces(self) -> list[Piece]:
        glyphs = looks_of(self).glyphs
        key, rising = self._sorted
        pieces: list[Piece] = [("  " if self._rail else " ", "title")]
        columns = self._shown_columns()
        for place, (at, column) in enumerate(columns):
            text = fit(column.title, self._widths[at], column.right, glyphs)
            by = column.key == key
            role = "strong" if by else "title"
            pieces.append((text, role))
            mark = (glyphs.rising if rising else glyphs.falling) if by else " "
            pieces.append((mark, role))
            if place < len(columns) - 1:
                pieces.append((" " * (len(_GAP) - 1), "title"))
        return pieces

    def _row_pieces(self, row: int) -> list[Piece]:
        assert self._source is not None
        looks, source = looks_of(self), self._source
        glyphs = looks.glyphs
        here = self._active and row == self._row
        pieces: list[Piece] = []
        if self._rail:
            code = source.rail(row)
            pieces.append((glyphs.rail[code], _RAIL_ROLES[code]))
        pieces.append((glyphs.pointer if here else " ", "plain"))
        item = source.item(row)
        hit = source.marked(row)
        kept = getattr(source, "kept", None)
        columns = self._shown_columns()
        for place, (at, column) in enumerate(columns):
            text = fit(column.text(item), self._widths[at], column.right, glyphs)
            role = "cursor" if here and column.frozen else column.style
            if hit and column.frozen and column.stretch:
                # Two roles at once: a style in words is taken as it is.
                role = f"{looks.styles[role]} {looks.styles['hit']}".strip()
            pieces.append((text, role))
            if column.frozen and column.stretch and kept is not None and kept(item):
                # The mark stands in the gap behind the name, whether there is a column or not.
                pieces.append((glyphs.mark, "mark"))
                pieces.append((_GAP[1:], "plain"))
            elif place < len(columns) - 1:
                beside = here and column.frozen and columns[place + 1][1].frozen
                pieces.append((_GAP, "cursor" if beside else "plain"))
        return pieces

    @property
    def rows_shown(self) -> list[str]:
        """The lines of the table as plain text, for tests."""
        return [
            "".join(s.text for s in self.render_line(y)).rstrip() for y in range(self.size.height)
        ]
