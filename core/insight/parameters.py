"""From fitted coefficients to damping, alpha or rho, rounded where a rounder number fits alike."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from kingpost.core.insight.equations import Fit, Frame, combined, least_squares
from kingpost.core.measures.base import finish
from kingpost.core.measures.radius import spectral_radius

_DIGITS = (1, 2, 3, 4)


@dataclass(frozen=True, slots=True)
class Parameter:
    """A parameter: the value taken, the least-squares fit, and in words where it comes from."""

    value: float
    fitted: float
    words: str = ""


def parameters(frame: Frame, fit: Fit) -> dict[str, Parameter]:
    """The parameters of an equation, by name."""
    if fit.form == "surfer, landing on dangling":
        d = fit.theta[2] / (fit.theta[1] + fit.theta[2])
        near = round(d, 3)
        return {"damping": Parameter(near if abs(near - d) < 1e-4 else d, d)}
    if fit.form.startswith("surfer"):
        return {"damping": _rounded(frame, fit)}
    if fit.form.startswith("katz"):
        return {"alpha": _alpha(frame, fit)}
    if fit.form == "eigenvector":
        rho = 1.0 / fit.theta[0]
        return {"rho": Parameter(rho, rho)}
    if fit.form == "authorities":
        sigma = float(np.sqrt(1.0 / fit.theta[0]))
        return {"sigma": Parameter(sigma, sigma)}
    return {}


def _rounded(frame: Frame, fit: Fit) -> Parameter:
    """The roundest value that fits as well, or is as near as a loose solution allows to tell."""
    fitted = fit.theta[0]
    left = _left_at(frame, fit)
    limit = max(2.0 * left(fitted), 1e-10)
    near = min(20 * fit.unexplained, 5e-4) * fitted
    for digits in _DIGITS:
        value = round(fitted, digits)
        off = abs(value - fitted)
        if value > 0 and (off <= near or (off <= 0.05 * fitted and left(value) <= limit)):
            return Parameter(value, fitted)
    return Parameter(fitted, fitted)


def _left_at(frame: Frame, fit: Fit) -> Callable[[float], float]:
    """A function: what a value of the first coefficient leaves unexplained, the others refitted."""
    rows = frame.near
    first, *columns = (column[rows] for column in frame.columns(fit.form))
    target = frame.x[rows]
    spread = target - target.mean()
    size = float(np.sqrt(spread @ spread))

    def left(value: float) -> float:
        rest = target - value * first
        theta = least_squares(columns, rest) or [0.0] * len(columns)
        r = rest - combined(theta, columns)
        return float(np.sqrt(r @ r)) / size

    return left


def _alpha(frame: Frame, fit: Fit) -> Parameter:
    """alpha as a round number, by the largest degree, or as a share of 1/rho."""
    fitted = fit.theta[0]
    tolerance = max(1e-6, min(1e-3, 10 * fit.unexplained))
    graph = frame.graph
    for words, degrees in (
        ("out-degree", graph.outward.degrees),
        ("in-degree", graph.inward.degrees),
    ):
        value = 1.0 / (int(degrees.max(initial=0)) + 1)
        if abs(value / fitted - 1) <= tolerance:
            return Parameter(value, fitted, f"1 / (largest {words} + 1)")
    if fit.steps == 0:
        found = _rounded(frame, fit)
        if found.value != fitted:
            return found
    elif abs(round(fitted, 4) / fitted - 1) <= tolerance:
        return Parameter(round(fitted, 4), fitted)
    radius = finish(spectral_radius(graph, 1e-9, frame.watch))
    if radius is not None and radius.high > 0:
        share = fitted * radius.high
        near = round(share, 3)
        if 0 < near < 1 and abs(share / near - 1) <= tolerance:
            return Parameter(near / radius.high, fitted, f"{near:g}/rho")
    return Parameter(fitted, fitted)
