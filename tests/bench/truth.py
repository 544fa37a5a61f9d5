"""Reference solutions, by other code than Kingpost's: scipy products and refinement.

Linear measures are iterated in double precision until nothing moves, then corrected twice by
iterative refinement (Wilkinson, "Rounding Errors in Algebraic Processes", 1963): the residual in
80-bit extended precision, the correction in double.  What is stated as the error of the
reference is ``sum M^-1 |r|`` over the sum of the scores, which bounds it since M is an M-matrix.
Eigenvectors come from ARPACK, are polished by power steps until nothing moves, and their error
is estimated (not bounded) as the residual, in extended precision, over the gap to the next
eigenvalue.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
from clean import Edges, Floats, Spec, read
from scipy.sparse import csr_array

DAMPING = 0.85
SHARE = 0.85  # of 1/rho
_BLOCK = 2_000_000


def pull_matrix(edges: Edges) -> csr_array:
    """``A^T``, shape (n, n), float64."""
    source, target, weight = edges.both_ways()
    return csr_array((weight, (target, source)), shape=(edges.n, edges.n))


def walk_matrix(edges: Edges, damping: float = DAMPING) -> csr_array:
    """``damping P^T``: every column scaled by the out-strength of its node."""
    matrix = pull_matrix(edges)
    strength = np.asarray(matrix.sum(axis=0)).ravel()
    scale = np.divide(damping, strength, out=np.zeros(edges.n), where=strength > 0)
    matrix.data *= scale[matrix.indices]
    return matrix


def relative_l1(scores: Floats, truth: Floats) -> float:
    """L1 distance of two score vectors, each scaled to sum 1 (signs of eigenvectors set free)."""
    scores, truth = np.asarray(scores, dtype=np.float64), np.asarray(truth)
    total = scores.sum()
    if not np.isfinite(total) or total == 0:
        return float("inf")
    return float(np.abs(scores / total - truth / truth.sum()).sum())


def extended_product(matrix: csr_array, x: Floats) -> np.ndarray[Any, np.dtype[np.longdouble]]:
    """``matrix @ x`` with products and sums in extended precision."""
    out = np.zeros(matrix.shape[0], dtype=np.longdouble)
    offsets, low = matrix.indptr, 0
    while low < len(out):
        high = int(np.searchsorted(offsets, offsets[low] + _BLOCK, side="right")) - 1
        high = min(max(high, low + 1), len(out))
        part = slice(int(offsets[low]), int(offsets[high]))
        terms = matrix.data[part].astype(np.longdouble) * x[matrix.indices[part]]
        starts = offsets[low:high] - offsets[low]
        full = np.diff(offsets[low : high + 1]) > 0
        if full.any():
            out[low:high][full] = np.add.reduceat(terms, starts[full])
        low = high
    return out


def fixed_point(matrix: csr_array, b: Floats, accuracy: float, limit: int = 20_000) -> Floats:
    """``x = b + matrix x``, iterated until a step changes less than ``accuracy`` of it, or 0."""
    x, before, patience = b.copy(), np.inf, 0
    for _ in range(limit):
        after = matrix @ x + b
        moved = float(np.abs(after - x).sum()) / (float(np.abs(after).sum()) or 1.0)
        x = after
        patience = patience + 1 if moved >= before else 0
        before = min(before, moved)
        if moved <= accuracy or patience >= 20:
            break
    return x


def linear_truth(matrix: csr_array, b: Floats) -> tuple[Floats, float]:
    """The solution of ``x = b + matrix x`` and the relative L1 error it may still have."""
    x = fixed_point(matrix, b, 0.0)
    for turn in range(3):
        r = (b + extended_product(matrix, x)) - x
        if turn == 2:
            break
        x = (x + fixed_point(matrix, r.astype(np.float64), 1e-4).astype(np.longdouble)).astype(
            np.float64
        )
    reach = fixed_point(matrix, np.abs(r).astype(np.float64), 1e-3)
    return x, float(reach.sum() / np.abs(x).sum()) * 2.02  # 2: scaled to sum 1


def eigen_truth(matrix: csr_array, directed: bool) -> tuple[Floats, float, float]:
    """The dominant eigenvector (sum 1), its eigenvalue, and an estimate of its L1 error."""
    from scipy.sparse.linalg import eigs, eigsh

    solver = eigs if directed else eigsh
    start = np.ones(matrix.shape[0])
    values, vectors = solver(matrix, k=2, which="LM", v0=start, ncv=24, tol=1e-12, maxiter=2000)
    best = int(np.argmax(values.real))
    x = np.abs(vectors[:, best].real)
    rho, second = float(values[best].real), float(abs(values[1 - best]))
    best_moved, patience = np.inf, 0
    for _ in range(5000):
        after = matrix @ x + 0.05 * rho * x  # a shift, where a second eigenvalue is near -rho
        after /= after.sum()
        moved = float(np.abs(after - x).sum())
        x = after
        patience = patience + 1 if moved >= 0.9 * best_moved else 0
        best_moved = min(best_moved, moved)
        if patience >= 60:
            break
    product = extended_product(matrix, x)
    rho = float(product.sum() / x.astype(np.longdouble).sum())
    r = float(np.abs(product - np.longdouble(rho) * x).sum())
    return x, rho, r / max(rho - second, 1e-300)


def references(spec: Spec, folder: Path, measures: list[str]) -> dict[str, Any]:
    """Facts (rho, alpha, error of every reference); the vectors go to ``NAME.MEASURE.npy``."""
    place = folder / f"{spec.name}.truth.json"
    facts: dict[str, Any] = json.loads(place.read_text()) if place.exists() else {}
    if place.exists() and place.stat().st_mtime < Path(spec.path).stat().st_mtime:
        facts = {}
    edges = None
    for measure in ("eigenvector", "surfer", "katz"):
        wanted = measure in measures or (measure == "eigenvector" and "katz" in measures)
        if not wanted or measure in facts:
            continue
        edges = edges or read(spec.path, spec.n, spec.directed)
        if measure == "eigenvector":
            if spec.acyclic:
                facts[measure], facts["rho"] = None, 0.0
                continue
            x, facts["rho"], facts[measure] = eigen_truth(pull_matrix(edges), spec.directed)
        elif measure == "surfer":
            given = np.full(spec.n, (1 - DAMPING) / spec.n)
            x, facts[measure] = linear_truth(walk_matrix(edges), given)
        else:
            matrix = pull_matrix(edges)
            if spec.acyclic:  # any alpha is legal: one that keeps sums over walks moderate
                strength = np.asarray(matrix.sum(axis=1)).ravel()
                facts["alpha"] = float(f"{SHARE / strength[strength > 0].mean():.6g}")
            else:
                facts["alpha"] = float(f"{SHARE / facts['rho']:.12g}")
            x, facts[measure] = linear_truth(matrix * facts["alpha"], np.ones(spec.n))
        np.save(truth_path(folder, spec.name, measure), x)
        place.write_text(json.dumps(facts))
    return facts


def truth_path(folder: Path, name: str, measure: str) -> Path:
    """Where a reference vector lies."""
    return folder / f"{name}.{measure}.npy"
