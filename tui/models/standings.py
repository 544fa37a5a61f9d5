"""The standings as a view model: order, filter, find, cursor.  Knows no screen.

Everything that takes a pass over all nodes (:func:`prepare`, :func:`arrange`,
:func:`search`) is a plain function to be run in a job; what is left for the screen is
looking up the few rows it shows.
"""

from __future__ import annotations

from collections.abc import Container, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Graph
from kingpost.core.labels import containing
from kingpost.core.result import Result
from kingpost.core.standing import OPEN, PROVEN, TIED, UNRANKED
from kingpost.core.watch import Watch
from kingpost.tui.models import columns as make
from kingpost.tui.models.columns import Column
from kingpost.tui.models.headings import shown
from kingpost.tui.models.rowquery import kept
from kingpost.tui.models.spread import Spread, spread_of

Rows = NDArray[np.int64]

# numpy's indexed assignment keeps the interpreter to itself: long ones go in pieces, so that the
# screen gets its turns meanwhile.
_CHUNK = 100_000
# So many other measures stand beside the score; more of them come after the attributes, which
# would be out of sight otherwise.
_NEAR = 2


@dataclass(frozen=True)
class Arrangement:
    """Which nodes are shown, and in which order.

    ``rows[i]`` is the node in row i; ``row_of[node]`` its row or -1; ``where`` the condition
    that kept them, empty for all.
    """

    rows: Rows
    row_of: NDArray[np.int32]
    sort: str = "rank"
    turned: bool = False
    where: str = ""


@dataclass(frozen=True)
class Found:
    """The rows of an arrangement whose name contains ``text``, ascending."""

    text: str
    rows: Rows

    def after(self, row: int) -> int | None:
        """The next row found below ``row``, going round; None where there is none."""
        if len(self.rows) == 0:
            return None
        at = int(np.searchsorted(self.rows, row, side="right"))
        return int(self.rows[at % len(self.rows)])

    def before(self, row: int) -> int | None:
        """The row found above ``row``, going round."""
        if len(self.rows) == 0:
            return None
        return int(self.rows[int(np.searchsorted(self.rows, row, side="left")) - 1])

    def place(self, row: int) -> int:
        """Which of the rows found, from 1, ``row`` is."""
        return int(np.searchsorted(self.rows, row)) + 1

    def holds(self, row: int) -> bool:
        """Whether ``row`` is one of them."""
        at = int(np.searchsorted(self.rows, row))
        return at < len(self.rows) and int(self.rows[at]) == row


class Standings:
    """The table of one result: what the row-window widget asks for, and the cursor.

    Rows are addressed 0..count-1 in the present arrangement.  ``all`` holds every column there
    is, ``head`` those shown, in their order; ``spread`` how the scores are spread.
    """

    def __init__(
        self,
        graph: Graph,
        result: Result,
        others: Sequence[Result],
        every: Sequence[Column],
        cuts: NDArray[np.int32],
        ties: NDArray[np.int32],
        arrangement: Arrangement,
    ) -> None:
        self.graph = graph
        self.result = result
        self.others = list(others)
        self.all = list(every)
        self.head = shown(self.all)
        self.spread: Spread = spread_of(result)
        self._cuts = cuts
        self._ties = ties
        self.arrangement = arrangement
        self.found: Found | None = None
        self.cursor = 0
        self.marks: Container[int] = ()

    @property
    def count(self) -> int:
        """Number of rows shown."""
        return len(self.arrangement.rows)

    def item(self, row: int) -> int:
        """The node in a row."""
        return int(self.arrangement.rows[row])

    @property
    def node(self) -> int | None:
        """The node under the cursor."""
        return self.item(self.cursor) if self.count else None

    def row_of(self, node: int) -> int | None:
        """The row of a node, None where the filter hides it."""
        row = int(self.arrangement.row_of[node])
        return None if row < 0 else row

    def rail(self, row: int) -> int:
        """How a row stands against the one below it: one of the codes of ``core.standing``.

        The statement holds in any arrangement: two rows are proven apart when a proven cut
        lies between their places in the standing, tied when nothing but ties does.
        """
        if self.result.refusal is not None:
            return UNRANKED
        position = self.result.standing.position
        here = int(position[self.item(row)])
        if self.result.standing.rail[here] == UNRANKED:
            return UNRANKED
        if row + 1 >= self.count:
            return PROVEN if here + 1 >= len(position) else int(self.result.standing.rail[here])
        low, high = sorted((here, int(position[self.item(row + 1)])))
        if self._cuts[high] > self._cuts[low]:
            return PROVEN
        return TIED if self._ties[high] - self._ties[low] == high - low else OPEN

    @property
    def settled(self) -> int:
        """The row under which the line is drawn: above it the order is proven, below it not.

        -1 where there is none: everything is proven or nothing, or rows stand otherwise.
        """
        arrangement, proven = self.arrangement, int(self.result.standing.proven)
        by_rank = arrangement.sort == "rank" and not arrangement.turned and not arrangement.where
        return proven - 1 if by_rank and proven < self.count else -1

    def marked(self, row: int) -> bool:
        """Whether the row was found by the last search."""
        return self.found is not None and self.found.holds(row)

    def kept(self, node: int) -> bool:
        """Whether a node is on the shortlist."""
        return node in self.marks

    def adopt(self, arrangement: Arrangement) -> None:
        """Show another arrangement, keeping the cursor on its node if that is still shown."""
        node = self.node
        self.arrangement, self.found = arrangement, None
        row = None if node is None else self.row_of(node)
        self.cursor = min(self.cursor, max(self.count - 1, 0)) if row is None else row

    def column(self, key: str) -> Column | None:
        """The column of that key, shown or not."""
        return next((column for column in self.all if column.key == key), None)


def prepare(
    graph: Graph,
    result: Result,
    others: Sequence[Result] = (),
    after: Standings | None = None,
    more: Sequence[Column] = (),
) -> Standings:
    """Everything the table of ``result`` needs, O(n log n); run it in a job.

    ``others`` get a column of ranks and one of scores each; sort, filter and cursor are taken
    over from ``after`` as far as they still make sense.  ``more`` columns stand beside the score.
    """
    standing = result.standing
    rail = standing.rail
    others = [other for other in others if other.refusal is None]
    ranks = [make.other_rank_column(other) for other in others]
    scores = [make.other_score_column(other) for other in others]
    every = [
        make.rank_column(result),
        make.name_column(graph, standing.order),
        make.score_column(result),
        *more,
        *ranks[:_NEAR],
        *make.degree_columns(graph),
        *make.attribute_columns(graph),
        *ranks[_NEAR:],
        *scores,
    ]
    plain = _arranged(standing.order, graph.n, "rank", False, "")
    table = Standings(
        graph, result, others, every, _before(rail == PROVEN), _before(rail == TIED), plain
    )
    if after is not None and after.graph is graph:
        old = after.arrangement
        if old.where or old.sort != "rank" or old.turned:
            sort = old.sort if table.column(old.sort) else "rank"
            table.arrangement = arrange(table, sort, old.turned, old.where)
        node = after.node
        row = None if node is None else table.row_of(node)
        table.cursor = row or 0
    return table


def arrange(
    table: Standings,
    sort: str,
    turned: bool = False,
    where: str = "",
    watch: Watch | None = None,
) -> Arrangement:
    """Sort by a column and keep the rows for which ``where``, SQL, is true; run it in a job.

    Equal values stand in the order of the standing.  ``turned`` reverses the column's own
    direction; what has no value stays last either way.

    Raises:
        SettingsError: if the condition cannot be used.
        Interrupted: if ``watch`` was cancelled.
    """
    mask = kept(table.graph, table.result, table.others, where, watch) if where else None
    order = table.result.standing.order
    column = table.column(sort)
    if column is not None and column.keys is not None and (sort != "rank" or turned):
        keys = np.take(column.keys(), order)
        falling = column.high_first != turned
        order = np.take(order, _stable(keys, falling))  # taking lets other threads go on
    if mask is not None:
        order = np.take(order, np.flatnonzero(np.take(mask, order)))
    return _arranged(order, table.graph.n, sort, turned, where)


def search(table: Standings, arrangement: Arrangement, text: str) -> Found:
    """Rows whose name contains ``text``, letter case apart; run it in a job."""
    hits = np.take(containing(table.graph.labels, text), arrangement.rows)
    return Found(text, np.flatnonzero(hits))


def _arranged(rows: Rows, n: int, sort: str, turned: bool, where: str) -> Arrangement:
    row_of = np.full(n, -1, dtype=np.int32)
    for start in range(0, len(rows), _CHUNK):
        some = rows[start : start + _CHUNK]
        row_of[some] = np.arange(start, start + len(some), dtype=np.int32)
    return Arrangement(rows, row_of, sort, turned, where)


def _stable(keys: NDArray[Any], falling: bool) -> Rows:
    if keys.dtype.kind in "iu" and len(keys):
        low, high = int(keys.min()), int(keys.max())
        if high - low < 1 << 16:
            # Sixteen bits are sorted by digits, in one pass a digit.
            keys = (high - keys if falling else keys - low).astype(np.uint16)
            return np.argsort(keys, kind="stable")
    if falling:
        keys = -(keys.astype(np.float64) if keys.dtype.kind == "u" else keys)
    return np.argsort(keys, kind="stable")


def _before(flags: NDArray[np.bool_]) -> NDArray[np.int32]:
    """How many flags are set before each position, shape (n + 1,)."""
    sums = np.zeros(len(flags) + 1, dtype=np.int32)
    np.cumsum(flags, out=sums[1:])
    return sums
