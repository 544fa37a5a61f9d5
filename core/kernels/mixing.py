"""The vector work of Anderson mixing over the rows ``order[low:high]`` of a stage.

``f`` and ``g`` keep, for the last three sweeps, the change a sweep made and what it led to, by
position in the stage (position p is node ``order[low0 + p]``), shape (3, rows of the stage).
"""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def record(order, base, low, high, x, before, f, g, new, one, two):  # type: ignore[no-untyped-def]
    """Keep the last sweep in slot ``new`` and return the five inner products mixing needs.

    With ``d1 = f[new] - f[one]`` and ``d2 = f[new] - f[two]``: d1.d1, d1.d2, d2.d2, d1.f, d2.f,
    and the sum of g[new].
    """
    a = b = c = p = q = total = 0.0
    for k in range(low, high):
        at = k - base
        value = x[np.uint64(order[k])]
        moved = value - before[at]
        f[new, at] = moved
        g[new, at] = value
        d1 = moved - f[one, at]
        d2 = moved - f[two, at]
        a += d1 * d1
        b += d1 * d2
        c += d2 * d2
        p += d1 * moved
        q += d2 * moved
        total += value
    return a, b, c, p, q, total


@kernel()
def extrapolate(order, base, low, high, x, before, g, new, one, two, s, t, scale, z, lanes):  # type: ignore[no-untyped-def]
    """``x = g[new] - s (g[new] - g[one]) - t (g[new] - g[two])``, and z of every lane with it."""
    for k in range(low, high):
        at = k - base
        i = np.uint64(order[k])
        value = g[new, at] - s * (g[new, at] - g[one, at]) - t * (g[new, at] - g[two, at])
        x[i] = value
        before[at] = value
        given = value * scale[i]
        for lane in range(lanes):
            z[lane, i] = given
