"""Keys: which do what in which view, and how that is told."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from kingpost.tui.actions import ACTIONS, BY_ID, Action
from kingpost.tui.rooms import TYPING

_KEY_WORDS = {
    "slash": "/",
    "question_mark": "?",
    "enter": "Enter",
    "escape": "Esc",
    "tab": "Tab",
    "up": "Up",
    "down": "Down",
    "left": "Left",
    "right": "Right",
    "pagedown": "PageDown",
    "pageup": "PageUp",
    "home": "Home",
    "end": "End",
    "ctrl+c": "Ctrl-C",
}


def key_words(key: str) -> str:
    """A key as it is written on the screen."""
    return _KEY_WORDS.get(key, key)


Bound = Mapping[str, tuple[str, ...]]  # action id -> keys given by the user


def keys_in(view: str, action: Action, bound: Bound | None = None) -> tuple[str, ...]:
    """The keys of an action in a view: letters are no keys where text is typed."""
    bound = bound or {}
    keys = bound.get(action.id, action.keys)
    if action.id not in bound:
        # A key that was given to something else is no longer its former owner's.
        taken = {key for one, given in bound.items() if view in BY_ID[one].views for key in given}
        keys = tuple(key for key in keys if key not in taken)
    if view in TYPING:
        return tuple(key for key in keys if len(key) > 1 and key not in ("slash", "question_mark"))
    return keys


def keymap(view: str, bound: Bound | None = None) -> dict[str, str]:
    """Key -> action id for one view; ``bound`` gives other keys to some action ids."""
    found: dict[str, str] = {}
    for action in ACTIONS:
        if view in action.views:
            for key in keys_in(view, action, bound):
                found.setdefault(key, action.id)
    return found


def key_line(
    view: str, possible: Iterable[str], bound: Bound | None = None
) -> list[tuple[str, str]]:
    """(key, words) for the foot of a view, most useful first, of the actions possible now."""
    now = set(possible)
    chosen = [a for a in ACTIONS if view in a.views and a.words and a.id in now]
    return [
        (key_words(keys[0]), action.words)
        for action in sorted(chosen, key=lambda a: a.order)
        if (keys := keys_in(view, action, bound))
    ]


def help_rows(bound: Bound | None = None) -> list[tuple[str, str, str]]:
    """(group, keys, meaning) of every action, grouped, in the order of the registry."""
    groups: dict[str, list[Action]] = {}
    for action in ACTIONS:
        groups.setdefault(action.group, []).append(action)
    return [
        (
            group,
            " ".join(key_words(key) for key in (bound or {}).get(action.id, action.keys)),
            action.means,
        )
        for group, actions in groups.items()
        for action in actions
    ]
