"""Drawings for a report: SVG in the page's own colours, told apart by more than colour."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from itertools import pairwise

WIDTH, HEIGHT = 760, 300
_LEFT, _RIGHT, _TOP, _BOTTOM = 62, 150, 28, 44


@dataclass(frozen=True)
class Curve:
    """Points of one line; ``kind`` is its class in the style sheet, ``mark`` dot or ring.

    ``pieces`` are ranges of points that are drawn through; all of them where empty.
    """

    name: str
    points: Sequence[tuple[float, float]]
    kind: str = "main"
    mark: str = "dot"
    pieces: Sequence[tuple[int, int]] = ()


class Frame:
    """A plot with a horizontal and a vertical axis, either of them logarithmic."""

    def __init__(
        self,
        x: tuple[float, float],
        y: tuple[float, float],
        *,
        log_x: bool = False,
        log_y: bool = False,
        down: bool = False,
        height: int = HEIGHT,
    ) -> None:
        """``x`` and ``y`` are the ends of the axes; ``down`` puts small y at the top."""
        self._x, self._y, self._log_x, self._log_y, self._down = x, y, log_x, log_y, down
        self._height = height
        self._parts: list[str] = []

    def across(self, value: float) -> float:
        """Horizontal place of a value."""
        return _LEFT + (WIDTH - _LEFT - _RIGHT) * _share(value, self._x, self._log_x)

    def along(self, value: float) -> float:
        """Vertical place of a value."""
        part = _share(value, self._y, self._log_y)
        room = self._height - _TOP - _BOTTOM
        return _TOP + room * (part if self._down else 1 - part)

    def axes(
        self,
        x_ticks: Sequence[tuple[float, str]],
        y_ticks: Sequence[tuple[float, str]],
        x_title: str,
        y_title: str,
    ) -> None:
        """Lines, numbers and titles of both axes."""
        right, bottom = WIDTH - _RIGHT, self._height - _BOTTOM
        for value, words in y_ticks:
            at = self.along(value)
            self._line((_LEFT, at), (right, at), "grid")
            self.words(_LEFT - 8, at + 4, words, "end", "soft")
        for value, words in x_ticks:
            at = self.across(value)
            self._line((at, bottom), (at, bottom + 5), "grid")
            self.words(at, bottom + 18, words, "middle", "soft")
        self._line((_LEFT, bottom), (right, bottom), "grid")
        self.words((_LEFT + right) / 2, self._height - 8, x_title, "middle", "soft")
        self.words(_LEFT, _TOP - 14, y_title, "start", "soft")

    def level(self, value: float, words: str, words_at: float | None = None) -> None:
        """A horizontal line with words at its right end (at a height of their own if given)."""
        at = self.along(value)
        self._line((_LEFT, at), (WIDTH - _RIGHT, at), "limit")
        height = at if words_at is None else words_at
        self.words(WIDTH - _RIGHT + 6, height + 4, words, "start", "soft")

    def curve(self, curve: Curve, name_at: float | None = None) -> None:
        """One line, its marks, and its name at the right (at a height of its own if given)."""
        places = [(self.across(x), self.along(y)) for x, y in curve.points]
        if not places:
            return
        for first, last in curve.pieces or [(0, len(places))]:
            path = " ".join(f"{x:.1f},{y:.1f}" for x, y in places[first:last])
            self._parts.append(f'<polyline class="{curve.kind}" points="{path}"/>')
        step = max(1, len(places) // 40)
        for x, y in places[::step]:
            self.spot(x, y, curve.mark)
        x, y = places[-1]
        self.words(WIDTH - _RIGHT + 6, (y if name_at is None else name_at) + 4, curve.name, "start")

    def spot(self, x: float, y: float, mark: str = "dot") -> None:
        """A mark at a place."""
        self._parts.append(f'<circle class="{mark}" cx="{x:.1f}" cy="{y:.1f}" r="3.5"/>')

    def words(self, x: float, y: float, text: str, anchor: str, kind: str = "") -> None:
        """A text at a place."""
        style = f' class="{kind}"' if kind else ""
        self._parts.append(
            f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}"{style}>{escape(text)}</text>'
        )

    def _line(self, start: tuple[float, float], end: tuple[float, float], kind: str) -> None:
        self._parts.append(
            f'<line class="{kind}" x1="{start[0]:.1f}" y1="{start[1]:.1f}" '
            f'x2="{end[0]:.1f}" y2="{end[1]:.1f}"/>'
        )

    def svg(self, title: str) -> str:
        """The drawing; ``title`` says in words what it shows."""
        return (
            f'<svg viewBox="0 0 {WIDTH} {self._height}" role="img" '
            f'aria-label="{escape(title, quote=True)}">\n' + "\n".join(self._parts) + "\n</svg>"
        )


def _share(value: float, ends: tuple[float, float], log: bool) -> float:
    low, high = (math.log10(end) for end in ends) if log else ends
    here = math.log10(value) if log else value
    return (here - low) / (high - low) if high > low else 0.5


def powers(low: float, high: float, most: int = 7) -> list[tuple[float, str]]:
    """Ticks at powers of ten that enclose a range."""
    first, last = math.floor(math.log10(low)), math.ceil(math.log10(high))
    step = max(1, math.ceil((last - first) / most))
    return [(10.0**k, f"1e{k}") for k in range(last, first - 1, -step)][::-1]


def whole_ticks(low: int, high: int, most: int = 8) -> list[tuple[float, str]]:
    """Ticks at round whole numbers within a range."""
    span = max(high - low, 1)
    step = next(
        size * 10**k for k in range(12) for size in (1, 2, 5) if span / (size * 10**k) <= most
    )
    first = math.ceil(low / step) * step
    return [(float(value), f"{value:,}") for value in range(first, high + 1, step)]


def apart(places: Sequence[float], least: float = 14.0) -> list[float]:
    """Heights for texts beside ``places`` that do not overlap, in the order given."""
    order = sorted(range(len(places)), key=lambda i: places[i])
    found = list(places)
    for before, here in pairwise(order):
        found[here] = max(found[here], found[before] + least)
    return found
