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
def scatter(order, low, high, pool, stage, colour):  # type: ignore[no-untyped-def]
    """Colours that differ wherever pool, stage or the colour so far does."""
    for k in range(np.uint64(low), np.uint64(high)):
        j = np.uint64(order[k])
        place = mix(np.uint64(pool[j]) + np.uint64(stage) * np.uint64(0xD1B54A32D192ED03))
        colour[j] = mix(colour[j] + place + np.uint64(0x9E3779B97F4A7C15))


@kernel()
def _gift(colour, scale_bits):  # type: ignore[no-untyped-def]
    if scale_bits == np.uint64(0):
        return np.uint64(0)
    mixed = mix(colour ^ mix(scale_bits + np.uint64(0xD1B54A32D192ED03)))
    return mixed if mixed != np.uint64(0) else np.uint64(1)


@kernel()
def _refined(neighbours, weight_bits, start, end, colour, gift):  # type: ignore[no-untyped-def]
    total = np.uint64(0)
    while start < end:
        given = gift[neighbours[start]]
        if given != np.uint64(0):
            if weight_bits is not None:
                given = given ^ mix(weight_bits[start] + np.uint64(0x9E3779B97F4A7C15))
            total += mix(given)
        start += np.uint64(1)
    return mix(mix(colour) + total + np.uint64(0x632BE59BD9B4E019))


@kernel()
def gifts(order, low, high, colour, scale_bits, gift):  # type: ignore[no-untyped-def]
    """``gift[j]`` = hash of j's colour and scale: what j is to those it gives to; 0 for nothing."""
    for k in range(np.uint64(low), np.uint64(high)):
        j = np.uint64(order[k])
        gift[j] = _gift(colour[j], scale_bits[j])


@kernel()
def refine(offsets, neighbours, weight_bits, order, low, high, colour, gift, fresh):  # type: ignore[no-untyped-def]
    """``fresh[i]`` = hash of i's colour and the multiset of what its givers are and weigh.

    ``weight_bits`` are the weights' bit patterns (uint64), or None where every weight is 1.
    """
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        start, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        fresh[i] = _refined(neighbours, weight_bits, start, end, colour[i], gift)


@kernel()
def refine_once(offsets, neighbours, weight_bits, order, low, high, scale_bits, colour, gift):  # type: ignore[no-untyped-def]
    """As :func:`refine`, in place and in order: final where no row depends on a later one."""
    one = np.uint64(1)
    for k in range(np.uint64(low), np.uint64(high)):
        i = np.uint64(order[k])
        start, end = np.uint64(offsets[i]), np.uint64(offsets[i + one])
        colour[i] = _refined(neighbours, weight_bits, start, end, colour[i], gift)
        gift[i] = _gift(colour[i], scale_bits[i])
