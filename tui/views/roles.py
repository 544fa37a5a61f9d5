"""Which column is what: asked before a table is read whose columns do not say so themselves."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult

from kingpost.core.ingest import LoadOptions
from kingpost.core.ingest.glance import Peek
from kingpost.core.text import visible
from kingpost.tui.models.roles import Roles
from kingpost.tui.rooms import ROLES
from kingpost.tui.views.rows import RowsView
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable


class RolesView(RowsView):
    """Columns with types and sample rows; dismissed with how to read them, or None."""

    CSS_PATH = "roles.tcss"
    view = ROLES

    def __init__(self, paths: list[str], peek: Peek, options: LoadOptions) -> None:
        super().__init__()
        self._name = visible(paths[0].rstrip("/").rsplit("/", 1)[-1], 60)
        self.model = Roles(peek, options)

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Line(id="words")
        yield Rule(id="top")
        yield RowTable(id="rows", rail=False)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        self.query_one("#head", Line).show(
            (f" {self._name}", "head"), (f"   {self.model.size}", "plain")
        )
        self.table.show(self.model)
        self._describe()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 12, "-low")
        self.set_class(event.size.height < 8, "-lowest")

    def _describe(self) -> None:
        self.query_one("#words", Line).show((f" {self.model.words}", "strong"))
        self.kingpost.news(self.model.missing, "bad")
        self.refresh_keys()

    def do_columns_left(self) -> None:
        self._turn(-1)

    def do_columns_right(self) -> None:
        self._turn(1)

    do_role_change = do_columns_right

    def _turn(self, step: int) -> None:
        self.model.turn(self.table.row, step)
        self.table.refresh()
        self._describe()

    def can_roles_take(self) -> bool:
        return not self.model.missing

    def do_roles_take(self) -> None:
        self.dismiss(self.model.options())

    def do_step_back(self) -> None:
        self.dismiss(None)
