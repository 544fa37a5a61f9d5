"""What views that are one table have in common: the cursor's keys, and the way back."""

from __future__ import annotations

from kingpost.tui.views.base import View
from kingpost.tui.widgets.rowtable import RowTable


class RowKeys:
    """The keys that move through the rows of ``table``."""

    @property
    def table(self) -> RowTable:
        """The widget with the rows."""
        raise NotImplementedError

    def do_row_up(self) -> None:
        self.table.move(-1)

    def do_row_down(self) -> None:
        self.table.move(1)

    def do_page_ahead(self) -> None:
        self.table.page(1)

    def do_page_return(self) -> None:
        self.table.page(-1)

    def do_row_first(self) -> None:
        self.table.go(0)

    def do_row_last(self) -> None:
        self.table.go(self.table.count - 1)


class RowsView(RowKeys, View):
    """A view whose row keys move through the table ``#rows``."""

    @property
    def table(self) -> RowTable:
        """The widget."""
        return self.query_one("#rows", RowTable)

    def do_columns_left(self) -> None:
        self.table.sideways(-1)

    def do_columns_right(self) -> None:
        self.table.sideways(1)

    def do_step_back(self) -> None:
        self.app.pop_screen()
