"""Names with what there is to say of each, as rows of a table; long sayings take several rows."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from kingpost.core.standing import UNRANKED
from kingpost.tui.models.columns import Column
from kingpost.tui.models.drawing import tame, wrap

NAME = 24
_LEAST = 20  # cells below which texts are not wrapped but cut


@dataclass(frozen=True)
class Row:
    """A line to read; ``node`` where it stands for one that can be gone to."""

    name: str
    text: str
    node: int | None = None
    title: bool = False


def wrapped(rows: Iterable[Row], width: int) -> list[Row]:
    """The same rows with texts that do not fit ``width`` cells beside the names broken."""
    rows = list(rows)
    room = width - name_width(rows) - 4
    if room < _LEAST:
        return rows
    out: list[Row] = []
    for row in rows:
        lines = [row.text] if cell_len(row.text) <= room else wrap(row.text, room)
        out.append(Row(row.name, lines[0] if lines else "", row.node, row.title))
        out += [Row("", line, row.node) for line in lines[1:]]
    return out


def name_width(rows: Iterable[Row]) -> int:
    """Cells for the names."""
    widest = max((cell_len(tame(row.name)) for row in rows), default=8)
    return min(max(widest, 8), NAME)


class Pairs:
    """Rows as a source of the row-window table."""

    def __init__(self, rows: Sequence[Row]) -> None:
        self.rows = list(rows)
        width = name_width(self.rows)
        most = max((len(row.text) for row in self.rows), default=1)
        self.head = [
            Column("name", "", width, lambda at: self.rows[at].name, frozen=True, stretch=width),
            Column("text", "", max(most, 1), lambda at: self.rows[at].text),
        ]

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.rows)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Titles stand out as what was found does elsewhere."""
        return self.rows[row].title
