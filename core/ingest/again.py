"""The same table read with other policies for parallel rows, as other software would have."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np
import pyarrow as pa

from kingpost.core.graph import Graph
from kingpost.core.ingest.files import open_parts
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, parts_of_table
from kingpost.core.ingest.pipeline import build_graph
from kingpost.core.watch import Watch


def rereadings(
    paths: list[str], options: LoadOptions, graph: Graph, watch: Watch
) -> dict[str, Callable[[], Graph]]:
    """Makers of graphs, by what becomes of parallel rows: ``count``, ``last``, ``first``.

    Empty where no row was merged.  ``last`` is what becomes of a simple graph whose edges are
    set one row after the other.
    """
    if graph.account.merged == 0:
        return {}
    origin = graph.origin
    named = dataclasses.replace(
        options, source=origin.source, target=origin.target, weight=origin.weight
    )
    if options.node_where is None:
        named = dataclasses.replace(named, nodes=None, node_id=None)

    def read(policy: str, backwards: bool = False) -> Callable[[], Graph]:
        def make() -> Graph:
            watch.report(f"reading parallel rows again, policy {policy}")
            parts = open_parts(paths, named, watch)
            if backwards:
                names = [origin.source, origin.target, origin.weight or origin.source]
                parts = [
                    _backwards(part, names if options.where is None else part.schema.names)
                    for part in reversed(parts)
                ]
            return build_graph(parts, dataclasses.replace(named, parallel=policy), watch)

        return make

    # Without weights the sum of parallel rows is their number.
    counted = options.parallel == "count" or (options.parallel == "sum" and origin.weight is None)
    found = {} if counted else {"count": read("count")}
    if graph.weighted and origin.weight is not None:
        found["last"] = read("first", backwards=True)
        found["first"] = read("first")
    return found


def _backwards(part: Part, names: list[str]) -> Part:
    table = pa.Table.from_batches(list(part.read(list(names), False)))
    order = pa.array(np.arange(table.num_rows - 1, -1, -1))
    turned = parts_of_table(table.take(order), part.name)[0]
    # What was said of the file holds for it backwards too.
    return dataclasses.replace(
        part, rows=turned.rows, read=turned.read, schema=turned.schema, groups=()
    )
