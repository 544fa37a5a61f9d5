"""Compressed rows without some of their nodes and entries, in two passes over pieces of rows."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def count_kept(offsets, neighbours, low, high, kept, gone, at, lengths):  # type: ignore[no-untyped-def]
    """Entries left in the rows ``low..high``, into ``lengths``.

    ``kept`` marks the nodes that stay; ``gone`` are positions of entries to leave out, ascending,
    the first of them that can lie in these rows at ``at``.
    """
    one = np.uint64(1)
    for i in range(np.uint64(low), np.uint64(high)):
        left = 0
        if kept[i]:
            for e in range(np.uint64(offsets[i]), np.uint64(offsets[i + one])):
                while at < len(gone) and np.uint64(gone[at]) < e:
                    at += 1
                if at < len(gone) and np.uint64(gone[at]) == e:
                    continue
                if kept[neighbours[e]]:
                    left += 1
        lengths[i] = left


@kernel()
def copy_kept(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, low, high, kept, number, gone, at, starts, near, heavy
):
    """Write what :func:`count_kept` counted, under new numbers, from ``starts`` of each row on.

    ``number`` is the new number of every node; ``heavy`` takes the weights, where there are any.
    """
    one = np.uint64(1)
    for i in range(np.uint64(low), np.uint64(high)):
        if not kept[i]:
            continue
        place = np.uint64(starts[i])
        for e in range(np.uint64(offsets[i]), np.uint64(offsets[i + one])):
            while at < len(gone) and np.uint64(gone[at]) < e:
                at += 1
            if at < len(gone) and np.uint64(gone[at]) == e:
                continue
            v = neighbours[e]
            if kept[v]:
                near[place] = number[v]
                if weights is not None:
                    heavy[place] = weights[e]
                place += one
