"""A line of text being written: what is typed, a caret, and a limit on what is pasted."""

from __future__ import annotations

from textual import events

from kingpost.core.text import visible
from kingpost.tui.models.drawing import cut
from kingpost.tui.widgets.lines import Line, Piece

LIMIT = 1_000


class Writing:
    """The text and where the caret stands; knows no screen."""

    def __init__(self, text: str = "") -> None:
        self.text = text[:LIMIT]
        self.caret = len(self.text)

    def insert(self, text: str) -> bool:
        """Put text at the caret; line ends become spaces, other control characters are left out.

        True if all of it had room.
        """
        room = max(LIMIT - len(self.text), 0)
        all_of_it = len(text) <= room
        text = text[:room]
        text = "".join(
            " " if c in "\r\n\t" else c for c in text if c in "\r\n\t" or c.isprintable()
        )
        self.text = self.text[: self.caret] + text + self.text[self.caret :]
        self.caret += len(text)
        return all_of_it

    def key(self, key: str, character: str | None) -> bool:
        """A key pressed; False if it means nothing here."""
        if key == "backspace":
            self.text = self.text[: max(self.caret - 1, 0)] + self.text[self.caret :]
            self.caret = max(self.caret - 1, 0)
        elif key == "delete":
            self.text = self.text[: self.caret] + self.text[self.caret + 1 :]
        elif key == "left":
            self.caret = max(self.caret - 1, 0)
        elif key == "right":
            self.caret = min(self.caret + 1, len(self.text))
        elif key == "home":
            self.caret = 0
        elif key == "end":
            self.caret = len(self.text)
        elif character and len(character) == 1 and character.isprintable():
            self.insert(character)
        else:
            return False
        return True

    def pieces(self, width: int) -> list[Piece]:
        """The text around the caret, the caret as a reversed cell; at most ``width`` cells."""
        before, after = visible(self.text[: self.caret]), visible(self.text[self.caret :])
        while before and len(before) > 2 * width:
            before = before[len(before) - 2 * width :]
        while before and len(cut(before, width - 2)) < len(before):
            before = before[1:]
        here = after[:1] or " "
        return [(before, "plain"), (here, "cursor"), (after[1:], "plain")]


class Entry(Line):
    """The one-line widget over a :class:`Writing`."""

    def __init__(self, label: str, text: str = "", id: str | None = None) -> None:
        super().__init__(id=id)
        self._label = label
        self.writing = Writing(text)

    def on_mount(self) -> None:
        self.write()

    def on_resize(self) -> None:
        self.write()

    def typed(self, event: events.Key) -> None:
        """Take a key, if it means anything here."""
        if self.writing.key(event.key, event.character):
            self.write()

    def pasted(self, text: str) -> bool:
        """Take pasted text, up to the limit; True if all of it had room."""
        all_of_it = self.writing.insert(text)
        self.write()
        return all_of_it

    def write(self) -> None:
        """Show the text as it stands."""
        label: Piece = (f" {self._label}  ", "strong")
        self.show(label, *self.writing.pieces((self.size.width or 80) - len(self._label) - 4))
