"""The eigen-decomposition of a small chain: which patterns fade, how fast, and how they swing.

With ``G = V diag(lambda) V^-1`` and ``p_0 = V c``, the walk is ``p_t = sum_k c_k lambda_k^t v_k``:
a mode of modulus below 1 fades by that factor a step, and one that is no positive number swings.
Where V is too badly conditioned (chains with Jordan blocks among them) only the eigenvalues are
told.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.graph import Floats, Flow, Graph

MODES = 12
_CONDITION = 1e8  # of the eigenvectors, above which their coefficients mean little


@dataclass(frozen=True, slots=True)
class Mode:
    """One eigenvalue of the chain.

    Attributes:
        real, imaginary, modulus: the eigenvalue.
        half_life: steps in which the mode fades by half, infinite for modulus 1, 0 for 0.
        period: steps of one swing, NaN for a mode that does not swing.
        weight: sum of the magnitudes of its part of the start; NaN where it has no meaning.
    """

    real: float
    imaginary: float
    modulus: float
    half_life: float
    period: float
    weight: float


def dense_chain(
    graph: Graph, flow: Flow, damping: float, jump: Floats, landing: Floats | None
) -> Floats:
    """The chain as a dense matrix: column j says where a walker at j goes, shape (n, n)."""
    n, push = graph.n, graph.push(flow)
    chain = np.zeros((n, n))
    for node in range(n):
        near, weights = push.row(node)
        total = float(weights.sum())
        if total > 0:
            chain[near, node] = damping * (weights / total)
        elif landing is not None:
            chain[:, node] = damping * landing
    chain += (1.0 - damping) * jump[:, None]
    return chain


def decompose(
    chain: Floats, start: Floats
) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.complex128] | None]:
    """Eigenvalues (largest modulus first), eigenvectors, and the start in terms of these.

    The last is None where the eigenvectors are too badly conditioned.
    """
    values, vectors = np.linalg.eig(chain)
    # Rounded, so that conjugates and equal moduli stand in the same order everywhere.
    order = np.lexsort((-values.imag, -values.real, -np.round(np.abs(values), 12)))
    found: Any = values[order].astype(np.complex128)
    matrix: Any = vectors[:, order].astype(np.complex128)
    if not np.linalg.cond(matrix) < _CONDITION:
        return found, matrix, None
    return found, matrix, np.linalg.solve(matrix, start.astype(np.complex128))


def modes_of(chain: Floats, start: Floats, limit: int = MODES) -> tuple[Mode, ...]:
    """The modes of a dense chain, largest modulus first."""
    values, vectors, parts = decompose(chain, start)
    rows = []
    for k, value in enumerate(values[:limit].tolist()):
        modulus = abs(value)
        weight = float("nan")
        if parts is not None:
            weight = float(np.abs(parts[k] * vectors[:, k]).sum())
        angle = abs(math.atan2(value.imag, value.real)) if modulus > 1e-12 else 0.0
        rows.append(
            Mode(
                value.real,
                value.imag,
                modulus,
                _half_life(modulus),
                2 * math.pi / angle if angle > 1e-9 else float("nan"),
                weight,
            )
        )
    return tuple(rows)


def _half_life(modulus: float) -> float:
    if modulus >= 1 - 1e-12:
        return float("inf")
    return math.log(0.5) / math.log(modulus) if modulus > 1e-300 else 0.0
