"""Everything that can be done, found by a few typed letters; from the registry of actions."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from kingpost.core.standing import UNRANKED
from kingpost.tui import actions, keymaps, rooms
from kingpost.tui.actions import Action
from kingpost.tui.models.columns import Column

# Moving the cursor by way of a list of all actions helps nobody.
_LEFT_OUT = ("Moving",)


@dataclass(frozen=True)
class Deed:
    """An action as it stands in the list: its keys as bound now, and whether it is possible."""

    action: Action
    keys: str
    possible: bool

    @property
    def where(self) -> str:
        """Where it is possible, if not here."""
        if self.possible:
            return ""
        return "in " + ", ".join(rooms.VIEW_WORDS.get(view, view) for view in self.action.views)


def deeds(
    view: str,
    possible: Callable[[str], bool],
    bound: keymaps.Bound,
) -> list[Deed]:
    """All actions but those that move and those of this list itself: the possible ones first,
    in the order of the key line.
    """
    listed = [
        Deed(
            action,
            " ".join(keymaps.key_words(key) for key in bound.get(action.id, action.keys)),
            view in action.views and possible(action.id),
        )
        for action in actions.ACTIONS
        if action.views != (rooms.DOING,)
        and (action.group not in _LEFT_OUT or view in action.views)
    ]
    ordered = sorted(
        listed,
        key=lambda deed: (
            not deed.possible,
            deed.action.group in _LEFT_OUT,
            deed.action.order,
        ),
    )
    return [deed for deed in ordered if deed.action.id != "do.anything"]


def narrowed(listed: list[Deed], text: str) -> list[Deed]:
    """The deeds in which every typed word occurs; those whose name begins so come first."""
    words = text.casefold().split()

    def holds(deed: Deed) -> bool:
        action = deed.action
        about = f"{action.words} {action.means} {action.id} {action.group}".casefold()
        return all(word in about for word in words)

    def begins(deed: Deed) -> bool:
        about = (deed.action.words.casefold(), deed.action.id)
        return bool(words) and any(text.startswith(words[0]) for text in about)

    kept = [deed for deed in listed if holds(deed)]
    return sorted(kept, key=lambda deed: (not deed.possible, not begins(deed)))


class Deeds:
    """Deeds as the source of a row-window table."""

    def __init__(self, listed: list[Deed]) -> None:
        self.listed = listed
        self.head = [
            Column("keys", "", 10, lambda at: self.listed[at].keys, frozen=True),
            Column("means", "", 100, self._means),
        ]

    def _means(self, at: int) -> str:
        deed = self.listed[at]
        return f"{deed.where}: {deed.action.means}" if deed.where else deed.action.means

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.listed)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """No rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is found here."""
        return False
