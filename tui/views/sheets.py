"""Sheets that rise from the foot of the screen: a choice, a question, a notice."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from textual import events
from textual.app import ComposeResult
from textual.containers import Vertical
from textual.screen import ModalScreen

from kingpost.core.standing import UNRANKED
from kingpost.tui.models.columns import Column
from kingpost.tui.models.detail import on_screen
from kingpost.tui.models.drawing import wrap
from kingpost.tui.rooms import CHOICE, NOTICE, PROMPT
from kingpost.tui.views.base import View
from kingpost.tui.views.rows import RowKeys
from kingpost.tui.widgets.entry import LIMIT, Entry
from kingpost.tui.widgets.lines import KeyLine, Line, Rule
from kingpost.tui.widgets.rowtable import RowTable

_MOST_ROWS = 12


class Sheet(View, ModalScreen[Any], inherit_bindings=False):
    """A view over the lower part of another; Escape closes it and changes nothing."""

    CSS_PATH = "sheets.tcss"

    def do_step_back(self) -> None:
        self.dismiss(None)


@dataclass(frozen=True)
class Choice:
    """A row to choose: its key, its name, and what there is to know about it."""

    key: str
    name: str
    words: str = ""


class Choices:
    """Choices as the source of a row-window table."""

    def __init__(self, choices: Sequence[Choice]) -> None:
        self.choices = list(choices)
        longest = max((len(choice.name) for choice in choices), default=4)
        width = min(max(longest, 6), 30)
        most = max((len(choice.words) for choice in choices), default=1)
        self.head = [
            Column("name", "", width, lambda at: self.choices[at].name, frozen=True, stretch=width),
            Column("words", "", most, lambda at: self.choices[at].words),
        ]

    @property
    def count(self) -> int:
        return len(self.choices)

    def item(self, row: int) -> int:
        return row

    def rail(self, row: int) -> int:
        return UNRANKED

    def marked(self, row: int) -> bool:
        return False


class ChoiceSheet(RowKeys, Sheet):
    """One of several rows; dismissed with the key of the row taken, or None."""

    view = CHOICE

    def __init__(self, title: str, choices: Sequence[Choice], at: str = "") -> None:
        super().__init__()
        self._title = title
        self._choices = Choices(choices)
        keys = [choice.key for choice in choices]
        self._start = keys.index(at) if at in keys else 0

    def compose(self) -> ComposeResult:
        with Vertical(id="sheet"):
            yield Rule(title=self._title)
            yield RowTable(id="choices", headings=False, rail=False)
            yield Rule(id="news")
            yield KeyLine(id="keys")

    @property
    def table(self) -> RowTable:
        """The widget."""
        return self.query_one("#choices", RowTable)

    def opened(self) -> None:
        rows = min(self._choices.count, _MOST_ROWS, max(self.app.size.height - 5, 2))
        self.table.styles.height = rows
        self.table.show(self._choices, self._start)

    @property
    def key(self) -> str | None:
        """The key of the highlighted row."""
        at = self.table.item()
        return None if at is None else self._choices.choices[at].key

    def do_choice_take(self) -> None:
        self.dismiss(self.key)

    def can_settings_change(self) -> bool:
        return False


class MeasureSheet(ChoiceSheet):
    """The measures, with what is known of each; its settings are one key away."""

    def can_settings_change(self) -> bool:
        return True

    def do_settings_change(self) -> None:
        key = self.key
        self.dismiss(None)
        if key is not None:
            self.kingpost.open_settings(key)


class PromptSheet(Sheet):
    """A line to write; dismissed with the text, or None.

    ``wrong`` says what is wrong with the text it starts with, ``hint`` what may be written.
    """

    view = PROMPT

    def __init__(self, label: str, text: str = "", *, hint: str = "", wrong: str = "") -> None:
        super().__init__()
        self._label, self._text = label, text
        self._hint, self._wrong = on_screen(hint), on_screen(wrong)

    def compose(self) -> ComposeResult:
        width = max(self.app.size.width - 2, 10)
        rows = [[(f" {line}", "bad")] for line in wrap(self._wrong, width)[:4]]
        rows += [[(f" {line}", "quiet")] for line in wrap(self._hint, width)[:4]]
        rows = rows[: max(self.app.size.height - 4, 1)]
        with Vertical(id="sheet"):
            yield Rule()
            if rows:
                said = Line(id="said", rows=len(rows))
                said.show_rows(rows)
                yield said
            yield Entry(self._label, self._text, id="entry")
            yield KeyLine(id="keys")

    @property
    def entry(self) -> Entry:
        """The widget."""
        return self.query_one("#entry", Entry)

    def typed(self, event: events.Key) -> None:
        self.entry.typed(event)

    def pasted(self, text: str) -> None:
        if not self.entry.pasted(text):
            told = f"only the first {LIMIT:,} characters are taken"
            self.query(Rule).first().tell(told, "bad")

    def do_prompt_take(self) -> None:
        self.dismiss(self.entry.writing.text)


class NoticeSheet(Sheet):
    """A sentence that must be read, such as a refusal; it stays until it is closed."""

    view = NOTICE

    def __init__(self, title: str, text: str) -> None:
        super().__init__()
        self._title, self._text = title, on_screen(text[:2_000])

    def compose(self) -> ComposeResult:
        lines = wrap(self._text, max(self.app.size.width - 2, 10))
        lines = lines[: max(self.app.size.height - 4, 1)]
        with Vertical(id="sheet"):
            yield Rule(title=self._title)
            text = Line(id="text", rows=len(lines))
            text.show_rows([[(f" {line}", "plain")] for line in lines])
            yield text
            yield Rule()
            yield KeyLine(id="keys")

    def do_notice_close(self) -> None:
        self.dismiss(None)
