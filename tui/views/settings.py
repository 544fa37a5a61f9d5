"""Settings: a form made from the measure's Settings type, checked while it is filled in."""

from __future__ import annotations

from typing import TYPE_CHECKING

from textual import events
from textual.app import ComposeResult

from kingpost.core.text import visible
from kingpost.tui.models.cost import cost_words, known_radius
from kingpost.tui.models.drawing import fit, wrap
from kingpost.tui.models.forms import Field, fields_of, validated
from kingpost.tui.rooms import FORM
from kingpost.tui.views.base import View
from kingpost.tui.widgets.entry import Writing
from kingpost.tui.widgets.lines import KeyLine, Line, Piece, Rule

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings

_LABEL = 14
_VALUE = 26


class SettingsView(View):
    """One line a setting; Enter solves with all of them, Escape changes nothing."""

    CSS_PATH = "settings.tcss"
    view = FORM

    def __init__(self, measure: str, settings: Settings) -> None:
        super().__init__()
        self._measure = measure
        self._settings = settings
        self._fields = fields_of(settings)
        self._writing = [Writing(found.text) for found in self._fields]
        self._at = 0
        self._valid: Settings | None = settings
        self._wrong = ""

    def compose(self) -> ComposeResult:
        yield Line(id="head")
        yield Rule(id="top")
        yield Line(id="fields")
        yield Rule(id="middle")
        yield Line(id="meaning")
        yield Line(id="cost", rows=2)
        yield Rule(id="news")
        yield KeyLine(id="keys")

    def opened(self) -> None:
        title = f" settings of {visible(self._measure, 40)}"
        self.query_one("#head", Line).show((title, "head"), ("   Enter solves with them", "plain"))
        self._show()

    def on_resize(self, event: events.Resize) -> None:
        self.set_class(event.size.height < 16, "-low")
        self.call_after_refresh(self._show)

    @property
    def _field(self) -> Field:
        return self._fields[self._at]

    def _texts(self) -> dict[str, str]:
        return {
            found.name: writing.text
            for found, writing in zip(self._fields, self._writing, strict=True)
        }

    def _check(self) -> None:
        self._valid, self._wrong = validated(self._settings, self._texts())
        self._show()
        self.refresh_keys()

    def _show(self) -> None:
        if not self.composed or not self.is_attached or not self._fields:
            return
        height = max(self.query_one("#fields", Line).size.height, 1)
        top = max(0, min(self._at - height + 1, len(self._fields) - height))
        rows = [self._row(at) for at in range(len(self._fields))][top:]
        self.query_one("#fields", Line).show_rows(rows)
        found = self._field
        how = {
            "choice": "left and right change it",
            "fixed": "given on the command line; not changed here",
        }.get(found.kind, found.reach or "type it")
        lines = wrap(f"{found.label}: {visible(found.words)} ({how})", (self.size.width or 80) - 2)
        self.query_one("#meaning", Line).show_rows([[(f" {line}", "plain")] for line in lines[:4]])
        self.query_one("#news", Rule).tell(self._wrong, "bad")
        cost = wrap(self._cost(), (self.size.width or 80) - 2)
        self.query_one("#cost", Line).show_rows([[(f" {line}", "quiet")] for line in cost[:2]])

    def _cost(self) -> str:
        sitting = self.kingpost.sitting
        settings = self._valid or self._settings
        before = sitting.results.get(self._measure)
        rho = known_radius(sitting.results.values())
        return cost_words(sitting.graph, self._measure, settings, before, rho)

    def _row(self, at: int) -> list[Piece]:
        found, writing, glyphs = self._fields[at], self._writing[at], self.looks.glyphs
        here = at == self._at
        lead = glyphs.pointer if here else " "
        pieces: list[Piece] = [
            (f"{lead} {found.label.ljust(_LABEL)} ", "strong" if here else "plain")
        ]
        if found.kind == "choice":
            for choice in found.choices:
                chosen = choice == writing.text
                mark = f"[{choice}]" if chosen else f" {choice} "
                pieces.append((mark + " ", ("cursor" if here else "strong") if chosen else "quiet"))
        elif here and found.kind != "fixed":
            pieces += writing.pieces(max((self.size.width or 80) - _LABEL - 5, 8))
        else:
            empty = "(none)" if not writing.text else visible(writing.text)
            pieces.append((fit(empty, _VALUE, glyphs=glyphs), "plain"))
            pieces.append((f" {found.reach}", "quiet"))
        return pieces

    def typed(self, event: events.Key) -> None:
        if self._field.kind in ("choice", "fixed"):
            return
        if self._writing[self._at].key(event.key, event.character):
            self._check()

    def pasted(self, text: str) -> None:
        if self._field.kind not in ("choice", "fixed"):
            self._writing[self._at].insert(text)
            self._check()

    # ---- actions -----------------------------------------------------------------------------

    def do_row_up(self) -> None:
        self._at = (self._at - 1) % len(self._fields)
        self._show()

    def do_row_down(self) -> None:
        self._at = (self._at + 1) % len(self._fields)
        self._show()

    do_field_next = do_row_down

    def do_columns_left(self) -> None:
        self._sideways(-1, "left")

    def do_columns_right(self) -> None:
        self._sideways(1, "right")

    def _sideways(self, step: int, key: str) -> None:
        found, writing = self._field, self._writing[self._at]
        if found.kind == "choice":
            at = found.choices.index(writing.text) if writing.text in found.choices else -step
            writing.text = found.choices[(at + step) % len(found.choices)]
            self._check()
        elif found.kind != "fixed":
            writing.key(key, None)
            self._show()

    def can_form_solve(self) -> bool:
        return self._valid is not None

    def do_form_solve(self) -> None:
        settings = self._valid
        if settings is not None:
            self.app.pop_screen()
            self.kingpost.desk.solve(self._measure, settings)

    def do_step_back(self) -> None:
        self.app.pop_screen()
