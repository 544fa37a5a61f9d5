"""The vector work of Anderson mixing over the rows ``order[low:high]`` of a stage.

``f`` and ``g`` keep, for the last four sweeps, the change a sweep made and what it led to, by
position in the stage (position p is node ``order[base + p]``), shape (4, rows of the stage).
"""

from __future__ import annotations

from kingpost.core.kernels._compile import kernel


@kernel()
def record(order, base, low, high, x, factor, before, f, g, new, sums):  # type: ignore[no-untyped-def]
    """Keep the last sweep, times ``factor``, in slot ``new`` and add up what mixing needs.

    With d_k the difference of f[new] to the k-th sweep before it, ``sums`` (float64, 10)
    becomes d1.d1, d1.d2, d1.d3, d2.d2, d2.d3, d3.d3, d1.f, d2.f, d3.f and the sum of g[new].
    """
    one, two, three = (new + 3) & 3, (new + 2) & 3, (new + 1) & 3
    aa = ab = ac = bb = bc = cc = af = bf = cf = total = 0.0
    for k in range(low, high):
        at = k - base
        value = x[order[k]] * factor
        moved = value - before[at]
        f[new, at] = moved
        g[new, at] = value
        a = moved - f[one, at]
        b = moved - f[two, at]
        c = moved - f[three, at]
        aa += a * a
        ab += a * b
        ac += a * c
        bb += b * b
        bc += b * c
        cc += c * c
        af += a * moved
        bf += b * moved
        cf += c * moved
        total += value
    sums[0], sums[1], sums[2], sums[3], sums[4], sums[5] = aa, ab, ac, bb, bc, cc
    sums[6], sums[7], sums[8], sums[9] = af, bf, cf, total


@kernel()
def extrapolate(order, base, low, high, x, before, g, new, r, s, t, scale, z, lanes):  # type: ignore[no-untyped-def]
    """``x = g - r (g - g1) - s (g - g2) - t (g - g3)``, g the newest; z of every lane with it."""
    one, two, three = (new + 3) & 3, (new + 2) & 3, (new + 1) & 3
    plain = 1.0 - r - s - t
    for k in range(low, high):
        at = k - base
        i = order[k]
        value = plain * g[new, at] + r * g[one, at] + s * g[two, at] + t * g[three, at]
        x[i] = value
        before[at] = value
        given = value * scale[i]
        for lane in range(lanes):
            z[lane, i] = given


@kernel()
def multiply(order, low, high, factor, x, z, lanes):  # type: ignore[no-untyped-def]
    """Multiply x and z of every lane by ``factor`` over ``order[low:high]``."""
    for k in range(low, high):
        i = order[k]
        x[i] *= factor
        for lane in range(lanes):
            z[lane, i] *= factor
