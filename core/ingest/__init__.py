"""Tables of edges -> one immutable Graph, with an account of every row.

Light to import: Arrow and the compiled loops are loaded on first use.
"""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from kingpost.core.ingest.options import LoadOptions

if TYPE_CHECKING:
    import pyarrow as pa

    from kingpost.core.graph import Floats, Graph
    from kingpost.core.ingest.about import TableAbout
    from kingpost.core.ingest.glance import Peek
    from kingpost.core.ingest.room import Prediction
    from kingpost.core.ingest.together import Together
    from kingpost.core.watch import Watch

__all__ = [
    "LoadOptions",
    "describe",
    "from_edges",
    "from_networkx",
    "from_scipy",
    "from_table",
    "load",
    "load_together",
    "peek",
    "predict",
    "read_node_values",
]

_IN_MEMORY = ("from_edges", "from_networkx", "from_scipy")


def __getattr__(name: str) -> Any:
    if name in _IN_MEMORY:
        from kingpost.core.ingest import memory

        return getattr(memory, name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


Paths = str | os.PathLike[str] | Sequence[str | os.PathLike[str]]


def load(
    paths: Paths,
    options: LoadOptions | None = None,
    watch: Watch | None = None,
    **overrides: Any,
) -> Graph:
    """Load an edge table.

    Args:
        paths: files, folders of them (hive partitions become columns) or globs: Parquet, CSV or
            TSV (packed by gzip, bzip2 or zstd or not), Arrow IPC, Matrix Market, GraphML; ``-``
            is standard input.
        options: how rows become edges; keyword ``overrides`` replace single fields.
        watch: progress and cancelling.

    Raises:
        InputError: for files or columns that cannot be used; RowsError for refused rows.
        SettingsError: for options outside their choices.
        Interrupted: if the watch was cancelled.
    """
    from kingpost.core.ingest import files, pipeline

    chosen = dataclasses.replace(options or LoadOptions(), **overrides)
    return pipeline.build_graph(files.open_parts(paths, chosen, watch), chosen, watch)


def load_together(
    *tables: Paths,
    options: LoadOptions | None = None,
    watch: Watch | None = None,
    **overrides: Any,
) -> Together:
    """Load two or more tables of the same system on one numbering of ids.

    Columns are chosen once for all of them, and ids of several types (32 and 64 bits, whole
    numbers and text of text files) are brought to one.

    Raises:
        InputError, RowsError, SettingsError, Interrupted: as :func:`load` does, before any row
            is read if the tables do not go together.
    """
    from kingpost.core.ingest import together
    from kingpost.core.watch import Watch

    chosen = dataclasses.replace(options or LoadOptions(), **overrides)
    return together.load_together(list(tables), chosen, watch or Watch())


def from_table(
    table: pa.Table,
    options: LoadOptions | None = None,
    watch: Watch | None = None,
    name: str = "table",
    **overrides: Any,
) -> Graph:
    """Like :func:`load`, from an Arrow table in memory; ``name`` stands for the file's name."""
    from kingpost.core.ingest import parts, pipeline

    chosen = dataclasses.replace(options or LoadOptions(), **overrides)
    return pipeline.build_graph(parts.parts_of_table(table, name), chosen, watch)


def read_node_values(
    path: str | os.PathLike[str], graph: Graph, column: str | None = None
) -> Floats:
    """A number for every node from a Parquet or CSV file of ids and values, shape (n,).

    Nodes that the file does not name get 0.

    Raises:
        InputError: for an unusable file or column, ids that the graph does not hold, repeated
            ids, or values that are null, NaN, infinite or negative.
    """
    from kingpost.core.ingest import nodes

    return nodes.read_values(path, graph, column)


def describe(
    paths: Paths, options: LoadOptions | None = None, watch: Watch | None = None
) -> TableAbout:
    """What the files hold and which columns would be taken, without reading rows.

    Only text formats are read through, once: they do not say what they hold.
    """
    from kingpost.core.ingest import about

    return about.about(paths, options, watch)


def predict(
    paths: Paths, options: LoadOptions | None = None, watch: Watch | None = None
) -> Prediction:
    """How much memory loading would take at its peak, and how much there is.

    Raises:
        InputError, SettingsError, Interrupted: as :func:`load` does, before it reads rows.
    """
    from kingpost.core.ingest import columns, files, room, where
    from kingpost.core.watch import Watch

    chosen, watch = options or LoadOptions(), watch or Watch()
    parts = files.open_parts(paths, chosen, watch)
    roles = columns.choose(parts, chosen)
    rows = None if chosen.where is None else where.Filter(chosen.where, parts)
    return room.predict(parts, roles, watch, rows, directed=chosen.directed)


def peek(paths: Paths, rows: int = 5, options: LoadOptions | None = None) -> Peek:
    """What :func:`describe` tells, and the first ``rows`` values of every column, safe to show."""
    from kingpost.core.ingest.glance import peek as look

    return look(paths, rows, options)
