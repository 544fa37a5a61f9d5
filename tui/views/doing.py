"""Any action: every action of the registry by name, with its keys; a few letters find it."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult
from textual.containers import Vertical

from kingpost.tui.models.doing import Deed, Deeds, deeds, narrowed
from kingpost.tui.rooms import DOING
from kingpost.tui.views.base import View
from kingpost.tui.views.sheets import Sheet
from kingpost.tui.widgets.entry import Entry
from kingpost.tui.widgets.lines import KeyLine, Rule
from kingpost.tui.widgets.rowtable import RowTable

_MOST_ROWS = 12


class DoingSheet(Sheet):
    """A line to type in and the actions that match; dismissed with the one taken, or None."""

    view = DOING

    def __init__(self, over: View) -> None:
        super().__init__()
        self._all = deeds(over.view, over.possible, over.kingpost.bound)

    def compose(self) -> ComposeResult:
        with Vertical(id="sheet"):
            yield Rule(title="any action", id="news")
            yield Entry("go to", id="entry")
            yield RowTable(id="rows", headings=False, rail=False)
            yield KeyLine(id="keys")

    @property
    def table(self) -> RowTable:
        """The widget."""
        return self.query_one("#rows", RowTable)

    @property
    def entry(self) -> Entry:
        """The line that is typed."""
        return self.query_one("#entry", Entry)

    def opened(self) -> None:
        self.table.styles.height = min(_MOST_ROWS, max(self.app.size.height - 5, 2))
        self._narrow()

    def _narrow(self) -> None:
        text = self.entry.writing.text
        self.table.show(Deeds(narrowed(self._all, text)), empty="nothing is called so")
        self.refresh_keys()

    def typed(self, event: events.Key) -> None:
        self.entry.typed(event)
        self._narrow()

    def pasted(self, text: str) -> None:
        self.entry.pasted(text)
        self._narrow()

    @property
    def deed(self) -> Deed | None:
        """The highlighted one."""
        at = self.table.item()
        source = self.table.source
        return source.listed[at] if at is not None and isinstance(source, Deeds) else None

    def do_row_up(self) -> None:
        self.table.move(-1)

    def do_row_down(self) -> None:
        self.table.move(1)

    def can_deed_take(self) -> bool:
        return self.deed is not None

    def do_deed_take(self) -> None:
        deed = self.deed
        if deed is None:
            return
        if deed.possible:
            self.dismiss(deed.action.id)
        elif self.kingpost.screen_stack[-2].view in deed.action.views:  # type: ignore[attr-defined]
            self.tell("there is nothing to do it with just now", "bad")
        else:
            self.tell(f"not here: {deed.where}", "bad")
