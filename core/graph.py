"""The one immutable Graph that everything else is about.

``A[u, v]`` is the weight of the edge ``u -> v``: u points at, depends on, calls, cites or votes
for v.  Both directions are kept as compressed adjacency: ``outward`` lists, for every node, whom
it points at; ``inward`` who points at it.  A graph without weights stores none: 4 bytes an edge
and direction.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from functools import cached_property
from importlib import import_module
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import NodeNotFound
from kingpost.core.text import id_text, visible

if TYPE_CHECKING:
    import pyarrow as pa

    from kingpost.core.result import Result
    from kingpost.core.structure import Structure
    from kingpost.core.watch import Watch

Flow = Literal["along", "against"]
Floats = NDArray[np.float64]
Offsets = NDArray[np.int64]
Neighbours = NDArray[np.uint32]
_PIECE = 1_000_000  # edges


@dataclass(frozen=True)
class Adjacency:
    """Compressed rows: node ``i`` meets ``neighbours[offsets[i]:offsets[i + 1]]``, ascending.

    ``offsets`` has n + 1 entries, ``neighbours`` m; ``weights`` is None where every weight is 1,
    else m positive finite numbers (strength, never distance).
    """

    offsets: Offsets
    neighbours: Neighbours
    weights: Floats | None = None

    def __post_init__(self) -> None:
        for array in (self.offsets, self.neighbours, self.weights):
            if array is not None:
                array.setflags(write=False)

    @property
    def degrees(self) -> NDArray[np.int64]:
        """Number of neighbours of every node, shape (n,)."""
        return np.diff(self.offsets)

    def strengths(self) -> Floats:
        """Sum of the weights in every row, shape (n,), each rounded once (compensated sums)."""
        if self.weights is None:
            return self.degrees.astype(np.float64)
        from kingpost.core.kernels.rows import row_totals

        n = len(self.offsets) - 1
        total = np.zeros(n)
        row_totals(self.offsets, self.weights, 0, n, total)
        return total

    @cached_property
    def loops(self) -> Floats:
        """Weight of the edge from every node to itself, shape (n,); empty where there is none."""
        from kingpost.core.kernels.rows import diagonal

        values = np.zeros(len(self.offsets) - 1)
        found = diagonal(self.offsets, self.neighbours, self.weights, values)
        return values if found else np.empty(0)

    def row(self, node: int) -> tuple[Neighbours, Floats]:
        """Neighbours of one node and the weights of those edges."""
        part = slice(int(self.offsets[node]), int(self.offsets[node + 1]))
        near = self.neighbours[part]
        return near, np.ones(len(near)) if self.weights is None else self.weights[part]


@dataclass(frozen=True, slots=True)
class Account:
    """What became of every row of the edge table; travels with the graph.

    ``rows_read = rows_kept + filtered + outside + sum(skipped.values())``, and
    ``Graph.m = rows_kept - loops_dropped - merged - zero_weight``, exactly.  ``filtered`` rows
    are those for which ``Origin.where`` is not true, ``filtered_null`` of them because it is
    neither true nor false; a filtered row is not looked at any further.  ``outside`` rows have
    an end that ``Origin.node_where`` left out.  Of the kept rows
    ``loops`` lead from a node to itself, and ``loops_dropped`` is 0 or all of these; ``merged``
    counts the other rows that were folded into an edge an earlier row had named; ``zero_weight``
    counts edges (after merging) that weigh 0: they carry nothing and are left out.  The ends of
    dropped loops and of zero-weight edges stay nodes.  ``examples`` holds up to three rows for
    every reason in ``skipped``, safe to print; so are ``notes``.

    ``nodes_rows = nodes_joined + nodes_unknown + nodes_repeated`` and
    ``Graph.n = nodes_joined + nodes_missing - nodes_filtered`` where a nodes table was joined:
    rows that describe a node, rows with a null id or one that no edge names, further rows of an
    id already met, and nodes without a row.  ``nodes_filtered`` nodes were left out by
    ``Origin.node_where``, ``nodes_filtered_null`` of them because it is neither true nor false.
    """

    rows_read: int = 0
    rows_kept: int = 0
    skipped: dict[str, int] = field(default_factory=dict)
    examples: dict[str, tuple[str, ...]] = field(default_factory=dict)
    merged: int = 0
    loops: int = 0
    loops_dropped: int = 0
    zero_weight: int = 0
    filtered: int = 0
    filtered_null: int = 0
    outside: int = 0
    nodes_rows: int = 0
    nodes_joined: int = 0
    nodes_unknown: int = 0
    nodes_missing: int = 0
    nodes_repeated: int = 0
    nodes_filtered: int = 0
    nodes_filtered_null: int = 0
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Origin:
    """Where a graph came from and how its rows were read, for headers and for reproduction."""

    files: tuple[str, ...] = ()
    source: str = "source"
    target: str = "target"
    weight: str | None = None
    weight_as: str = "asis"
    parallel: str = "sum"
    loops: str = "keep"
    bad_rows: str = "refuse"
    nodes_file: str | None = None
    node_id: str | None = None
    where: str | None = None
    node_where: str | None = None

    @property
    def name(self) -> str:
        """A short name: the file's own, or the first with a count of the others."""
        if not self.files:
            return "graph"
        first = self.files[0].rstrip("/").rsplit("/", 1)[-1]
        return first if len(self.files) == 1 else f"{first} +{len(self.files) - 1}"

    @property
    def where_words(self) -> str | None:
        """The filters, in a few words; None where there are none."""
        named = (("where", self.where), ("nodes where", self.node_where))
        return "; ".join(f"{name}: {text}" for name, text in named if text is not None) or None

    @property
    def weight_words(self) -> str:
        """How weights were read, in a few words."""
        if self.weight is None or self.weight_as == "none":
            return "none (every row counts 1)"
        return self.weight if self.weight_as == "asis" else f"{self.weight_as}({self.weight})"


@dataclass(frozen=True)
class Graph:
    """A weighted graph of n labelled nodes; immutable, built by :mod:`kingpost.core.ingest`.

    Nodes are numbered in ascending order of their ids (text by its UTF-8 bytes), whatever the
    order of rows, files and chunks.  In an undirected graph ``A`` is symmetric, each edge
    between two nodes is stored in both rows, a self-loop once, and ``inward is outward``.
    ``attributes`` has one row a node, in the same numbering.
    """

    labels: pa.Array
    outward: Adjacency
    inward: Adjacency
    directed: bool = True
    attributes: pa.Table | None = None
    account: Account = field(default_factory=Account)
    origin: Origin = field(default_factory=Origin)
    # Where results of this very graph are kept, if anywhere; a changed copy has none.
    # A store.results.Drawer, of which a graph need not know more.
    drawer: Any = field(default=None, init=False, compare=False, repr=False)

    @property
    def n(self) -> int:
        """Number of nodes."""
        return len(self.outward.offsets) - 1

    @property
    def stored(self) -> int:
        """Number of stored adjacency entries: what one sweep visits."""
        return len(self.outward.neighbours)

    @cached_property
    def m(self) -> int:
        """Number of edges; an undirected edge counts once."""
        if self.directed:
            return self.stored
        return (self.stored + self.loop_count) // 2

    @cached_property
    def loop_count(self) -> int:
        """Number of edges that lead from a node to itself."""
        offsets, near = self.outward.offsets, self.outward.neighbours
        found = first = 0
        while first < self.n:
            # In pieces: repeating keeps the interpreter to itself, and a screen may be waiting.
            end = int(np.searchsorted(offsets, offsets[first] + _PIECE, side="right")) - 1
            end = max(end, first + 1)
            rows = np.repeat(
                np.arange(first, end, dtype=np.uint32), np.diff(offsets[first : end + 1])
            )
            found += int(np.count_nonzero(rows == near[offsets[first] : offsets[end]]))
            first = end
        return found

    @property
    def weighted(self) -> bool:
        """Whether any edge weighs other than 1."""
        return self.outward.weights is not None

    def pull(self, flow: Flow = "along") -> Adjacency:
        """For every node, whom its score comes from when score flows ``along`` or ``against``."""
        return self.inward if flow == "along" else self.outward

    def push(self, flow: Flow = "along") -> Adjacency:
        """For every node, whom its score goes to when score flows ``along`` or ``against``."""
        return self.outward if flow == "along" else self.inward

    @cached_property
    def structure(self) -> Structure:
        """Components and dangling nodes; computed on first use and kept."""
        from kingpost.core.structure import analyse

        return analyse(self)

    @cached_property
    def fingerprint(self) -> str:
        """64 hexadecimal digits that depend on labels, edges and weights alone (SHA-256)."""
        digest = hashlib.sha256()
        kind = f"kingpost graph 1 {self.n} {int(self.directed)} {self.labels.type}"
        digest.update(kind.encode())
        for array in (self.outward.offsets, self.outward.neighbours, self.outward.weights):
            digest.update(
                b"-" if array is None else np.ascontiguousarray(array).view(np.uint8).data
            )
        for start in range(0, self.n, 65_536):
            for value in self.labels.slice(start, 65_536).to_pylist():
                text = id_text(value).encode("utf-8", "surrogatepass")
                digest.update(len(text).to_bytes(8, "little") + text)
        return digest.hexdigest()

    def rank(self, measure: str = "surfer", watch: Watch | None = None, **settings: Any) -> Result:
        """Solve one measure, with its settings by name.

        Raises:
            SettingsError: for a measure or setting that does not exist, or a value out of range.
            Interrupted: if ``watch`` was cancelled before there was anything to keep.
        """
        # By name: what a graph is must not depend on what is measured on it.
        solved: Result = import_module("kingpost.core.library").rank(
            self, measure, watch, **settings
        )
        return solved

    def __repr__(self) -> str:
        kind = "directed" if self.directed else "undirected"
        weighted = ", weighted" if self.weighted else ""
        name = visible(self.origin.name, 60)
        return f"<Graph {name}: {self.n:,} nodes, {self.m:,} edges, {kind}{weighted}>"

    def label(self, node: int) -> Any:
        """The id of a node as a Python value, exactly as it stood in the table."""
        return self.labels[node].as_py()

    def name(self, node: int, limit: int | None = None) -> str:
        """The id of a node as text that is safe to show."""
        return visible(id_text(self.label(node)), limit)

    def find(self, text: str) -> int:
        """Number of the node whose id reads ``text``.

        Raises:
            NodeNotFound: with the nearest few names, if there is none.
        """
        from kingpost.core.labels import locate, suggest

        node = locate(self.labels, text)
        if node is None:
            near = suggest(self.labels, text)
            advice = f"; did you mean {', '.join(near)}?" if near else ""
            raise NodeNotFound(f"no node is called {visible(text, 60)!r} among {self.n:,}{advice}")
        return node
