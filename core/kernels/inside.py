"""Edges inside a set of nodes, renumbered: loops only."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

OUTSIDE = np.uint32(0xFFFFFFFF)


@kernel()
def count_inside(offsets, neighbours, nodes, number, low, high, counts):  # type: ignore[no-untyped-def]
    """``counts[k]`` = neighbours of ``nodes[k]`` that have a number, for k in low..high - 1."""
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        u = np.uint64(nodes[k])
        found = 0
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        while e < end:
            if number[np.uint64(neighbours[e])] != OUTSIDE:
                found += 1
            e += one
        counts[k] = found


@kernel()
def copy_inside(  # type: ignore[no-untyped-def]
    offsets, neighbours, weights, nodes, number, low, high, starts, near, heavy
):
    """Write those neighbours' numbers, and weights, from ``starts[k]`` on."""
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        u = np.uint64(nodes[k])
        at = np.uint64(starts[k])
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        while e < end:
            found = number[np.uint64(neighbours[e])]
            if found != OUTSIDE:
                near[at] = found
                if weights is not None:
                    heavy[at] = weights[e]
                at += one
            e += one
