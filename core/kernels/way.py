"""Breadth-first search that remembers how it came: loops only."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

UNSEEN = np.uint32(0xFFFFFFFF)


@kernel()
def step(offsets, neighbours, queue, head, tail, before, goal, budget):  # type: ignore[no-untyped-def]
    """Visit about ``budget`` edges from ``queue[head:tail]``; stop at ``goal``.

    ``before`` (uint32, n) holds the node each was first met from, :data:`UNSEEN` for the rest;
    every node of ``queue`` (uint32, n) is in it.  Returns the new head and tail; done when they
    are equal or ``before[goal]`` is set.
    """
    one = np.uint64(1)
    while head < tail and budget > 0:
        u = np.uint64(queue[head])
        head += 1
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        budget -= np.int64(end - e) + 1
        while e < end:
            v = np.uint64(neighbours[e])
            if before[v] == UNSEEN:
                before[v] = u
                if v == goal:
                    return head, tail
                queue[tail] = v
                tail += 1
            e += one
    return head, tail


@kernel()
def step_either(  # type: ignore[no-untyped-def]
    out_offsets, out_near, in_offsets, in_near, queue, head, tail, before, goal, budget
):
    """As :func:`step`, over edges in both directions, those along them first."""
    one = np.uint64(1)
    while head < tail and budget > 0:
        u = np.uint64(queue[head])
        head += 1
        for side in range(2):
            offsets = out_offsets if side == 0 else in_offsets
            near = out_near if side == 0 else in_near
            e = np.uint64(offsets[u])
            end = np.uint64(offsets[u + one])
            budget -= np.int64(end - e) + 1
            while e < end:
                v = np.uint64(near[e])
                if before[v] == UNSEEN:
                    before[v] = u
                    if v == goal:
                        return head, tail
                    queue[tail] = v
                    tail += 1
                e += one
    return head, tail
