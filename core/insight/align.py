"""Two graphs on one numbering of ids."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError
from kingpost.core.graph import Graph
from kingpost.core.text import visible

Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Alignment:
    """Every id of either graph, those of the first in its own order, then what only the second has.

    ``before`` and ``after`` hold, for each id, its node number in either graph, -1 for none;
    ``at_before`` and ``at_after`` the other way round: the place of every node.
    """

    labels: pa.Array
    before: Ints
    after: Ints
    at_before: Ints
    at_after: Ints


def align(before: Graph, after: Graph) -> Alignment:
    """Put the nodes of two graphs on one numbering, by their ids.

    Raises:
        InputError: if the ids are of kinds that cannot be compared.
    """
    first, second = _comparable(before, after)
    found = pc.index_in(second, first)
    at = np.asarray(pc.fill_null(found, -1).to_numpy(zero_copy_only=False), dtype=np.int64)
    fresh = np.flatnonzero(at < 0)
    n = len(first)
    at[fresh] = n + np.arange(len(fresh))
    labels = pa.concat_arrays([first, second.take(pa.array(fresh))])
    size = n + len(fresh)
    back = np.full(size, -1, np.int64)
    back[:n] = np.arange(n)
    forth = np.full(size, -1, np.int64)
    forth[at] = np.arange(len(second))
    return Alignment(labels, back, forth, np.arange(n), at)


def _comparable(before: Graph, after: Graph) -> tuple[pa.Array, pa.Array]:
    first, second = before.labels, after.labels
    if first.type == second.type:
        return first, second
    for kinds, common in (
        ((pa.types.is_integer,), pa.int64()),
        ((pa.types.is_string, pa.types.is_large_string), pa.large_string()),
        ((pa.types.is_binary, pa.types.is_large_binary), pa.large_binary()),
    ):
        if all(any(kind(side.type) for kind in kinds) for side in (first, second)):
            try:
                return pc.cast(first, common), pc.cast(second, common)
            except pa.ArrowInvalid:  # unsigned ids beyond int64
                break
    names = [visible(graph.origin.name, 60) for graph in (before, after)]
    raise InputError(
        f"the ids are {first.type} in {names[0]} and {second.type} in {names[1]}, so nodes cannot "
        "be told to be the same; write both tables with ids of one type"
    )
