"""One-line widgets: a line of text, the rule that carries news, the line of keys."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

from rich.cells import cell_len
from rich.segment import Segment
from rich.style import Style
from textual.geometry import Region
from textual.strip import Strip
from textual.widget import Widget

from kingpost.tui.models.drawing import cut, fit
from kingpost.tui.terminal import Looks

Piece = tuple[str, str]  # text, role of its style


def looks_of(widget: Widget) -> Looks:
    """The looks of the app a widget lives in."""
    looks = getattr(widget.app, "looks", None)
    return looks if isinstance(looks, Looks) else Looks()


def strip_of(pieces: Iterable[Piece], width: int, looks: Looks) -> Strip:
    """Styled pieces as one row of exactly ``width`` cells; nothing in them is read as markup.

    Neighbours of one style are joined, which saves the bytes of switching styles.
    """
    runs: list[tuple[str, str]] = []
    left = width
    for text, role in pieces:
        size = cell_len(text)
        if size > left:
            text = fit(text.rstrip(), left, glyphs=looks.glyphs)
            size = left
        if size > 0:
            style = looks.styles.get(role, role)
            if runs and runs[-1][1] == style:
                runs[-1] = (runs[-1][0] + text, style)
            else:
                runs.append((text, style))
            left -= size
        if left <= 0:
            break
    segments = [Segment(text, Style.parse(style) if style else None) for text, style in runs]
    if left > 0:
        segments.append(Segment(" " * left))
    return Strip(segments, width)


class Line(Widget):
    """A line (or a few) of styled pieces; repaints only as far as it changed."""

    DEFAULT_CSS = "Line { height: 1; width: 100%; }"

    def __init__(self, id: str | None = None, classes: str | None = None, rows: int = 1) -> None:
        super().__init__(id=id, classes=classes)
        self._rows: list[Sequence[Piece]] = [()] * rows
        self._make: Callable[[int], Sequence[Piece]] | None = None
        self._made_for = -1
        if rows > 1:
            self.styles.height = rows

    def show(self, *pieces: Piece) -> None:
        """Show these pieces in the only line."""
        self.show_rows([pieces])

    def show_by(self, make: Callable[[int], Sequence[Piece]]) -> None:
        """Show what ``make(width)`` gives, for this width and every later one."""
        self._replace([make(self.size.width)] if self.size.width else self._rows)
        self._make, self._made_for = make, self.size.width

    def show_rows(self, rows: Sequence[Sequence[Piece]]) -> None:
        """Show one sequence of pieces a line; lines beyond the height are not shown."""
        self._make = None
        self._replace(rows)

    def _replace(self, rows: Sequence[Sequence[Piece]]) -> None:
        old, self._rows = self._rows, list(rows)
        for y in range(max(len(old), len(self._rows))):
            before = old[y] if y < len(old) else ()
            after = self._rows[y] if y < len(self._rows) else ()
            if tuple(before) != tuple(after):
                self.refresh(Region(0, y, self._reach(before, after), 1))

    def _reach(self, before: Sequence[Piece], after: Sequence[Piece]) -> int:
        """Cells up to the end of the longer of two lines: nothing right of it has changed."""
        sizes = [sum(cell_len(text) for text, _ in line) for line in (before, after)]
        return max(1, min(max(sizes), self.size.width or 1))

    @property
    def plain(self) -> str:
        """The text shown, for tests and for reading aloud."""
        return "\n".join("".join(text for text, _ in row) for row in self._rows)

    def render_line(self, y: int) -> Strip:
        if self._make is not None and self._made_for != self.size.width:
            self._rows, self._made_for = [self._make(self.size.width)], self.size.width
        pieces = self._rows[y] if y < len(self._rows) else ()
        return strip_of(pieces, self.size.width, looks_of(self))


class Rule(Line):
    """A rule across the screen that can carry a title on the left and news on the right."""

    def __init__(self, id: str | None = None, classes: str | None = None, title: str = "") -> None:
        super().__init__(id=id, classes=classes)
        self._title = title
        self._news: Piece = ("", "news")

    def title(self, title: str) -> None:
        """Write a title into the rule."""
        if title != self._title:
            self._title = title
            self.refresh()

    def tell(self, text: str, role: str = "news") -> None:
        """Write news into the rule; empty text takes them away."""
        if (text, role) != self._news:
            self._news = (text, role)
            self.refresh()

    @property
    def news(self) -> str:
        """The news shown."""
        return self._news[0]

    def render_line(self, y: int) -> Strip:
        looks = looks_of(self)
        rule, width = looks.glyphs.rule, self.size.width
        text, role = self._news
        pieces: list[Piece] = [(rule, "rule")]
        if self._title:
            pieces.append((f" {cut(self._title, max(width - 6, 0))} ", "strong"))
        used = sum(cell_len(part) for part, _ in pieces)
        if text:
            room = max(width - used - 4, 0)
            shown = fit(text, room, glyphs=looks.glyphs) if cell_len(text) > room else text
            pieces.append((rule, "rule"))
            pieces.append((f" {shown} ", role))
            used += cell_len(shown) + 3
        pieces.append((rule * max(width - used, 0), "rule"))
        return strip_of(pieces, width, looks)


class KeyLine(Line):
    """The keys that do something here and now; as many as fit, the way to all of them always."""

    def keys(self, items: Sequence[tuple[str, str]]) -> None:
        """Show (key, words) pairs, most useful first."""
        kept = tuple(items)
        self.show_by(lambda width: _fitting(kept, width))


def _fitting(items: Sequence[tuple[str, str]], width: int) -> list[Piece]:
    help_item = [item for item in items if item[0] == "?"]
    used = sum(_size(item) for item in help_item) + 1
    chosen: list[tuple[str, str]] = []
    for item in items:
        if item[0] == "?":
            continue
        if used + _size(item) > width:
            break
        used += _size(item)
        chosen.append(item)
    pieces: list[Piece] = [(" ", "plain")]
    for key, words in [*chosen, *help_item]:
        pieces += [(key, "key"), (f" {words}   ", "plain")]
    return pieces


def _size(item: tuple[str, str]) -> int:
    return cell_len(item[0]) + cell_len(item[1]) + 4
