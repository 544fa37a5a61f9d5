"""Help: every key in words, made from the registry of actions."""

from __future__ import annotations

from textual.app import ComposeResult

from kingpost.core.standing import UNRANKED
from kingpost.tui.keymaps import Bound, help_rows
from kingpost.tui.models.columns import Column
from kingpost.tui.rooms import HELP
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable


class Keys:
    """The rows of the help as a source for the row-window table."""

    def __init__(self, bound: Bound) -> None:
        self.rows = help_rows(bound)
        self.head = [
            Column("keys", "key", 11, lambda at: self.rows[at][1], frozen=True),
            Column("means", "what it does", 66, lambda at: self.rows[at][2]),
            Column("group", "for", 14, lambda at: self.rows[at][0]),
        ]

    @property
    def count(self) -> int:
        return len(self.rows)

    def item(self, row: int) -> int:
        return row

    def rail(self, row: int) -> int:
        return UNRANKED

    def marked(self, row: int) -> bool:
        return False


class HelpView(RowsView):
    """All keys; and what the proof rail's signs mean."""

    CSS_PATH = "help.tcss"
    view = HELP

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="rail", rows=2)
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        proven, open_, tied, _ = tuple(self.looks.glyphs.rail)
        self.query_one("#head", Line).show((" keys and signs", "head"))
        self.query_one("#rail", Line).show_rows(
            [
                [
                    (f" {proven}", "proven"),
                    (" above the row below, proven   ", "plain"),
                    (open_, "open"),
                    (" not yet proven   ", "plain"),
                    (tied, "tied"),
                    (" tied exactly", "plain"),
                ],
                [
                    (
                        "   no sign: the score cannot be told from zero."
                        "  4-9: any of these ranks is possible",
                        "plain",
                    )
                ],
            ]
        )
        self.table.show(Keys(self.kingpost.bound))
