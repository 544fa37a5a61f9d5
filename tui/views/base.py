"""What every view has in common: keys by the registry of actions, a line of keys, news."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, cast

from textual import events
from textual.screen import Screen

from kingpost.tui import actions, keymaps
from kingpost.tui.terminal import Looks
from kingpost.tui.widgets.lines import KeyLine, Rule

if TYPE_CHECKING:
    from kingpost.tui.app import KingpostApp


class View(Screen[Any], inherit_bindings=False):
    """A screen whose keys come from the registry.

    An action ``row.down`` is done by the method ``do_row_down`` of the view, else of the app,
    else of one of the app's helpers.  A method ``can_row_down`` says whether it is possible here
    and now.
    """

    AUTO_FOCUS = None
    ALLOW_SELECT = False
    view = ""
    composed = False  # whether its widgets exist; events may come before they do

    def __init__(self) -> None:
        super().__init__()
        self._early: list[events.Key | events.Paste] = []

    def on_mount(self) -> None:
        self.composed = True
        self.opened()
        early, self._early = self._early, []
        for event in early:
            self.kingpost.typed(event)

    def opened(self) -> None:
        """Called once its widgets exist."""

    @property
    def kingpost(self) -> KingpostApp:
        """The application, with its own type."""
        return cast("KingpostApp", self.app)

    @property
    def looks(self) -> Looks:
        """How this terminal is drawn on."""
        return self.kingpost.looks

    def possible(self, action_id: str) -> bool:
        """Whether an action of this view can be done now."""
        name = action_id.replace(".", "_")
        can = self._method(f"can_{name}")
        if can is not None and not can():
            return False
        return self._doer(name) is not None

    def _doer(self, name: str) -> Any:
        return self._method(f"do_{name}")

    def _method(self, name: str) -> Any:
        """A method of the view, else of the application, else of one of its helpers."""
        for one in (self, self.app, *self.kingpost.helpers):
            found = getattr(one, name, None)
            if found is not None:
                return found
        return None

    def node_at_hand(self) -> int | None:
        """The node that marks, notes and copying are about, in views that have one."""
        return None

    def row_at_hand(self) -> list[str]:
        """The cells of the row at hand, as shown, for copying."""
        return []

    def marks_changed(self) -> None:
        """Called when the node at hand was marked or its mark taken off."""

    def take(self, event: events.Key | events.Paste) -> None:
        """A key or pasted text for this view; kept until its widgets exist."""
        if not self.composed:
            self._early.append(event)
        elif isinstance(event, events.Paste):
            self.pasted(event.text)
        else:
            action_id = self.kingpost.keymap(self.view).get(event.key)
            if action_id is not None and self.possible(action_id):
                self.do(action_id)
            else:
                self.typed(event)

    def pasted(self, text: str) -> None:
        """Text that was pasted: views that take text use it, the others say that they do not."""
        self.kingpost.news("nothing takes text here: what was pasted is left aside", "bad")

    def typed(self, event: events.Key) -> None:
        """A key that is no action: views that take text use it."""

    def do(self, action_id: str) -> None:
        """Do an action by its id; a fault in it becomes a sentence, and the screen goes on."""
        try:
            self._doer(action_id.replace(".", "_"))()
        except Exception as error:
            if self.app.is_headless:
                raise
            self.kingpost.fault(error, f"{action_id} failed")
        self.refresh_keys()

    def refresh_keys(self) -> None:
        """Show the keys that do something now."""
        if not self.composed or not self.is_attached:
            return
        possible = [a.id for a in actions.ACTIONS if self.view in a.views and self.possible(a.id)]
        for line in self.query(KeyLine):
            line.keys(keymaps.key_line(self.view, possible, self.kingpost.bound))

    def tell(self, text: str, role: str = "news") -> None:
        """Show news in the rule above the keys, where the view has one."""
        for rule in self.query("#news").results(Rule):
            rule.tell(text, role)

    def on_screen_resume(self) -> None:
        self.refresh_keys()
        self.tell(*self.kingpost.latest_news)

    def refreshed(self) -> None:
        """Called when results, jobs or the table have changed; views show what concerns them."""
