"""Columns: which of them the standings show, and in which order; seen at once behind the sheet."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.containers import Vertical

from kingpost.core.standing import UNRANKED
from kingpost.tui.models.columns import Column
from kingpost.tui.models.headings import Choice, choice_of
from kingpost.tui.rooms import COLUMNS
from kingpost.tui.views.rows import RowKeys
from kingpost.tui.views.sheets import Sheet
from kingpost.tui.widgets.lines import KeyLine, Rule
from kingpost.tui.widgets.rowtable import RowTable

_MOST_ROWS = 9


class Offered:
    """The columns there are, in the order chosen, as a source of the row-window table."""

    def __init__(self, columns: list[Column], choice: Choice) -> None:
        by_key = {column.key: column for column in columns}
        self.columns = [by_key[key] for key in choice.order if key in by_key]
        self.choice = choice
        width = max((len(_words(column)) for column in self.columns), default=6)
        self.head = [
            Column(
                "name",
                "",
                min(max(width, 6), 40),
                lambda at: _words(self.columns[at]),
                frozen=True,
                stretch=min(max(width, 6), 40),
            ),
            Column("state", "", 8, self._state),
        ]

    def _state(self, at: int) -> str:
        return "hidden" if self.columns[at].key in self.choice.hidden else "shown"

    @property
    def count(self) -> int:
        return len(self.columns)

    def item(self, row: int) -> int:
        return row

    def rail(self, row: int) -> int:
        return UNRANKED

    def marked(self, row: int) -> bool:
        return False


def _words(column: Column) -> str:
    kind, _, name = column.key.partition(":")
    if kind == "rank":
        return f"{name} rank"
    return column.title if kind != "score" or name else f"{column.title} score"


class ColumnsSheet(RowKeys, Sheet):
    """Enter shows or hides, left and right move; Escape is done."""

    view = COLUMNS

    def compose(self) -> ComposeResult:
        with Vertical(id="sheet"):
            yield Rule(title="columns in their order: Enter shows or hides, Left and Right move")
            yield RowTable(id="choices", headings=False, rail=False)
            yield Rule(id="news")
            yield KeyLine(id="keys")

    @property
    def table(self) -> RowTable:
        """The widget."""
        return self.query_one("#choices", RowTable)

    @property
    def offered(self) -> Offered:
        """What there is to choose from now."""
        table = self.kingpost.desk.table
        every = [] if table is None else table.all
        return Offered(every, choice_of(every, self.kingpost.sitting.columns))

    def opened(self) -> None:
        rows = min(self.offered.count, _MOST_ROWS, max(self.app.size.height - 6, 2))
        self.table.styles.height = max(rows, 1)
        self.table.show(self.offered, 0, empty="there are no other columns; Esc goes back")

    def refreshed(self) -> None:
        if self.composed:
            self.table.show(self.offered, self.table.row)

    def _key(self) -> str | None:
        offered, at = self.offered, self.table.row
        return offered.columns[at].key if at < offered.count else None

    def _choose(self, choice: Choice, key: str) -> None:
        self.kingpost.desk.choose_columns(choice)
        offered = self.offered
        row = next((at for at, column in enumerate(offered.columns) if column.key == key), 0)
        self.table.show(offered, row)

    def can_column_switch(self) -> bool:
        return self._key() is not None

    def do_column_switch(self) -> None:
        key = self._key()
        if key is not None:
            self._choose(self.offered.choice.switched(key), key)

    def _move(self, step: int) -> None:
        key, offered, at = self._key(), self.offered, self.table.row
        if key is None or not 0 <= at + step < offered.count:
            return
        # Columns that this table lacks keep their places between the others.
        choice, other = offered.choice, offered.columns[at + step].key
        places = choice.order.index(other) - choice.order.index(key)
        self._choose(choice.moved(key, places), key)

    def do_columns_left(self) -> None:
        self._move(-1)

    def do_columns_right(self) -> None:
        self._move(1)
