"""Lanczos steps from one node, with what is needed to say how exact they were.

The vectors are kept and every new one is made orthogonal to all before it, twice; so few steps
are taken that this costs little more than the products.
"""

from __future__ import annotations

import math

import numpy as np

from kingpost.core.kernels._compile import kernel
from kingpost.core.kernels.series import blocked_sum

_BLOCK = 128


@kernel()
def dot(a, b):  # type: ignore[no-untyped-def]
    """Inner product: blocks of 128 plain additions, their sums compensated."""
    total = spill = part = 0.0
    for i in range(len(a)):
        part += a[i] * b[i]
        if i % _BLOCK == _BLOCK - 1 or i == len(a) - 1:
            grown = total + part
            if abs(total) >= abs(part):
                spill += (total - grown) + part
            else:
                spill += (part - grown) + total
            total = grown
            part = 0.0
    return total + spill


@kernel()
def begin(node, basis):  # type: ignore[no-untyped-def]
    """``basis[0] = e_node``; basis has shape (steps + 1, n)."""
    basis[0, :] = 0.0
    basis[0, node] = 1.0


@kernel()
def step(offsets, neighbours, weights, factor, j, floor, basis, image, alpha, beta, faults):  # type: ignore[no-untyped-def]
    """One step: ``image = factor A v_j``, and from it ``alpha[j]``, ``beta[j]``, ``v_(j+1)``.

    ``faults[j]`` becomes the norm, as computed, of
    ``image - beta[j-1] v_(j-1) - alpha[j] v_j - beta[j] v_(j+1)``.  A beta not above ``floor``
    is set to 0 and added to it: the vectors span an invariant space as nearly as can be told, and
    False is returned.
    """
    n = basis.shape[1]
    one = np.uint64(1)
    v = basis[j]
    for i in range(np.uint64(n)):
        image[i] = factor * blocked_sum(
            neighbours, weights, np.uint64(offsets[i]), np.uint64(offsets[i + one]), v
        )
    fresh = basis[j + 1]
    alpha[j] = dot(image, v)
    for i in range(n):
        fresh[i] = image[i] - alpha[j] * v[i]
        if j > 0:
            fresh[i] -= beta[j - 1] * basis[j - 1, i]
    for _ in range(2):
        for k in range(j + 1):
            part = dot(fresh, basis[k])
            for i in range(n):
                fresh[i] -= part * basis[k, i]
    size = math.sqrt(dot(fresh, fresh))
    going = size > floor
    beta[j] = size if going else 0.0
    for i in range(n):
        fresh[i] = fresh[i] / size if going else 0.0
    off = part = 0.0
    for i in range(n):
        gap = image[i] - alpha[j] * v[i] - beta[j] * fresh[i]
        if j > 0:
            gap -= beta[j - 1] * basis[j - 1, i]
        part += gap * gap
        if i % _BLOCK == _BLOCK - 1 or i == n - 1:
            off += part
            part = 0.0
    faults[j] = math.sqrt(off)
    return going


@kernel()
def defect(basis, count):  # type: ignore[no-untyped-def]
    """Frobenius norm, as computed, of ``V V^T - I`` over the first ``count`` rows."""
    total = 0.0
    for a in range(count):
        for b in range(a + 1):
            value = dot(basis[a], basis[b])
            if a == b:
                total += (value - 1.0) * (value - 1.0)
            else:
                total += 2.0 * value * value
    return math.sqrt(total)
