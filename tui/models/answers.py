"""What an insight found, as pages to turn: a table each, sentences about its rows, a drawing."""

from __future__ import annotations

from collections.abc import Callable, Container, Sequence
from dataclasses import dataclass, field

from kingpost.core.standing import UNRANKED
from kingpost.tui.models.chart import Cell
from kingpost.tui.models.columns import Column
from kingpost.tui.models.pairs import Row
from kingpost.tui.terminal import Glyphs

NOWHERE = -1  # a row that stands for no node
Draw = Callable[[int, int, Glyphs, int], list[list[Cell]]]  # width, height, glyphs, row


class Listing:
    """Rows as a source of the row-window table; ``node(row)`` is the node a row can be left for.

    The columns are given the number of a row.
    """

    def __init__(
        self, head: Sequence[Column], count: int, node: Callable[[int], int] | None = None
    ) -> None:
        self.head = list(head)
        self.count = count
        self._node = node
        self.marks: Container[int] = ()

    def kept(self, item: int) -> bool:
        """Whether the node of a row is on the shortlist."""
        return self.node(item) in self.marks

    def node(self, row: int) -> int:
        """The node of a row, :data:`NOWHERE` for none."""
        return NOWHERE if self._node is None else self._node(row)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """There is no rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is marked."""
        return False


@dataclass(frozen=True)
class Page:
    """One page: a ``listing``, or ``rows`` to read whose texts are wrapped to the width.

    ``words(row)`` says under the table what there is to say of a row; ``draw`` makes the drawing
    above it; ``empty`` is said where there are no rows.
    """

    name: str
    title: str
    listing: Listing | None = None
    rows: Sequence[Row] = ()
    words: Callable[[int], str] = lambda row: ""
    draw: Draw | None = None
    empty: str = "nothing"


@dataclass(frozen=True)
class Answer:
    """Pages under one heading; ``caution`` stays in sight on all of them."""

    head: str
    pages: tuple[Page, ...]
    caution: str = ""
    facts: dict[str, object] = field(default_factory=dict)


def said(name: str, title: str, sentences: Sequence[tuple[str, str]]) -> Page:
    """A page of sentences, each under a name."""
    return Page(name, title, rows=[Row(one, text) for one, text in sentences if text])


def names_width(names: Sequence[str], least: int = 6, most: int = 24) -> int:
    """Cells for a column of names, by those given."""
    from rich.cells import cell_len

    from kingpost.tui.models.drawing import tame

    return min(max([least, *(cell_len(tame(name)) for name in names)]), most)
