"""A recipe as a Parquet file: named columns, ids as numbers or text, in memory for a few batches.

Batches are made on several threads and written in their order, so the file holds the same rows
whatever the number of threads.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any, BinaryIO, Final

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.gallery.chance import Counter, uniform
from kingpost.core.gallery.edges import EdgeList
from kingpost.core.gallery.recipes import Recipe
from kingpost.core.watch import Watch

# Names of the ends and of the weight, in the words of each kind.
COLUMNS: Final = {
    "rmat": ("source", "target", "weight"),
    "citation": ("citing", "cited", "weight"),
    "layered": ("caller", "callee", "calls"),
    "powerlaw": ("source", "target", "weight"),
    "pairwise": ("loser", "winner", "margin"),
}
NAMES: Final = ("number", "text")
WEIGHTS: Final = ("own", "none", "pareto")
# First moment and length of the time in which the rows of a kind happen, in milliseconds of UTC.
_DAY: Final = 86_400_000
_TIMES: Final = {
    "citation": (-7305 * _DAY, 25_568 * _DAY),  # papers from 1950 to 2019, one after another
    "layered": (18_262 * _DAY, _DAY),  # calls over the first day of 2020
    "pairwise": (18_262 * _DAY, 366 * _DAY),  # contests over 2020
}
_BATCH: Final = 1 << 17
_SPREAD: Final = np.uint64(0x9E3779B97F4A7C15)  # odd: multiplying by it is one-to-one
_PREFIX: Final = b"node-"
_DIGITS: Final = 20
_FEW: Final = 100_000  # ids of 64 bits that a Parquet dictionary page holds; more is wasted work


@dataclass(frozen=True, kw_only=True)
class TableForm:
    """How the rows of a ``kind`` are told.

    Attributes:
        names: ids as 64-bit numbers (``number``) or as text of 25 characters whose order has
            nothing to do with the numbers (``text``).
        weights: the kind's own, if it has any (``own``), no column (``none``), or drawn from a
            Pareto distribution with exponent 1.2 and least value 1 (``pareto``).
        time: a column ``time``, ascending from row to row: citation, layered and pairwise.
        seed: of the weights that are drawn.

    Raises:
        SettingsError: for a value that is none of the choices, or times for a kind without.
    """

    kind: str
    names: str = "number"
    weights: str = "own"
    time: bool = False
    seed: int = 0

    def __post_init__(self) -> None:
        for value, choices, flag in (
            (self.kind, tuple(COLUMNS), "KIND"),
            (self.names, NAMES, "--names"),
            (self.weights, WEIGHTS, "--weights"),
        ):
            if value not in choices:
                raise SettingsError(f"{flag} is {value!r}; it takes {', '.join(choices)}")
        if self.time and self.kind not in _TIMES:
            raise SettingsError(
                f"the edges of {self.kind} graphs happen at no time; --time goes with "
                f"{', '.join(_TIMES)}"
            )

    def schema(self, graph: Recipe) -> pa.Schema:
        """Columns and types."""
        source, target, weight = COLUMNS[self.kind]
        ids = pa.string() if self.names == "text" else pa.int64()
        fields = [pa.field(source, ids, False), pa.field(target, ids, False)]
        if self.weights == "pareto" or (self.weights == "own" and graph.weighted):
            fields.append(pa.field(weight, pa.float64(), False))
        if self.time:
            fields.append(pa.field("time", pa.timestamp("ms"), False))
        return pa.schema(fields)

    def batch(self, graph: Recipe, start: int, stop: int) -> pa.RecordBatch:
        """Rows ``start`` to ``stop`` (not included) of the table."""
        part = graph.part(start, stop)
        columns: list[pa.Array] = [self._ids(part.source), self._ids(part.target)]
        index = np.arange(start, start + part.m, dtype=np.uint64)
        if self.weights == "pareto":
            lots = uniform(self.seed, 60, index)
            columns.append(pa.array((1.0 - lots) ** (-1.0 / 1.2)))
        elif self.weights == "own" and part.weight is not None:
            columns.append(pa.array(part.weight))
        if self.time:
            columns.append(self._times(graph, part, index))
        return pa.RecordBatch.from_arrays(columns, schema=self.schema(graph))

    def _ids(self, nodes: NDArray[np.int64]) -> pa.Array:
        return text_ids(nodes) if self.names == "text" else pa.array(nodes)

    def _times(self, graph: Recipe, part: EdgeList, index: Counter) -> pa.Array:
        first, length = _TIMES[self.kind]
        whole = graph.n if self.kind == "citation" else graph.edges
        place = part.source if self.kind == "citation" else index.astype(np.int64)
        share = place / float(max(1, whole))
        return pa.array((first + share * length).astype(np.int64)).cast(pa.timestamp("ms"))


def text_ids(nodes: NDArray[np.int64]) -> pa.Array:
    """Names of 25 characters, one for each number: the same number has always the same name."""
    numbers = nodes.astype(np.uint64) * _SPREAD
    size = len(_PREFIX) + _DIGITS
    letters = np.empty((len(nodes), size), dtype=np.uint8)
    letters[:, : len(_PREFIX)] = np.frombuffer(_PREFIX, dtype=np.uint8)
    four = _four_digits()
    for end in range(size, len(_PREFIX), -4):
        numbers, low = np.divmod(numbers, np.uint64(10_000))
        letters[:, end - 4 : end] = four[low]
    offsets = np.arange(len(nodes) + 1, dtype=np.int32) * np.int32(size)
    buffers = [None, pa.py_buffer(offsets), pa.py_buffer(letters)]
    return pa.Array.from_buffers(pa.string(), len(nodes), buffers)


def _four_digits() -> NDArray[np.uint8]:
    """The digits of 0 to 9999, shape (10000, 4)."""
    numbers = np.arange(10_000)
    digits = np.stack([numbers // 1000, numbers // 100 % 10, numbers // 10 % 10, numbers % 10], 1)
    return (digits + ord("0")).astype(np.uint8)


def write_parquet(
    graph: Recipe, form: TableForm, sink: BinaryIO, watch: Watch | None = None
) -> None:
    """Write all edges of ``graph`` to ``sink``, in row groups of about a million rows.

    Raises:
        Interrupted: if the watch is cancelled; the file is then unfinished.
    """
    watch = watch or Watch()
    schema = form.schema(graph)
    # Dictionaries of more ids than fit are begun and thrown away for every row group.
    plain = form.names == "number" and graph.n > _FEW
    coded: list[str] | bool = False if plain else [schema.names[0], schema.names[1]]
    writer = pq.ParquetWriter(sink, schema, use_dictionary=coded, compression="snappy")
    done = 0
    with writer:
        for batch in _ahead(graph, form, watch):
            writer.write_batch(batch)
            done += batch.num_rows
            watch.report("writing edges", done, graph.edges, "edges")
            watch.check()


def _ahead(graph: Recipe, form: TableForm, watch: Watch) -> Iterator[pa.RecordBatch]:
    """Batches in order, made a few ahead on other threads."""
    waiting: deque[Future[Any]] = deque()
    with ThreadPoolExecutor(watch.threads) as pool:
        try:
            for start in range(0, graph.edges, _BATCH):
                stop = min(start + _BATCH, graph.edges)
                waiting.append(pool.submit(form.batch, graph, start, stop))
                if len(waiting) > 2 * watch.threads:
                    yield waiting.popleft().result()
            while waiting:
                yield waiting.popleft().result()
        finally:
            for each in waiting:
                each.cancel()
