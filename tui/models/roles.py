"""Which column of a table is what: the choices made, and what is still missing."""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING, Any

from kingpost.core.standing import UNRANKED
from kingpost.core.text import count, visible
from kingpost.tui.models.columns import Column

if TYPE_CHECKING:
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.ingest.glance import Peek

SOURCE, TARGET, WEIGHT = "source", "target", "weight"
_SHOWN_ROWS = 3
_VALUE = 14
# Lines below the columns: how the rows are read.
_WAYS = (
    ("directed", "every row", ((True, "one way"), (False, "both ways"))),
    ("bad_rows", "faulty rows", (("refuse", "refuse"), ("skip", "skip"))),
)


class Roles:
    """The columns of a table, each with its role or none; a source for the row-window table.

    Rows are the columns of the table and then the ways of reading it.
    """

    def __init__(self, peek: Peek, options: LoadOptions) -> None:
        self.peek, self._options = peek, options
        self.columns = peek.about.columns
        names = {column.name for column in self.columns}
        self.chosen: dict[str, str | None] = {
            role: given if given in names else guess
            for role, given, guess in (
                (SOURCE, options.source, peek.about.source),
                (TARGET, options.target, peek.about.target),
                (WEIGHT, options.weight, peek.about.weight),
            )
        }
        self.ways: dict[str, Any] = {name: getattr(options, name) for name, _, _ in _WAYS}
        longest = max((len(visible(column.name)) for column in self.columns), default=6)
        self.head = [
            Column("role", "is", 9, self._role, frozen=True),
            Column(
                "name", "column", min(max(longest, 11), 24), self._name, frozen=True, stretch=40
            ),
            Column("type", "type", 10, self._type),
            Column("nulls", "nulls", 7, self._nulls, right=True),
            *(self._sample(at) for at in range(_SHOWN_ROWS)),
        ]

    @property
    def count(self) -> int:
        """Number of rows."""
        return len(self.columns) + len(_WAYS)

    def item(self, row: int) -> int:
        """Rows are addressed by their place."""
        return row

    def rail(self, row: int) -> int:
        """No rail."""
        return UNRANKED

    def marked(self, row: int) -> bool:
        """Nothing is found here."""
        return False

    # ---- cells ---------------------------------------------------------------------------------

    def _role(self, at: int) -> str:
        if at >= len(self.columns):
            name, _, choices = _WAYS[at - len(self.columns)]
            return dict(choices)[self.ways[name]]
        return self.role_of(at) or "-"

    def _name(self, at: int) -> str:
        if at >= len(self.columns):
            return _WAYS[at - len(self.columns)][1]
        return visible(self.columns[at].name, 80)

    def _type(self, at: int) -> str:
        return visible(self.columns[at].type, 24) if at < len(self.columns) else ""

    def _nulls(self, at: int) -> str:
        if at >= len(self.columns):
            return ""
        nulls = self.columns[at].nulls
        return "?" if nulls is None else f"{nulls:,}"

    def _sample(self, place: int) -> Column:
        def text(at: int) -> str:
            values = self.peek.values[at] if at < len(self.columns) else ()
            return values[place] if place < len(values) else ""

        return Column(f"row{place}", f"row {place + 1}", _VALUE, text)

    # ---- choosing ------------------------------------------------------------------------------

    def role_of(self, at: int) -> str | None:
        """The role of a column."""
        name = self.columns[at].name
        return next((role for role, chosen in self.chosen.items() if chosen == name), None)

    def turn(self, at: int, step: int) -> None:
        """Give a row the next or the previous of the roles it can have; the one that had it
        before has none then.
        """
        if at >= len(self.columns):
            name, _, choices = _WAYS[at - len(self.columns)]
            values: list[Any] = [value for value, _ in choices]
            self.ways[name] = values[(values.index(self.ways[name]) + step) % len(values)]
            return
        column = self.columns[at]
        fits: list[str | None] = [None]
        if [other.name for other in self.columns].count(column.name) == 1:
            fits += [SOURCE, TARGET] if column.can_be_id else []
            fits += [WEIGHT] if column.can_be_weight else []
        now = self.role_of(at)
        # What no column is yet comes first; a role that another column has is taken away last.
        fits.sort(
            key=lambda role: role is not None and self.chosen[role] not in (None, column.name)
        )
        place = fits.index(now) if now in fits else 0
        wanted = fits[(place + step) % len(fits)]
        if now is not None:
            self.chosen[now] = None
        if wanted is not None:
            self.chosen[wanted] = column.name

    @property
    def missing(self) -> str:
        """What is to be chosen yet; empty if the table can be read."""
        source, target = self.chosen[SOURCE], self.chosen[TARGET]
        if source is None and target is None:
            return "say which column an edge starts at (source) and which it leads to (target)"
        if source is None:
            return "say which column an edge starts at (source)"
        if target is None:
            return "say which column an edge leads to (target)"
        return self.peek.apart(source, target)

    @property
    def words(self) -> str:
        """The choice in words."""
        source, target = self.chosen[SOURCE], self.chosen[TARGET]
        weight = self.chosen[WEIGHT]
        arrow = "->" if self.ways["directed"] else "--"
        ends = f"{visible(source or '?', 24)} {arrow} {visible(target or '?', 24)}"
        return f"{ends}, " + (f"weight {visible(weight, 24)}" if weight else "no weights")

    @property
    def size(self) -> str:
        """Rows, columns and files."""
        about = self.peek.about
        files = f"  {count(len(about.files), 'file')}" if len(about.files) > 1 else ""
        return f"{count(about.rows, 'row')}  {count(len(about.columns), 'column')}{files}"

    def options(self) -> LoadOptions:
        """How the table is to be read."""
        weight = self.chosen[WEIGHT]
        return dataclasses.replace(
            self._options,
            source=self.chosen[SOURCE],
            target=self.chosen[TARGET],
            weight=weight,
            # Without this a column that is named as a weight would be taken all the same.
            weight_as=self._options.weight_as if weight is not None else "none",
            **self.ways,
        )
