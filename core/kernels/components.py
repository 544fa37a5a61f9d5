"""Components of a directed graph by depth-first search, in pieces that can be interrupted."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel

UNSEEN = 0xFFFFFFFF


@kernel()
def backward_edges(offsets, neighbours, low, high):  # type: ignore[no-untyped-def]
    """Edges u -> v with v < u, with v > u, and with v == u, among rows ``low..high``."""
    down = 0
    up = 0
    one = np.uint64(1)
    for u in range(np.uint64(low), np.uint64(high)):
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        while e < end:
            v = np.uint64(neighbours[e])
            if v < u:
                down += 1
            elif v > u:
                up += 1
            e += one
    return down, up


@kernel()
def strong(offsets, neighbours, state, index, cursor, stack, path, budget):  # type: ignore[no-untyped-def]
    """Tarjan's strong components (1972), resumable: about ``budget`` edges a call.

    ``state`` (int64, 5) holds the next root, next index, stack height, path height and number
    of components found.  ``index`` (uint32, n) starts as UNSEEN and ends as the number of the
    node's component, counted down from n - 1: components close sinks first, so along an edge
    the number never falls.  ``cursor`` (int64, n), ``stack`` and ``path`` (uint32, n) are
    scratch.  Returns True when done.

    Until its component closes a node keeps its low-link in ``index``; open nodes are numbered
    from 0 and can never reach the closed ones' numbers (the space-saving variant of Pearce,
    "A space-efficient algorithm for finding strongly connected components", 2016).
    """
    n = len(index)
    root, counter, height, depth, found = state[0], state[1], state[2], state[3], state[4]
    left = budget
    while True:
        if depth == 0:
            while root < n and index[root] != 0xFFFFFFFF:
                root += 1
            if root == n:
                state[0] = root
                state[4] = found
                return True
            path[0] = root
            depth = 1
            index[root] = counter
            cursor[root] = -(offsets[root] + 1)
            counter += 1
        if left <= 0:
            state[0], state[1], state[2], state[3], state[4] = root, counter, height, depth, found
            return False
        v = np.int64(path[depth - 1])
        # A negative cursor marks a node that is still the root of its own subtree.
        at = cursor[v]
        leads = at < 0
        e = -at - 1 if leads else at - 1
        end = offsets[v + 1]
        low = index[v]
        descended = False
        while e < end:
            w = np.int64(neighbours[e])
            e += 1
            left -= 1
            seen = index[w]
            if seen == 0xFFFFFFFF:
                # Come back to the same edge afterwards, to take over the child's low-link.
                index[v] = low
                cursor[v] = -e if leads else e
                path[depth] = w
                depth += 1
                index[w] = counter
                cursor[w] = -(offsets[w] + 1)
                counter += 1
                descended = True
                break
            if seen < low:
                low = seen
                leads = False
        if descended:
            continue
        index[v] = low
        depth -= 1
        if leads:
            number = n - 1 - found
            found += 1
            counter -= 1
            while height > 0 and index[stack[height - 1]] >= low:
                height -= 1
                index[stack[height]] = number
                counter -= 1
            index[v] = number
        else:
            stack[height] = v
            height += 1


@kernel()
def group_order(group, starts, visit, order):  # type: ignore[no-untyped-def]
    """Fill ``order`` with the nodes group by group, inside in the order of ``visit`` (all nodes).

    ``starts`` (int64, groups) must hold where each group begins; it moves to where it ends.
    """
    for k in range(len(group)):
        v = np.uint64(visit[k])
        g = np.uint64(group[v])
        order[starts[g]] = v
        starts[g] += 1


@kernel()
def edges_inside(offsets, neighbours, group, low, high, counts):  # type: ignore[no-untyped-def]
    """Add to ``counts[g]`` the edges of rows ``low..high`` that stay inside group g."""
    one = np.uint64(1)
    for u in range(np.uint64(low), np.uint64(high)):
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        g = group[u]
        while e < end:
            if group[neighbours[e]] == g:
                counts[g] += 1
            e += one


@kernel()
def unite(offsets, neighbours, low, high, parent):  # type: ignore[no-untyped-def]
    """Union-find over the edges of rows ``low..high``; ``parent`` (uint32, n) by halving."""
    one = np.uint64(1)
    for u in range(np.uint64(low), np.uint64(high)):
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        a = np.uint64(u)
        while parent[a] != a:
            parent[a] = parent[parent[a]]
            a = np.uint64(parent[a])
        while e < end:
            b = np.uint64(neighbours[e])
            while parent[b] != b:
                parent[b] = parent[parent[b]]
                b = np.uint64(parent[b])
            if a < b:
                parent[b] = a
            elif b < a:
                parent[a] = b
                a = b
            e += one


@kernel()
def find_roots(parent):  # type: ignore[no-untyped-def]
    """Point every node straight at its root; the root is the lowest number of its set."""
    for v in range(np.uint64(len(parent))):
        a = np.uint64(v)
        while parent[a] != a:
            a = np.uint64(parent[a])
        parent[v] = a


@kernel()
def cycle_gcd(offsets, neighbours, group, root, level, queue):  # type: ignore[no-untyped-def]
    """Greatest common divisor of all cycle lengths of the strong component of ``root``.

    Breadth-first levels; every edge u -> v inside adds level(u) + 1 - level(v) (Denardo 1977).
    ``level`` (int64, n) must be -1 and ``queue`` (uint32) hold room for the component.
    """
    one = np.uint64(1)
    level[root] = 0
    queue[0] = root
    head, tail = 0, 1
    period = 0
    while head < tail:
        u = np.uint64(queue[head])
        head += 1
        e = np.uint64(offsets[u])
        end = np.uint64(offsets[u + one])
        while e < end:
            v = np.uint64(neighbours[e])
            e += one
            if group[v] != group[u]:
                continue
            if level[v] < 0:
                level[v] = level[u] + 1
                queue[tail] = v
                tail += 1
            else:
                a, b = period, abs(level[u] + 1 - level[v])
                while b:
                    a, b = b, a % b
                period = a
        if period == 1:
            return 1
    return period
