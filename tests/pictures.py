"""Draw pictures of the main views, as the README shows them: ``python tests/pictures.py``.

The views are those of the tour (``tests/terminal/tour.py``), taken from the program as it runs in
a terminal; every cell becomes text at its place in an SVG.
"""

from __future__ import annotations

import sys
from html import escape
from itertools import groupby
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[1]))

from tests.terminal import tour
from tests.terminal.conftest import Terminal

FOLDER = Path(__file__).parent / "pictures"
SHOWN = ("standings", "node", "why", "log", "makeup")
SIZE = (100, 30)
WIDE, HIGH, EDGE = 8.4, 17.0, 12.0  # of a cell and of the edge, in pixels
GROUND, PLAIN = "#14181d", "#d3d7dc"
COLOURS = {
    "black": "#3a414a", "red": "#e06c6c", "green": "#7fb069", "brown": "#d9b25f",
    "yellow": "#d9b25f", "blue": "#6c9fe0", "magenta": "#b98ad6", "cyan": "#5fb8c2",
    "white": PLAIN,
}  # fmt: skip


def picture(run: Terminal, title: str) -> str:
    """The screen as an SVG."""
    width, height = run.width * WIDE + 2 * EDGE, run.height * HIGH + 2 * EDGE
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width:g} {height:g}" '
        f'role="img" aria-label="{escape(title)}">',
        f"<title>{escape(title)}</title>",
        f'<rect width="100%" height="100%" rx="6" fill="{GROUND}"/>',
        f'<g font-family="ui-monospace, DejaVu Sans Mono, Menlo, Consolas, monospace" '
        f'font-size="14" fill="{PLAIN}">',
    ]
    for y in range(run.height):
        cells = [run.screen.buffer[y][x] for x in range(run.width)]
        at = 0
        for look, group in groupby(cells, key=_look):
            run_of = list(group)
            parts += _span("".join(cell.data for cell in run_of), at, y, *look)
            at += len(run_of)
    return "\n".join([*parts, "</g>", "</svg>"]) + "\n"


def _look(cell: Any) -> tuple[str, bool, bool, bool]:
    return cell.fg.removeprefix("bright"), cell.bold, cell.reverse, cell.underscore


def _span(
    text: str, column: int, row: int, colour: str, bold: bool, reverse: bool, line: bool
) -> list[str]:
    x, y, length = EDGE + column * WIDE, EDGE + row * HIGH, len(text) * WIDE
    fill = COLOURS.get(colour, PLAIN)
    parts = []
    if reverse:
        parts.append(
            f'<rect x="{x:g}" y="{y:g}" width="{length:g}" height="{HIGH:g}" fill="{fill}"/>'
        )
        fill = GROUND
    shown = text.rstrip()
    if shown:
        lead = len(shown) - len(shown.lstrip())
        shown = shown.lstrip()
        marks = f' fill="{fill}"' if fill != PLAIN else ""
        marks += ' font-weight="bold"' if bold else ""
        marks += ' text-decoration="underline"' if line else ""
        parts.append(
            f'<text x="{x + lead * WIDE:g}" y="{y + 13:g}" textLength="{len(shown) * WIDE:g}" '
            f'lengthAdjust="spacingAndGlyphs" xml:space="preserve"{marks}>{escape(shown)}</text>'
        )
    return parts


def main() -> None:
    """Draw them all."""
    FOLDER.mkdir(exist_ok=True)
    run = tour.begin(SIZE)
    for name in tour.tour(run):
        if name in SHOWN:
            run.settle(0.6)
            place = FOLDER / f"{name}.svg"
            place.write_text(picture(run, f"Kingpost: {name}"), encoding="utf-8")
            print(f"{place.name}  {place.stat().st_size:,} bytes")
    run.close()


if __name__ == "__main__":
    main()
