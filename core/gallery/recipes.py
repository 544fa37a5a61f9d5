"""Large random graphs, edge by edge: every edge is a function of its index and the seed.

So a graph of 200 million edges can be written in chunks of any size, in memory for one chunk,
and always holds the same edges in the same order.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np

from kingpost.core.errors import SettingsError
from kingpost.core.gallery.chance import Counter, below, bits, scramble, uniform
from kingpost.core.gallery.edges import EdgeList, Floats, Ints

Part = tuple[Ints, Ints, Floats | None]

# Edges made at a time: small enough for the temporaries to stay in the processor's cache.
_BLOCK: Final = 1 << 15


@dataclass(frozen=True, slots=True)
class Recipe:
    """A graph not yet made: its size, and the function from edge indices to edges."""

    n: int
    edges: int
    make: Callable[[Counter], Part]
    weighted: bool = False
    directed: bool = True

    def part(self, start: int, stop: int) -> EdgeList:
        """Edges ``start`` to ``stop`` (not included); ``n`` is that of the whole graph."""
        count = max(0, min(stop, self.edges) - start)
        source, target = np.empty(count, np.int64), np.empty(count, np.int64)
        weight = np.empty(count) if self.weighted else None
        for first in range(0, count, _BLOCK):
            here = slice(first, min(first + _BLOCK, count))
            index = np.arange(start + here.start, start + here.stop, dtype=np.uint64)
            source[here], target[here], strength = self.make(index)
            if weight is not None and strength is not None:
                weight[here] = strength
        return EdgeList(self.n, source, target, weight, self.directed)

    def whole(self) -> EdgeList:
        """All edges at once."""
        return self.part(0, self.edges)

    def stream(self, chunk: int = 1 << 20) -> Iterator[EdgeList]:
        """The edges in order, ``chunk`` at a time; the chunk size changes nothing else."""
        if chunk < 1:
            raise SettingsError(f"a chunk must hold at least 1 edge, not {chunk}")
        for start in range(0, self.edges, chunk):
            yield self.part(start, start + chunk)


def _check(what: str, value: float, low: float, high: float = float("inf")) -> None:
    if not low <= value <= high:
        upper = "" if high == float("inf") else f" and at most {high:g}"
        raise SettingsError(f"{what} must be at least {low:g}{upper}, not {value:g}")


def _rmat(scale: int, edges: int, seed: int) -> Recipe:
    _check("scale", scale, 1, 40)
    _check("the number of edges", edges, 0)
    # Thresholds on 32 random bits: quadrants (0,0), (0,1), (1,0), (1,1) with 57, 19, 19, 5 %.
    a, ab, abc = (np.uint64(round(share * 2**32)) for share in (0.57, 0.76, 0.95))
    low, half, one = np.uint64(0xFFFFFFFF), np.uint64(32), np.uint64(1)

    def make(index: Counter) -> Part:
        source, target = np.zeros_like(index), np.zeros_like(index)
        for level in range(scale):
            if level % 2 == 0:
                drawn = bits(seed, 10 + level, index)
            lot = drawn & low if level % 2 == 0 else drawn >> half
            down = lot >= ab
            source <<= one
            source |= down
            target <<= one
            target |= ((lot >= a) ^ down) | (lot >= abc)
        return (
            scramble(source, scale).astype(np.int64),
            scramble(target, scale).astype(np.int64),
            None,
        )

    return Recipe(1 << scale, edges, make)


def _citation(
    n: int, edges: int, per_paper: int, errors: float, seed: int, copied: float
) -> Recipe:
    _check("the number of papers", n, 1)
    _check("references a paper", per_paper, 1)
    _check("the share of errors", errors, 0, 1)
    _check("the share of copied references", copied, 0, 1)
    slots = np.uint64(2 * per_paper + 1)

    def length(paper: Ints) -> Ints:
        # Papers 1 and 2, 3 and 4, ... share 2 * per_paper references between them, so that the
        # place of every reference list is known without adding up the lists before it.
        first = below(2 * per_paper + 1, seed, 1, ((paper + 1) // 2).astype(np.uint64))
        return np.where(paper == 0, 0, np.where(paper % 2 == 1, first, 2 * per_paper - first))

    def resolve(paper: Ints, slot: Ints) -> Ints:
        target = np.empty(len(paper), np.int64)
        open_ = np.arange(len(paper))
        while len(open_):
            counter = paper.astype(np.uint64) * slots + slot.astype(np.uint64)
            met = below(paper, seed, 2, counter)
            size = length(met)
            copies = (uniform(seed, 3, counter) < copied) & (size > 0)
            target[open_[~copies]] = met[~copies]
            slot = below(size, seed, 4, counter)[copies]
            paper, open_ = met[copies], open_[copies]
        return target

    def make(index: Counter) -> Part:
        place = index.astype(np.int64)
        pair, rest = np.divmod(place, 2 * per_paper)
        first = length(2 * pair + 1)
        second = rest >= first
        paper = 2 * pair + 1 + second
        target = resolve(paper, np.where(second, rest - first, rest))
        if errors > 0:
            wrong = (uniform(seed, 5, index) < errors) & (paper < n - 1)
            later = paper + 1 + below(n - 1 - paper, seed, 6, index)
            target = np.where(wrong, later, target)
        return paper, target, None

    return Recipe(n, edges, make)


def _layered(n: int, edges: int, layers: int, back: float, seed: int) -> Recipe:
    _check("the number of layers", layers, 2)
    _check("the number of services", n, 2 * layers)
    _check("the share of calls back", back, 0, 1)
    ends = np.linspace(0, n, layers + 1).astype(np.int64)

    def inside(layer: Ints, lot: Floats) -> Ints:
        # lot^3 crowds the low places of a layer: place x is met with density x^(-2/3).
        first: Ints = ends[layer]
        return first + np.floor(lot**3 * (ends[layer + 1] - first)).astype(np.int64)

    def make(index: Counter) -> Part:
        caller = below(int(ends[-2]), seed, 1, index)
        own = np.searchsorted(ends, caller, side="right") - 1
        skip = (uniform(seed, 2, index) < 0.2) & (own + 2 < layers)
        layer = np.where(skip, own + 2, own + 1)
        callee = inside(layer, uniform(seed, 3, index))
        turns = uniform(seed, 4, index) < back
        upper = below(own + 1, seed, 5, index)
        returned = inside(upper, uniform(seed, 6, index))
        source = np.where(turns, callee, caller)
        target = np.where(turns, returned, callee)
        calls = (1.0 - uniform(seed, 7, index)) ** (-1.0 / 1.2)
        return source, target, calls

    return Recipe(n, edges, make, weighted=True)


def _powerlaw(n: int, edges: int, gamma: float, seed: int) -> Recipe:
    _check("the number of nodes", n, 2)
    _check("gamma", gamma, 2.01, 20)
    power = 1.0 - 1.0 / (gamma - 1.0)
    reach = (n + 1.0) ** power - 1.0

    def node(lot: Floats) -> Ints:
        place: Ints = np.floor((1.0 + lot * reach) ** (1.0 / power)).astype(np.int64) - 1
        np.minimum(place, n - 1, out=place)
        return place

    def make(index: Counter) -> Part:
        one, other = node(uniform(seed, 1, index)), node(uniform(seed, 2, index))
        other = np.where(one == other, (other + 1) % n, other)
        return np.minimum(one, other), np.maximum(one, other), None

    return Recipe(n, edges, make, directed=False)


def _pairwise(n: int, outcomes: int, seed: int) -> Recipe:
    _check("the number of contestants", n, 2)

    def strength(who: Ints) -> Floats:
        counter = who.astype(np.uint64)
        lots = [uniform(seed, lane, counter) for lane in (1, 2, 3, 4)]
        return (sum(lots[1:], lots[0]) - 2.0) * 2.5  # nearly normal, standard deviation 1.44

    def make(index: Counter) -> Part:
        one = below(n, seed, 5, index)
        other = (one + 1 + below(n - 1, seed, 6, index)) % n
        gap = strength(one) - strength(other)
        wins = uniform(seed, 7, index) < 1.0 / (1.0 + np.exp(-gap))
        margin = 1.0 + np.floor(np.abs(gap) * uniform(seed, 8, index) * 2.0)
        return np.where(wins, other, one), np.where(wins, one, other), margin

    return Recipe(n, outcomes, make, weighted=True)


def rmat(scale: int, edges: int, *, seed: int = 0) -> EdgeList:
    """R-MAT: 2^scale nodes; each edge falls into a quadrant of the matrix, ``scale`` times over.

    Quadrant probabilities 0.57, 0.19, 0.19, 0.05; ids are scrambled.  Parallel edges, self-loops
    and nodes without edges occur.

    Source: Chakrabarti, Zhan, Faloutsos, "R-MAT: a recursive model for graph mining", SIAM SDM
    2004; the probabilities are those of the Graph 500 benchmark (both from memory).
    """
    return _rmat(scale, edges, seed).whole()


def citation(
    n: int, per_paper: int = 15, errors: float = 0.0, *, seed: int = 0, copied: float = 0.5
) -> EdgeList:
    """Copying model: paper t cites 0 to 2 * per_paper earlier ones, per_paper in the mean.

    Each reference meets a uniformly drawn earlier paper and, with probability ``copied``, takes
    one of that paper's references instead (if it has any).  A share ``errors`` of the edges is
    redirected to a uniformly drawn later paper; without errors the graph is acyclic and every
    edge points to a smaller number.  Paper 0 cites nothing, nor does the last if n is even.  A
    list may name a paper twice.

    Sources: Kleinberg, Kumar, Raghavan, Rajagopalan, Tomkins, "The Web as a graph", COCOON 1999;
    Kumar et al., "Stochastic models for the Web graph", FOCS 2000; resolving copies by
    recomputation instead of memory: Sanders and Schulz 2016 (all from memory).
    """
    edges = max(0, n - 1) // 2 * 2 * per_paper
    return _citation(n, edges, per_paper, errors, seed, copied).whole()


def layered_services(
    n: int, edges: int, *, layers: int = 8, back: float = 0.02, seed: int = 0
) -> EdgeList:
    """Calls from layer to layer, a fifth of them past one, weighted by calls a minute.

    Layers are equal ranges of ids.  Callers are uniform, callees crowd at the start of their
    layer (place x with density x^(-2/3)).  A share ``back`` starts at the callee instead and
    goes to the caller's layer or above it: those close cycles.  Weights are Pareto, exponent 1.2.
    Parallel edges may occur.  Common practice, no source.
    """
    return _layered(n, edges, layers, back, seed).whole()


def powerlaw_undirected(n: int, edges: int, *, gamma: float = 2.5, seed: int = 0) -> EdgeList:
    """Both ends drawn with probability in proportion to (i + 1)^(-1 / (gamma - 1)).

    Expected degrees follow a power law with exponent ``gamma``.  A drawn self-loop is moved to the
    next node; parallel edges may occur; node 0 has the highest expected degree.

    Source: Chung and Lu, "Connected components in random graphs with given expected degree
    sequences", 2002, with edges drawn with replacement (from memory).
    """
    return _powerlaw(n, edges, gamma, seed).whole()


def pairwise(outcomes: int, *, players: int | None = None, seed: int = 0) -> EdgeList:
    """Contests: an edge from the loser to the winner, weighted by the margin (1, 2, ...).

    Two different players are drawn uniformly; i beats j with probability
    1 / (1 + exp(s_j - s_i)), s a bell-shaped strength.  ``players`` defaults to outcomes / 20.

    Source: Bradley and Terry, "Rank analysis of incomplete block designs", 1952 (from memory).
    """
    return _pairwise(players or max(2, outcomes // 20), outcomes, seed).whole()


KINDS: Final = ("rmat", "citation", "layered", "powerlaw", "pairwise")


def recipe(
    kind: str, edges: int, *, seed: int = 0, nodes: int | None = None, errors: float = 0.0
) -> Recipe:
    """A large graph with exactly ``edges`` edges, of one of :data:`KINDS`.

    ``nodes`` defaults to about edges / 16 (rmat: the nearest power of two; other numbers are
    refused), edges / 15 (citation, where it follows from ``edges`` and cannot be set), edges / 20
    (layered, pairwise) or edges / 10 (powerlaw).  ``errors`` is for citation only.

    Raises:
        SettingsError: for an unknown kind or a size out of range.
    """
    _check("the number of edges", edges, 1)
    if errors and kind != "citation":
        raise SettingsError(f"forward-pointing errors belong to citation graphs, not to {kind}")
    if kind == "rmat":
        scale = max(1, round(np.log2(nodes or max(2, edges / 16))))
        if nodes is not None and nodes != 1 << scale:
            raise SettingsError(f"an rmat graph has a power of two of nodes, not {nodes:,}")
        return _rmat(scale, edges, seed)
    if kind == "citation":
        if nodes is not None:
            raise SettingsError("the papers of a citation graph follow from its edges: 15 each")
        return _citation(1 + 2 * -(-edges // 30), edges, 15, errors, seed, 0.5)
    if kind == "layered":
        return _layered(nodes or max(16, edges // 20), edges, 8, 0.02, seed)
    if kind == "powerlaw":
        return _powerlaw(nodes or max(2, edges // 10), edges, 2.5, seed)
    if kind == "pairwise":
        return _pairwise(nodes or max(2, edges // 20), edges, seed)
    raise SettingsError(f"no graph of kind {kind!r}: choose one of {', '.join(KINDS)}")


def stream(
    kind: str,
    edges: int,
    seed: int = 0,
    chunk: int = 1 << 20,
    *,
    nodes: int | None = None,
    errors: float = 0.0,
) -> Iterator[EdgeList]:
    """Chunks of a large graph in bounded memory; see :func:`recipe` and :meth:`Recipe.stream`."""
    return recipe(kind, edges, seed=seed, nodes=nodes, errors=errors).stream(chunk)
