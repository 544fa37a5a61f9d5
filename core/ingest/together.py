"""Several tables of the same system on one numbering of ids: yesterday's and today's, say."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.graph import Graph
from kingpost.core.ingest.columns import choose
from kingpost.core.ingest.files import Paths, open_parts
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.pipeline import build_graph
from kingpost.core.watch import Watch

Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Together:
    """Graphs of several tables, and one numbering of all their ids.

    A graph keeps its own nodes: one that a table does not name is no node of its graph, for it
    would change the scores of all others.

    Attributes:
        graphs: one a table, in the order given; their labels are of one type.
        labels: every id of any of them once, in ascending order, shape (n,).
        places: for each graph the number in ``labels`` of every node, ascending, shape
            (graph.n,).
        nodes: for each graph the node of every id in ``labels``, -1 for none, shape (n,).
    """

    graphs: tuple[Graph, ...]
    labels: pa.Array
    places: tuple[Ints, ...]
    nodes: tuple[Ints, ...]


def load_together(tables: list[Paths], options: LoadOptions, watch: Watch) -> Together:
    """See :func:`kingpost.core.ingest.load_together`."""
    if len(tables) < 2:
        raise InputError("name two tables at least; one alone is loaded by load")
    opened = [open_parts(paths, options, watch) for paths in tables]
    # Chosen over all tables, so that ids of several types meet in one that holds them all.
    roles = choose([part for parts in opened for part in parts], options)
    graphs = tuple(build_graph(parts, options, watch, roles) for parts in opened)
    every = pc.unique(pa.chunked_array([graph.labels for graph in graphs], graphs[0].labels.type))
    labels = every.take(pc.array_sort_indices(every))
    places, nodes = [], []
    for graph in graphs:
        watch.check()
        at = pc.index_in(graph.labels, value_set=labels).to_numpy(zero_copy_only=False)
        place = np.asarray(at, dtype=np.int64)
        back = np.full(len(labels), -1, dtype=np.int64)
        back[place] = np.arange(graph.n)
        places.append(place)
        nodes.append(back)
    return Together(graphs, labels, tuple(places), tuple(nodes))
