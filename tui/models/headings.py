"""Which columns a table shows and in which order: what was chosen, and what came since."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from kingpost.tui.models.columns import Column


@dataclass(frozen=True)
class Choice:
    """The columns in their order, each shown or hidden.  Frozen columns have no say in it."""

    order: tuple[str, ...] = ()
    hidden: frozenset[str] = frozenset()

    def switched(self, key: str) -> Choice:
        """Show a hidden column, or hide a shown one."""
        return Choice(self.order, self.hidden ^ {key})

    def moved(self, key: str, step: int) -> Choice:
        """Put a column further left or right by ``step`` places."""
        at = self.order.index(key)
        to = min(max(at + step, 0), len(self.order) - 1)
        order = [other for other in self.order if other != key]
        order.insert(to, key)
        return Choice(tuple(order), self.hidden)


def choice_of(columns: Sequence[Column], before: Choice | None = None) -> Choice:
    """The choice over these columns: as made before, with columns new since then at the end.

    What another measure or graph had in place of a column is remembered for its return.
    """
    before = before or Choice()
    known = set(before.order)
    fresh = [column for column in columns if not column.frozen and column.key not in known]
    hidden = before.hidden | {column.key for column in fresh if column.optional}
    return Choice((*before.order, *(column.key for column in fresh)), hidden)


def shown(columns: Sequence[Column], choice: Choice | None = None) -> list[Column]:
    """The columns to show: the frozen ones, then those of the choice in its order."""
    choice = choice_of(columns, choice)
    by_key = {column.key: column for column in columns}
    frozen = [column for column in columns if column.frozen]
    chosen = [key for key in choice.order if key in by_key and key not in choice.hidden]
    return frozen + [by_key[key] for key in chosen]
