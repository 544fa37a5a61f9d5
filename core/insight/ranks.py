"""How alike two rankings of the same nodes are: tau-b, Spearman, rank-biased overlap, top k.

All work on :class:`Ranks`, in which ties are classes; a node without a score that can be told
from zero is tied with the others of its kind.

References: Kendall, "Rank Correlation Methods", 1970 (tau-b); Knight, "A computer method for
calculating Kendall's tau with ungrouped data", J. Amer. Statist. Assoc. 61, 1966 (merge sort);
Webber, Moffat, Zobel, "A similarity measure for indefinite rankings", ACM TOIS 28, 2010
(rank-biased overlap; ties by their rule that tied items all occur at the first of their ranks).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats
from kingpost.core.result import Result
from kingpost.core.standing import TIED, UNRANKED
from kingpost.core.watch import Watch

Ints = NDArray[np.int64]
_PIECE = 1 << 22  # entries merged between two looks at the watch
_TAIL = 1e-18  # weight of the ranks that rank-biased overlap leaves out


@dataclass(frozen=True)
class Ranks:
    """A ranking with ties.

    Attributes:
        classes: class of each node, 0 the highest, shape (n,), int64; equal classes are ties.
        sizes: nodes in each class, shape (classes,).
    """

    classes: Ints
    sizes: Ints

    @property
    def n(self) -> int:
        """Number of nodes."""
        return len(self.classes)

    @cached_property
    def first(self) -> Ints:
        """First rank, from 1, of each node's class, shape (n,)."""
        starts = np.cumsum(self.sizes) - self.sizes + 1
        return starts[self.classes]

    @cached_property
    def mean(self) -> Floats:
        """Mean rank, from 1, of each node's class, shape (n,)."""
        starts = np.cumsum(self.sizes) - self.sizes
        middle = starts + (self.sizes + 1) / 2
        taken: Floats = middle[self.classes]
        return taken

    @cached_property
    def tied_pairs(self) -> int:
        """Number of pairs within the classes."""
        return int((self.sizes * (self.sizes - 1) // 2).sum())


def ranks_of(result: Result) -> Ranks:
    """The ranking of a result: proven ties, equal scores, and scores not told from zero, tied."""
    standing = result.standing
    scores = result.scores[standing.order]
    same = (standing.rail[:-1] == TIED) | (scores[:-1] == scores[1:])
    lost = standing.rail == UNRANKED
    same |= lost[:-1] & lost[1:]
    number = np.concatenate((np.zeros(min(1, len(scores)), np.int64), np.cumsum(~same)))
    classes = np.empty(len(scores), np.int64)
    classes[standing.order] = number
    return Ranks(classes, np.bincount(number))


def ranks_from_scores(scores: Floats) -> Ranks:
    """The ranking of bare scores, highest first, equal ones tied.

    Raises:
        SettingsError: if a score is NaN.
    """
    if np.isnan(scores).any():
        raise SettingsError("scores that are NaN have no rank")
    _, number, sizes = np.unique(-scores, return_inverse=True, return_counts=True)
    return Ranks(number.ravel().astype(np.int64), sizes.astype(np.int64))


def tau_b(a: Ranks, b: Ranks, watch: Watch | None = None) -> float:
    """Kendall's tau-b, O(n log n); NaN where one ranking is a single tie (or n < 2)."""
    watch = watch or Watch()
    n, width = a.n, len(b.sizes)
    pairs = n * (n - 1) // 2
    untied = math.sqrt(pairs - a.tied_pairs) * math.sqrt(pairs - b.tied_pairs)
    if untied == 0:
        return float("nan")
    keys = a.classes * width + b.classes
    keys.sort()
    watch.check()
    new = np.flatnonzero(np.concatenate(([True], keys[1:] != keys[:-1], [True])))
    sizes = np.diff(new)
    both = int((sizes * (sizes - 1) // 2).sum())
    discordant = inversions((keys % width).astype(np.uint32), watch)
    concordant = pairs - a.tied_pairs - b.tied_pairs + both - discordant
    return (concordant - discordant) / untied


def inversions(values: NDArray[np.uint32], watch: Watch | None = None) -> int:
    """Number of pairs i < j with ``values[i] > values[j]``; ``values`` is left in pieces."""
    from kingpost.core.kernels.ranks import RUN, merge_runs, sort_runs

    watch = watch or Watch()
    n, found = len(values), 0
    for low in range(0, n, _PIECE):
        watch.check()
        found += sort_runs(values, low, min(low + _PIECE, n))
    into, width = np.empty_like(values), RUN
    while width < n:
        step = max(_PIECE, 2 * width)
        for low in range(0, n, step):
            watch.check()
            found += merge_runs(values, into, width, low, min(low + step, n))
        values, into = into, values
        width *= 2
    return found


def spearman(a: Ranks, b: Ranks) -> float:
    """Spearman's rank correlation: Pearson's of the mean ranks; NaN where one is a single tie."""
    x, y = a.mean - (a.n + 1) / 2, b.mean - (b.n + 1) / 2
    size = math.sqrt(float(x @ x)) * math.sqrt(float(y @ y))
    return float(x @ y) / size if size > 0 else float("nan")


def agreement(first_a: Ints, first_b: Ints, depth: int) -> Floats:
    """Share of the two lists' first d entries that they have in common, d = 1..depth.

    ``first_a[i]`` is the rank of item i in list a, ties at the first of their ranks, anything
    beyond ``depth`` for an item that a does not hold.  With S and T the items of rank at most
    d, the share is ``2 |S and T| / (|S| + |T|)``.
    """

    def upto(ranks: Ints) -> Ints:
        counts = np.bincount(np.minimum(ranks, depth + 1), minlength=depth + 2)
        return np.cumsum(counts[1 : depth + 1])

    both = upto(np.maximum(first_a, first_b))
    share: Floats = 2.0 * both / (upto(first_a) + upto(first_b))
    return share


def rank_biased_overlap(a: Ranks, b: Ranks, p: float) -> float:
    """RBO of two complete rankings: ``(1 - p) sum p^(d - 1) A_d``, A_d the shared first d.

    Beyond n, where both hold every node, A is 1.  ``p`` in (0, 1) is the chance of reading on
    after each rank; :func:`rbo_weight` says how much the first d ranks count.

    Raises:
        SettingsError: for a p outside (0, 1).
    """
    check_p(p)
    if a.n == 0:
        return float("nan")
    depth = min(a.n, math.ceil(math.log(_TAIL) / math.log(p)))
    shares = agreement(a.first, b.first, depth)
    weights = (1 - p) * p ** np.arange(depth)
    return float(weights @ shares) + float(shares[-1]) * p**depth


def rbo_weight(p: float, depth: int) -> float:
    """Share of the weight on the first ``depth`` ranks (Webber et al., equation 21)."""
    check_p(p)
    powers = np.arange(1, depth)
    rest = math.log(1 / (1 - p)) - float((p**powers / powers).sum())
    return 1 - p ** (depth - 1) + (1 - p) / p * depth * rest


def check_p(p: float) -> None:
    """Refuse a p that is no probability of reading on.

    Raises:
        SettingsError: unless 0 < p < 1.
    """
    if not 0 < p < 1:
        raise SettingsError(f"p of rank-biased overlap is {p:g}; it takes a number between 0 and 1")


def top_overlap(a: Ranks, b: Ranks, k: int) -> float:
    """Share of the first ``k`` nodes that two rankings have in common; ties as in RBO."""
    k = min(k, a.n)
    return float(agreement(a.first, b.first, k)[-1]) if k else float("nan")
