"""The way from parts of a table to a Graph, step by step."""

from __future__ import annotations

import numpy as np
import pyarrow as pa

from kingpost.core.graph import Account, Graph, Origin
from kingpost.core.ingest.assemble import Ends, assemble
from kingpost.core.ingest.columns import Roles, choose
from kingpost.core.ingest.induced import induce
from kingpost.core.ingest.names import alike
from kingpost.core.ingest.nodes import join_nodes
from kingpost.core.ingest.numbering import number_ids
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part
from kingpost.core.ingest.room import require_room
from kingpost.core.ingest.rows import read_rows
from kingpost.core.ingest.where import Filter
from kingpost.core.text import visible
from kingpost.core.watch import Watch


def build_graph(
    parts: list[Part],
    options: LoadOptions,
    watch: Watch | None = None,
    roles: Roles | None = None,
) -> Graph:
    """Read, number and assemble; join node attributes last, when the ids are known.

    ``roles`` are the columns, where they were chosen over more parts than these.
    """
    watch = watch or Watch()
    roles = roles or choose(parts, options)
    chosen = None if options.where is None else Filter(options.where, parts)
    if options.memory == "check":
        require_room(parts, roles, watch, chosen, directed=options.directed)
    rows = read_rows(parts, roles, options.bad_rows, watch, chosen)
    # Arrow keeps what it has freed; what follows is to be built in that memory's stead.
    pa.default_memory_pool().release_unused()
    labels, source, target = number_ids((rows.source, rows.target), roles.id_type, watch)
    pa.default_memory_pool().release_unused()
    weights = None
    if rows.weights:
        weights = np.concatenate(rows.weights)
        rows.weights.clear()
    ends = Ends(source, target, weights)
    del source, target, weights
    joined, induced = None, None
    if options.node_where is not None:
        joined = join_nodes(options, labels, watch, parts)
        induced = induce(options.node_where, labels, ends, joined, watch)
        labels, joined = induced.labels, induced.joined
    built = assemble(ends, labels, options, watch)
    notes = [*roles.notes, *(note for part in parts for note in part.notes)]
    if len(built.outward.neighbours) == 0:
        notes.append(
            "no edge is left: every row was a dropped loop or weighs nothing"
            + (", or leads to a node that was left out" if induced is not None else "")
        )
    look_alike = alike(labels)
    if look_alike is not None:
        notes.append(look_alike)
    joined = joined or join_nodes(options, labels, watch, parts)
    watch.check()
    outside = induced.rows if induced is not None else 0
    account = Account(
        rows_read=rows.read,
        rows_kept=rows.kept - outside,
        skipped=dict(rows.skipped),
        examples={reason: tuple(lines) for reason, lines in rows.examples.items()},
        merged=built.merged,
        loops=built.loops,
        loops_dropped=built.loops_dropped,
        zero_weight=built.zero_weight,
        filtered=rows.filtered,
        filtered_null=rows.filtered_null,
        outside=outside,
        nodes_rows=joined.rows,
        nodes_joined=joined.joined,
        nodes_unknown=joined.unknown,
        nodes_missing=joined.missing,
        nodes_repeated=joined.repeated,
        nodes_filtered=induced.nodes if induced is not None else 0,
        nodes_filtered_null=induced.unknown if induced is not None else 0,
        notes=tuple(map(visible, [*notes, *joined.notes])),
    )
    origin = Origin(
        files=tuple(part.name for part in parts),
        source=roles.source,
        target=roles.target,
        weight=roles.weight,
        weight_as=options.weight_as,
        parallel=options.parallel,
        loops=options.loops,
        bad_rows=options.bad_rows,
        nodes_file=options.nodes,
        node_id=joined.column,
        where=options.where,
        node_where=options.node_where,
    )
    return Graph(
        labels=labels,
        outward=built.outward,
        inward=built.inward,
        directed=options.directed,
        attributes=joined.attributes,
        account=account,
        origin=origin,
    )
