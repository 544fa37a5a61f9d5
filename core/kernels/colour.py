"""One round of colour refinement over pull rows, by 64-bit hashing."""

from __future__ import annotations

import numpy as np

from kingpost.core.kernels._compile import kernel


@kernel()
def mix(value):  # type: ignore[no-untyped-def]
    """Spread the bits of a 64-bit number (finaliser of SplitMix64; Steele, Lea, Flood 2014)."""
    value = np.uint64(value)
    value = (value ^ (value >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    value = (value ^ (value >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return value ^ (value >> np.uint64(31))


@kernel()
def gifts(colour, scale_bits, gift):  # type: ignore[no-untyped-def]
    """``gift[j]`` = hash of j's colour and scale: what j is to those it gives to; 0 for nothing."""
    for j in range(np.uint64(len(colour))):
        if scale_bits[j] == np.uint64(0):
            gift[j] = np.uint64(0)
        else:
            mixed = mix(colour[j] ^ mix(scale_bits[j] + np.uint64(0xD1B54A32D192ED03)))
            gift[j] = mixed if mixed != np.uint64(0) else np.uint64(1)


@kernel()
def refine(offsets, neighbours, weight_bits, low, high, colour, gift, fresh):  # type: ignore[no-untyped-def]
    """``fresh[i]`` = hash of i's colour and the multiset of what its givers are and weigh.

    ``weight_bits`` are the weights' bit patterns (uint64), or None where every weight is 1.
    """
    one = np.uint64(1)
    for i in range(np.uint64(low), np.uint64(high)):
        total = np.uint64(0)
        e = np.uint64(offsets[i])
        end = np.uint64(offsets[i + one])
        while e < end:
            given = gift[neighbours[e]]
            if given != np.uint64(0):
                if weight_bits is not None:
                    given = given ^ mix(weight_bits[e] + np.uint64(0x9E3779B97F4A7C15))
                total += mix(given)
            e += one
        fresh[i] = mix(mix(colour[i]) + total + np.uint64(0x632BE59BD9B4E019))
