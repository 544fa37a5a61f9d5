"""Start: the tables opened lately, and the folders to find others in."""

from __future__ import annotations

import os

from textual import events
from textual.app import ComposeResult

from kingpost.core.errors import KingpostError
from kingpost.core.text import visible
from kingpost.tui import places
from kingpost.tui.jobs import Job
from kingpost.tui.models import folders, recent
from kingpost.tui.models.folders import Listing
from kingpost.tui.models.recent import Recent
from kingpost.tui.models.starting import FolderRows, RecentRows, told
from kingpost.tui.rooms import START
from kingpost.tui.views.rows import RowsView
from kingpost.tui.views.sheets import PromptSheet
from kingpost.tui.widgets.entry import Writing
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable

_AT_ONCE = 5_000  # rows that are narrowed between two keys rather than in a job


class NarrowSheet(PromptSheet):
    """A line to type in; every letter narrows the list behind it."""

    def __init__(self, start: StartView, text: str) -> None:
        super().__init__("name or path", text)
        self._start = start

    def typed(self, event: events.Key) -> None:
        super().typed(event)
        self._start.narrow(self.entry.writing.text)

    def pasted(self, text: str) -> None:
        super().pasted(text)
        self._start.narrow(self.entry.writing.text)


class StartView(RowsView):
    """Two lists, one cursor: it goes from one into the other."""

    CSS_PATH = "start.tcss"
    view = START

    def __init__(self, folder: str = "") -> None:
        super().__init__()
        self._folder = folders.nearest(folder or os.getcwd())
        self._listing: Listing | None = None
        self._text = ""
        self._lately: list[Recent] = []

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="lately", title="opened lately")
        yield RowTable(id="recent", headings=False, rail=False)
        yield Rule(id="where")
        yield RowTable(id="files", headings=False, rail=False, active=False)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    @property
    def recent(self) -> RowTable:
        """The upper list."""
        return self.query_one("#recent", RowTable)

    @property
    def files(self) -> RowTable:
        """The lower list."""
        return self.query_one("#files", RowTable)

    @property
    def table(self) -> RowTable:
        """The list that has the cursor."""
        return self.files if self.files.active else self.recent

    def opened(self) -> None:
        self.query_one("#head", Line).show(
            (" kingpost", "head"), ("   choose a table of edges", "plain")
        )
        self.recent.show(RecentRows([]))
        self.files.show(FolderRows([]), empty="listing the folder")
        self._title("")
        self.refresh_keys()
        # The first frame is on its way before folders are looked into.
        self.set_timer(0.01, self.look_again)

    def look_again(self) -> None:
        """Read the list of tables opened lately and the folder, in jobs."""
        # Once what was opened just now has been noted, it is read again: see KingpostApp.noted.
        self.kingpost.background(
            "recent", self._read_lately, self._show_lately, words="reading what was opened lately"
        )
        self._list(self._folder)

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 14, "-low")
        self.set_class(event.size.height < 8, "-lowest")
        self._fit(event.size.height)

    def _fit(self, height: int) -> None:
        if self.composed:
            self.recent.styles.height = max(1, min(len(self._lately), height // 4))

    # ---- tables opened lately --------------------------------------------------------------------

    @staticmethod
    def _read_lately(job: Job) -> tuple[list[Recent], str]:
        try:
            return recent.read(), ""
        except KingpostError as error:
            return [], error.sentence

    def _show_lately(self, read: tuple[list[Recent], str]) -> None:
        self._lately, trouble = read
        if not self.composed or not self.is_attached:
            return
        if trouble:
            self.kingpost.news(trouble, "bad")
        first = self.recent.count == 0
        self.set_class(not self._lately, "-none")
        self.query_one("#lately", Rule).title(
            "opened lately" if self._lately else "nothing was opened yet: choose a table below"
        )
        self._fit(self.app.size.height)
        self.recent.show(RecentRows(self._lately), self.recent.row)
        if not self._lately or first:
            self._activate(self.recent if self._lately else self.files)

    # ---- the folder ------------------------------------------------------------------------------

    def _list(self, folder: str, at: str = "") -> None:
        """List a folder in a job; the cursor comes to stand on the name ``at``."""
        self.kingpost.background(
            "folder",
            lambda job: (folders.listed(folder, job.watch), at),
            self._show_folder,
            words="listing the folder",
        )

    def _show_folder(self, made: tuple[Listing, str]) -> None:
        listing, at = made
        self._listing, self._folder, self._text = listing, listing.folder, ""
        self._show_rows(FolderRows(folders.narrowed(listing, "")), at)

    def narrow(self, text: str) -> None:
        """Show only the names that contain a text."""
        listing, self._text = self._listing, text
        if listing is None or "/" in text or text.startswith("~"):
            return
        if len(listing.entries) <= _AT_ONCE:
            self._show_rows(FolderRows(folders.narrowed(listing, text)))
            return
        self.kingpost.background(
            "narrow",
            lambda job: FolderRows(folders.narrowed(listing, text)),
            lambda rows: self._show_rows(rows) if text == self._text else None,
            words="looking for names",
        )

    def _show_rows(self, rows: FolderRows, at: str = "") -> None:
        if not self.composed or not self.is_attached or self._listing is None:
            return
        # The cursor on what one came from, else on the first that is neither the way up nor all.
        wanted = (at,) if at else ()
        names = [entry.name for entry in rows.entries]
        here = next((row for row, name in enumerate(names) if name in wanted), None)
        first = next((row for row, name in enumerate(names) if name not in ("..", ".")), 0)
        row = first if here is None else here
        empty = "no table and no folder here" + (f" with {self._text!r}" if self._text else "")
        self.files.show(rows, row, empty=visible(empty, 80))
        self._title(told(rows, self._listing.words, visible(self._text, 30)))
        self.refresh_keys()

    def _title(self, words: str) -> None:
        place = places.home_short(folders.safe(self._folder))
        # Of a long path the end says most; of a long title the end is cut.
        room = max(self.app.size.width - len(words) - 12, 8)
        if len(place) > room:
            place = self.looks.glyphs.ellipsis + place[len(place) - room :]
        self.query_one("#where", Rule).title(f"{words}   {place}".strip())

    # ---- moving ------------------------------------------------------------------------------

    def _activate(self, table: RowTable) -> None:
        for one in (self.recent, self.files):
            one.activate(one is table)
        self.refresh_keys()

    def can_other_table(self) -> bool:
        return bool(self._lately)

    def do_other_table(self) -> None:
        self._activate(self.files if self.recent.active else self.recent)

    def do_row_up(self) -> None:
        if not self.table.move(-1) and self.files.active and self._lately:
            self._activate(self.recent)

    def do_row_down(self) -> None:
        if not self.table.move(1) and self.recent.active and self.files.count:
            self._activate(self.files)

    def can_folder_up(self) -> bool:
        return self._listing is not None and os.path.dirname(self._folder) != self._folder

    def do_folder_up(self) -> None:
        self._activate(self.files)
        self._list(os.path.dirname(self._folder), os.path.basename(self._folder))

    # ---- choosing ------------------------------------------------------------------------------

    def do_find_ask(self) -> None:
        self._activate(self.files)
        self.app.push_screen(NarrowSheet(self, self._text), self._found)

    def _found(self, text: str | None) -> None:
        if text is None:
            self.narrow("")
        elif "/" in text or text.startswith("~"):
            self._go(text)
        elif text and self.files.count == 1:
            self.do_table_open()

    def _go(self, text: str) -> None:
        """Open the path that was written, or list it."""
        path = os.path.join(self._folder, os.path.expanduser(Writing(text).text.strip()))
        self._text = ""
        if os.path.isdir(path) and not _pack(path):
            self._list(path)
        else:
            self.kingpost.opener.open([path])

    def can_table_open(self) -> bool:
        return self.table.count > 0

    can_table_columns = can_table_open

    def do_table_open(self) -> None:
        self._open(ask=False)

    def do_table_columns(self) -> None:
        self._open(ask=True)

    def _open(self, ask: bool) -> None:
        at = self.table.item()
        if at is None:
            return
        opener, source = self.kingpost.opener, self.table.source
        if isinstance(source, RecentRows):
            entry = source.entries[at]
            if entry.missing:
                where = visible(entry.paths[0], 200)
                self.kingpost.news(f"it is no longer there: {where}", "bad")
            else:
                opener.open(list(entry.paths), entry.options, ask=ask)
        elif isinstance(source, FolderRows) and self._listing is not None:
            row = source.entries[at]
            path = self._listing.path(row)
            if row.kind == folders.UP:
                self.do_folder_up()
            elif row.kind == folders.FOLDER:
                self._list(path)
            else:
                opener.open([path], ask=ask)

    def can_step_back(self) -> bool:
        return bool(self._text or self.kingpost.latest_news[0])

    def do_step_back(self) -> None:
        if self.kingpost.latest_news[0]:
            self.kingpost.news("")
        else:
            self.narrow("")


def _pack(path: str) -> bool:
    from kingpost.core.store.sealed import is_pack

    return is_pack(path)
