"""Graphs from what is in memory already: pairs, a networkx graph, a scipy matrix.

Unlike a table of edges these know nodes without edges; they are kept.

    >>> import networkx as nx
    >>> from kingpost.core import from_networkx, from_scipy
    >>> graph = from_networkx(nx.karate_club_graph(), weight=None)
    >>> graph.n, graph.m, graph.directed, graph.weighted
    (34, 78, False, False)
    >>> from scipy.sparse import csr_array
    >>> graph = from_scipy(csr_array([[0, 2], [0, 0]]), labels=["caller", "callee"])
    >>> graph.rank("degree").top(1).to_pylist()[0]["node"]
    'callee'
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from kingpost.core.errors import InputError, RowsError
from kingpost.core.graph import Account, Graph, Origin
from kingpost.core.ingest.assemble import Ends, assemble
from kingpost.core.ingest.dictionaries import MOST_NODES
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.text import count, id_text, visible
from kingpost.core.watch import Watch

Whole = NDArray[np.int64]


def from_edges(
    edges: Iterable[Sequence[Any]],
    *,
    directed: bool = True,
    name: str = "edges",
    watch: Watch | None = None,
) -> Graph:
    """A graph from (u, v) or (u, v, weight); repeated edges are summed.

    Ids are all text or all whole numbers; weights are positive strengths, 0 leaves an edge out.

    Raises:
        InputError: for edges of another length, or ids of several kinds.
        RowsError: for weights that are negative, NaN or infinite.
    """
    listed = [tuple(edge) for edge in edges]
    sizes = {len(edge) for edge in listed}
    if not sizes <= {2} and not sizes <= {3}:
        raise InputError("edges are (u, v), or all (u, v, weight)")
    ids = list(dict.fromkeys(end for edge in listed for end in edge[:2]))
    weights = [edge[2] for edge in listed] if sizes == {3} else None
    place = {label: i for i, label in enumerate(ids)}
    source = np.array([place[edge[0]] for edge in listed], dtype=np.int64)
    target = np.array([place[edge[1]] for edge in listed], dtype=np.int64)
    origin = Origin((name,), weight=None if weights is None else "weight")
    return _graph(_labels(ids), source, target, _numbers(weights), directed, origin, watch)


def from_networkx(
    graph: Any,
    *,
    weight: str | None = "weight",
    name: str | None = None,
    watch: Watch | None = None,
) -> Graph:
    """The same nodes and edges as a networkx graph of any of its four kinds.

    ``weight`` names the edge attribute that holds strengths: an edge without it weighs 1, and
    where no edge has it, or ``weight`` is None, every edge does.  Parallel edges are summed.
    Node attributes are not taken over.

    Raises:
        InputError: for node ids that are neither all text nor all whole numbers.
        RowsError: for weights that are no numbers, negative, NaN or infinite.
    """
    nodes = list(graph.nodes)
    place = {label: i for i, label in enumerate(nodes)}
    found = list(graph.edges(data=weight)) if weight is not None else list(graph.edges())
    source = np.array([place[edge[0]] for edge in found], dtype=np.int64)
    target = np.array([place[edge[1]] for edge in found], dtype=np.int64)
    weights = None
    if weight is not None and any(edge[-1] is not None for edge in found):
        weights = _numbers([1.0 if edge[-1] is None else edge[-1] for edge in found])
    origin = Origin(
        (name or str(graph.name) or "networkx graph",),
        weight=None if weights is None else weight,
    )
    labels = _labels(nodes)
    return _graph(labels, source, target, weights, bool(graph.is_directed()), origin, watch)


def from_scipy(
    matrix: Any,
    labels: Sequence[Any] | pa.Array | None = None,
    *,
    directed: bool = True,
    name: str = "matrix",
    watch: Watch | None = None,
) -> Graph:
    """A graph from a square sparse matrix or array: ``matrix[u, v]`` is the weight of u -> v.

    Args:
        matrix: of any scipy.sparse format, shape (n, n); entries stored twice are summed, zeros
            that are stored are left out and counted.
        labels: the id of every row, text or whole numbers; the row's number where None.
        directed: False takes a symmetric matrix as undirected edges.

    Raises:
        InputError: for a matrix that is not square (or not symmetric, if undirected), labels of
            another number, of several kinds, or not distinct.
        RowsError: for entries that are negative, NaN or infinite.
    """
    from scipy import sparse

    if not sparse.issparse(matrix):
        raise InputError("from_scipy takes a scipy.sparse matrix; wrap a dense one in csr_array")
    if len(matrix.shape) != 2 or matrix.shape[0] != matrix.shape[1]:
        raise InputError(f"the matrix has shape {matrix.shape}; an adjacency matrix is square")
    if np.iscomplexobj(matrix):
        raise InputError("the matrix is complex; weights are real numbers")
    n = matrix.shape[0]
    ids = pa.array(np.arange(n)) if labels is None else _labels(labels)
    if len(ids) != n:
        raise InputError(f"there are {count(len(ids), 'label')} for {count(n, 'row')}")
    if not directed:
        folded = matrix.tocsr()
        if abs(folded - folded.T).sum() != 0:
            raise InputError(
                "the matrix is not symmetric; leave directed=True, or give (A + A.T) if that is "
                "what is meant"
            )
        matrix = sparse.triu(folded)
    entries = matrix.tocoo()
    weights = entries.data.astype(np.float64)
    origin = Origin((name,), source="row", target="column", weight="entries")
    return _graph(
        ids, entries.row.astype(np.int64), entries.col.astype(np.int64), weights, directed, origin,
        watch,
    )  # fmt: skip


def _labels(ids: Any) -> pa.Array:
    """Ids as an Arrow array of text or whole numbers, distinct."""
    if isinstance(ids, pa.ChunkedArray):
        ids = ids.combine_chunks()
    if not isinstance(ids, pa.Array):
        values = [item.item() if isinstance(item, np.generic) else item for item in ids]
        kinds = {type(value) for value in values}
        if len(kinds) > 1 or not kinds <= {str, int, bytes}:
            names = ", ".join(sorted(kind.__name__ for kind in kinds))
            raise InputError(
                f"node ids are of type {names}; they are all text or all whole numbers: map them, "
                "for example with networkx.relabel_nodes(graph, str)"
            )
        try:
            ids = pa.array(values, None if values else pa.int64())
        except (pa.ArrowException, OverflowError, UnicodeEncodeError) as error:
            raise InputError(f"node ids cannot be stored: {error}") from None
    if ids.null_count:
        raise InputError(f"{count(ids.null_count, 'label')} are null; every node needs an id")
    if len(pc.unique(ids)) != len(ids):
        twice = pc.value_counts(ids)
        often = pc.index(pc.greater(twice.field("counts"), 1), True).as_py()
        who = visible(id_text(twice.field("values")[often].as_py()), 40)
        raise InputError(f"labels are not distinct, for example {who}")
    return ids


def _numbers(weights: list[Any] | None) -> NDArray[np.float64] | None:
    if weights is None:
        return None
    try:
        return np.array(weights, dtype=np.float64)
    except (TypeError, ValueError):
        raise RowsError("a weight is no number; name another attribute, or weight=None") from None


def _graph(
    ids: pa.Array,
    source: Whole,
    target: Whole,
    weights: NDArray[np.float64] | None,
    directed: bool,
    origin: Origin,
    watch: Watch | None,
) -> Graph:
    n = len(ids)
    if n > MOST_NODES:
        raise InputError(f"{n:,} nodes are more than can be numbered")
    order = pc.sort_indices(ids).to_numpy(zero_copy_only=False)
    place = np.empty(n, dtype=np.uint32)
    place[order] = np.arange(n, dtype=np.uint32)
    if weights is not None:
        bad = ~(np.isfinite(weights) & (weights >= 0))
        if bad.any():
            row = int(np.flatnonzero(bad)[0])
            ends = [visible(id_text(ids[int(end[row])].as_py()), 40) for end in (source, target)]
            raise RowsError(
                f"{count(int(bad.sum()), 'weight')} {'is' if bad.sum() == 1 else 'are'} negative, "
                f"NaN or infinite, for example {weights[row]:g} on {ends[0]} -> {ends[1]}; weights "
                "are strengths from 0"
            )
    rows = len(source)
    labels = ids.take(pa.array(order))
    own = None if weights is None else weights.copy()  # its memory is written over
    numbered = Ends(place[source], place[target], own)
    built = assemble(numbered, labels, LoadOptions(directed=directed), watch or Watch())
    account = Account(
        rows_read=rows,
        rows_kept=rows,
        merged=built.merged,
        loops=built.loops,
        zero_weight=built.zero_weight,
    )
    return Graph(
        labels=labels,
        outward=built.outward,
        inward=built.inward,
        directed=directed,
        account=account,
        origin=origin,
    )
