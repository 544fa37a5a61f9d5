"""Componentwise bounds for a Perron vector, by holding one node fixed.

For ``B x = rho x`` with B irreducible on a component D, fix ``x_p = y_p`` at a node p of D.  The
other scores of D, and of what D feeds, then solve ``(rho I - B_p) x = B[:, p] y_p``, whose matrix
is an M-matrix: B_p has spectral radius below rho.  A guard w with ``(low I - B_p) w > 0``, low the
lower end of a bracket of rho, therefore bounds every error by ``c w`` with
``c = max |r| / ((low I - B_p) w)``.

Reference: Berman and Plemmons, "Nonnegative Matrices in the Mathematical Sciences", 1979,
ch. 6 (M-matrices: characterisation by a positive vector).
"""

from __future__ import annotations

from collections.abc import Generator

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.graph import Floats, Flow
from kingpost.core.operators import Pull
from kingpost.core.result import Iteration
from kingpost.core.solvers.guard import Guard, find_guard
from kingpost.core.structure import Structure
from kingpost.core.watch import Watch


def pinned_guard(
    matrix: Pull,
    structure: Structure,
    flow: Flow,
    y: Floats,
    pin: int,
    low: float,
    *,
    max_sweeps: int,
    watch: Watch,
    g: Floats | None = None,
    left: Floats | None = None,
) -> Generator[Iteration, None, Guard | None]:
    """A guard of ``I - B_p / low`` on the support of y (zero outside that of B's vector).

    In proportion to y where that can be had: it bounds all scores equally well, relative to
    their size.  Where scores span too many decades for it, flatter ones are tried.  ``g`` asks
    for another proportion (shape (n,)).  ``left`` is a left vector of B, zero outside D: the
    nearer it is to an eigenvector, the sooner a guard is found.
    """
    scale = np.where(y > 0, matrix.scale / low, 0.0)
    scale[pin] = 0.0
    shapes = (y, np.sqrt(np.maximum(y, 0.0)), np.ones(len(y))) if g is None else (g,)
    for shape in shapes:
        wanted = np.where(y > 0, shape, 0.0)
        guard = yield from find_guard(
            Pull(matrix.rows, scale), structure, flow, wanted,
            max_sweeps=max_sweeps, watch=watch, ignore=pin, start=_near(wanted, y, pin, left),
        )  # fmt: skip
        if guard is not None or watch.cancelled:
            return guard
    return None


def _near(g: Floats, y: Floats, pin: int, left: Floats | None) -> Floats | None:
    """A vector near the w of ``(I - B_p / rho) w = g``: mostly y, in the right amount.

    Multiplied by a left eigenvector l the equation reads ``sum of l_i g_i over i not p =
    l_p (B w)_p / rho``, which is ``c l_p y_p`` for ``w = c y``.
    """
    if left is None or not left[pin] > 0:
        return None
    whole = float((left * g).sum()) - float(left[pin] * g[pin])
    near = whole / float(left[pin] * y[pin]) * y
    return near if np.isfinite(near).all() else None


def perron_reach(product: Floats, size: Floats, y: Floats, rho: tuple[float, float]) -> Floats:
    """The most ``|(B y)_i / rho - y_i|`` can be for any rho of the bracket; shape (n,).

    ``product`` is B y by compensated sums, ``size`` ``|B| |y|``.
    """
    low, high = rho
    middle = 0.5 * (low + high)
    gap = np.abs(product - middle * y) + 0.5 * (high - low) * np.abs(y)
    reach: Floats = (gap + UNIT * (12 * size + 6 * middle * np.abs(y))) / low
    return reach


def normalised_reach(y: Floats, reach: Floats, order: int) -> Floats:
    """Bounds of the errors of ``y / |y|`` from bounds of those of y; |.| is the norm of ``order``.

    With ``d = |reach|``: ``|y/N - x/X| <= reach/X + y |1/N - 1/X|`` and ``X >= N - d``.
    """
    norm = float(np.linalg.norm(y, order))
    spread = float(np.linalg.norm(reach, order)) * (1 + 1e-12)
    if not spread < norm:
        return np.full(len(y), np.inf)
    least = norm - spread
    bound: Floats = reach / least + np.abs(y) * (spread / (norm * least) + 8 * UNIT / norm)
    return bound


def support(structure: Structure, component: int, n: int) -> NDArray[np.bool_]:
    """Members of a component as a mask, shape (n,)."""
    inside = np.zeros(n, dtype=bool)
    inside[structure.members(component)] = True
    return inside
