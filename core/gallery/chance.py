"""Random numbers by index: hashing a counter, so that no state runs from one edge to the next.

The hash is the finalizer of SplitMix64 (Steele, Lea, Flood, "Fast splittable pseudorandom number
generators", OOPSLA 2014; constants from memory) applied to ``key + counter * golden``; ``key``
mixes a seed with a lane, and every use of chance in a generator has a lane of its own.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

Counter = NDArray[np.uint64]

_MASK: Final = (1 << 64) - 1
_GOLDEN: Final = 0x9E3779B97F4A7C15
_FIRST: Final = 0xBF58476D1CE4E5B9
_SECOND: Final = 0x94D049BB133111EB


def _key(seed: int, lane: int) -> int:
    """A 64-bit key from seed and lane: the same finalizer on Python integers."""
    value = (seed * _GOLDEN + lane * 0xD1342543DE82EF95 + 1) & _MASK
    value = ((value ^ (value >> 30)) * _FIRST) & _MASK
    value = ((value ^ (value >> 27)) * _SECOND) & _MASK
    return value ^ (value >> 31)


def bits(seed: int, lane: int, counter: Counter) -> Counter:
    """64 random bits for every counter, shape of ``counter``."""
    value = counter * np.uint64(_GOLDEN)
    value += np.uint64(_key(seed, lane))
    value ^= value >> np.uint64(30)
    value *= np.uint64(_FIRST)
    value ^= value >> np.uint64(27)
    value *= np.uint64(_SECOND)
    value ^= value >> np.uint64(31)
    return value


def uniform(seed: int, lane: int, counter: Counter) -> NDArray[np.float64]:
    """A number in [0, 1) for every counter, 53 random bits each."""
    value = bits(seed, lane, counter)
    value >>= np.uint64(11)
    return value.astype(np.float64) * 2.0**-53


def below(
    limit: NDArray[np.int64] | int, seed: int, lane: int, counter: Counter
) -> NDArray[np.int64]:
    """An integer in 0..limit-1 for every counter; limits up to 2^53, one for all or one each."""
    return np.floor(uniform(seed, lane, counter) * limit).astype(np.int64)


def scramble(node: Counter, scale: int) -> Counter:
    """A fixed one-to-one renumbering of 0..2^scale-1, so that ids say nothing about degrees.

    Multiplying by an odd number and xoring with a right shift are both invertible modulo
    2^scale, hence so is their composition.
    """
    mask, shift = np.uint64((1 << scale) - 1), np.uint64(max(1, (scale + 1) // 2))
    for odd in (_FIRST | 1, _SECOND | 1):
        node = (node * np.uint64(odd)) & mask
        node = node ^ (node >> shift)
    return node
