"""Random numbers that stay the same for ever: only the raw 64-bit stream of PCG64 is used.

numpy promises that a bit generator's raw stream does not change between versions; it makes no
such promise for the distributions drawn from it, so the few that are needed are derived here.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


class Dice:
    """A seeded source of uniform, normal and weighted draws."""

    def __init__(self, seed: int) -> None:
        self._bits = np.random.PCG64(seed)

    def uniform(self, count: int) -> Floats:
        """``count`` numbers in [0, 1), 53 random bits each."""
        return (self._bits.random_raw(count) >> np.uint64(11)) * 2.0**-53

    def one(self) -> float:
        """One number in [0, 1)."""
        return float(self.uniform(1)[0])

    def between(self, low: int, high: int) -> int:
        """One integer in low..high, both included."""
        return low + int(self.one() * (high - low + 1))

    def normal(self, count: int) -> Floats:
        """Standard normal numbers by the Box-Muller transform."""
        radius = np.sqrt(-2.0 * np.log(1.0 - self.uniform(count)))
        return radius * np.cos(2.0 * np.pi * self.uniform(count))

    def lognormal(self, median: float, sigma: float, count: int) -> Floats:
        """Heavy-tailed positive numbers: ``median * exp(sigma * normal)``."""
        return median * np.exp(sigma * self.normal(count))

    def pick(self, weights: Floats, count: int) -> Ints:
        """``count`` positions drawn with replacement, in proportion to ``weights``."""
        edges = np.cumsum(weights)
        drawn = np.searchsorted(edges, self.uniform(count) * edges[-1], side="right")
        return np.minimum(drawn, len(edges) - 1)

    def sample(self, weights: Floats, count: int) -> Ints:
        """Up to ``count`` different positions, in proportion to ``weights`` (zero: never).

        Every position waits an exponential time with its weight as the rate; the first
        ``count`` to arrive are taken.
        """
        wait = -np.log(1.0 - self.uniform(len(weights)))
        keys = np.divide(wait, weights, out=np.full(len(weights), np.inf), where=weights > 0)
        order = np.argsort(keys, kind="stable")[:count]
        return order[np.isfinite(keys[order])]
