"""Leading eigenvalues of a large real matrix, each with a proven residual.

Matrices of up to :data:`DENSE` rows are written out and decomposed whole (LAPACK); larger ones are
given to implicitly restarted Arnoldi or Lanczos (ARPACK through scipy; Lehoucq, Sorensen, Yang
1998) from one fixed positive start vector.  Nothing is taken on trust: for every pair found, the
residual ``|B v - theta v| / |v|`` is computed again, its rounding included.

- Symmetric B: the k values found, multiplicities counted, lie within ``|R|_F / s`` of k
  eigenvalues of B, R holding the residuals and s the least singular value of the vectors (Kahan
  1967; Cao, Xie, Li, "A theorem of Kahan", Linear Algebra Appl. 249, 1996).
- Any other B: theta is an eigenvalue of a matrix that differs from B by no more than the residual
  (in the 2-norm).  How far the eigenvalue of B itself is, depends on its condition and is not
  claimed.

A Krylov method can miss values; only the whole decomposition has them all.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from kingpost.core.certify import UNIT
from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats
from kingpost.core.watch import Watch

DENSE = 400  # rows up to which a matrix is decomposed whole
_LARGE = 1_000_000  # edge visits of a product from which less accuracy must do
# ARPACK's own test, relative to each value, and restarts; residuals say what was reached.
_FINE = (1e-11, 200)
_COARSE = {True: (1e-7, 15), False: (1e-3, 15)}  # by whether the matrix is symmetric


class Matrix(Protocol):
    """A real square matrix known by its products."""

    @property
    def size(self) -> int:
        """Number of rows."""

    @property
    def symmetric(self) -> bool:
        """Whether it equals its transpose."""

    @property
    def visits(self) -> int:
        """Edge visits of one product."""

    def apply(self, x: Floats, watch: Watch) -> Floats:
        """``B x``, shape (size,).  Raises Interrupted if ``watch`` is cancelled on the way."""

    def rounding(self, x: Floats, watch: Watch) -> Floats:
        """The most any entry of ``apply(x)`` is off by, shape (size,)."""


@dataclass(frozen=True)
class Pairs:
    """Eigenvalues in falling order of modulus, and what is proven of them.

    Attributes:
        values: shape (k,), complex; conjugates stand together, the upper one first.
        residuals: ``|B v - theta v| / |v|`` at the most, rounding included, shape (k,).
        within: for a symmetric matrix, how far the values may be from eigenvalues of B; else None.
        complete: whether these are all the eigenvalues.
        wanted: how many were asked for; fewer may have settled.
        products: products with the matrix that it took.
    """

    values: NDArray[np.complex128]
    residuals: Floats
    within: float | None
    complete: bool
    wanted: int
    products: int


def leading_pairs(
    matrix: Matrix,
    count: int,
    watch: Watch,
    on_product: Callable[[int], None] | None = None,
    *,
    largest: bool = False,
) -> Pairs:
    """The ``count`` eigenvalues of largest modulus, or all of them where B is small.

    ``largest`` asks a symmetric matrix for the largest ones instead, whatever their modulus.
    Where the last one wanted is complex, its conjugate is given too.  ``on_product`` is told the
    number of products after each.

    Raises:
        Interrupted: if ``watch`` was cancelled.
        SettingsError: if a product leaves the range of double precision.
    """
    size, made = matrix.size, 0

    def product(x: Floats) -> Floats:
        nonlocal made
        watch.check()
        made += 1
        if on_product is not None:
            on_product(made)
        y = matrix.apply(np.ascontiguousarray(x.ravel(), dtype=np.float64), watch)
        if not np.isfinite(y).all():
            raise SettingsError(
                "products of the weights exceed 1e308, the most that double precision holds; read "
                "them by --weight-as log1p"
            )
        return y

    complete = size <= max(DENSE, count + 2)
    if size == 0:
        return Pairs(np.empty(0, complex), np.empty(0), None, True, count, 0)
    if complete:
        dense = np.column_stack([product(column) for column in np.eye(size)])
        watch.check()
        values, vectors = (
            np.linalg.eigh((dense + dense.T) / 2) if matrix.symmetric else np.linalg.eig(dense)
        )
    else:
        values, vectors = _krylov(matrix, product, count, largest)
    order = np.argsort(-values, kind="stable") if largest else _falling(values)
    if not complete and len(order) > count:
        half = np.imag(values[order[count - 1]]) > 0  # its conjugate stands behind it
        order = order[: count + 1] if half else order[:count]
    values, vectors = values[order], vectors[:, order]
    residuals = np.array(
        [_residual(matrix, complex(value), vectors[:, k], watch) for k, value in enumerate(values)]
    )
    within = _within(vectors.real, residuals) if matrix.symmetric else None
    return Pairs(values.astype(np.complex128), residuals, within, complete, count, made)


def _krylov(
    matrix: Matrix, product: Callable[[Floats], Floats], count: int, largest: bool
) -> tuple[Any, Any]:
    from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigs, eigsh

    size = matrix.size
    # Positive, so that no Perron vector is orthogonal to it, and irregular, so that no symmetry of
    # the graph confines the search to part of the space.
    start = np.random.default_rng(20).uniform(0.5, 1.5, size)
    k = min(count + 2, size - 2)
    tol, restarts = _FINE if matrix.visits < _LARGE else _COARSE[matrix.symmetric]
    operator = LinearOperator((size, size), matvec=product, dtype=np.float64)
    which = "LA" if largest else "LM"
    width = min(size - 1, max(2 * k + 4, 24))
    try:
        found: tuple[Any, Any] = (eigsh if matrix.symmetric else eigs)(
            operator, k=k, which=which, v0=start, ncv=width, maxiter=restarts, tol=tol
        )
    except ArpackNoConvergence as partial:
        found = partial.eigenvalues, partial.eigenvectors
    return found


def _falling(values: Any) -> NDArray[np.int64]:
    """Positions by modulus, moduli that differ by rounding alone by real part, then imaginary."""
    modulus = np.abs(values)
    top = float(modulus.max(initial=0.0)) or 1.0
    rounded = np.round(modulus / top, 10)
    return np.lexsort((-np.imag(values), -np.round(np.real(values) / top, 10), -rounded))


def _residual(matrix: Matrix, value: complex, vector: Any, watch: Watch) -> float:
    parts = [np.ascontiguousarray(vector.real)]
    if np.iscomplexobj(vector) and vector.imag.any():
        parts.append(np.ascontiguousarray(vector.imag))
    products = [matrix.apply(part, watch) for part in parts]
    off = sum((matrix.rounding(part, watch) for part in parts), np.zeros(matrix.size))
    image = products[0] + 1j * products[1] if len(parts) > 1 else products[0] + 0j
    gap = np.abs(image - value * vector) + off
    gap += 8 * UNIT * (np.abs(image) + abs(value) * np.abs(vector))
    room = 1 + (matrix.size / 4 + 16) * UNIT
    return float(np.linalg.norm(gap) / np.linalg.norm(vector)) * room**2


def _within(vectors: Floats, residuals: Floats) -> float | None:
    """Kahan's bound from the residuals; None where the vectors are not proven independent."""
    size, k = vectors.shape
    unit = vectors / np.linalg.norm(vectors, axis=0)
    defect = float(np.linalg.norm(unit.T @ unit - np.eye(k)))
    defect += 2 * k * (size + 8) * UNIT
    if not defect < 0.5:
        return None
    whole = float(np.linalg.norm(residuals)) / float(np.sqrt(1 - defect))
    return whole * (1 + 1e-12)
