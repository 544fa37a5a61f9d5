"""Graphs made to break bounds: near ties, limits, hubs, long chains, sums that lose their tails.

References are closed forms derived beside each test, or 60-digit solves (tests/support/exact.py).
"""

from __future__ import annotations

import exact
import mpmath
import numpy as np
import pytest
from exact import mpf
from graphs import build, from_arrays, of

from kingpost.core import gallery
from kingpost.core.graph import Graph
from kingpost.core.measures import measure
from kingpost.core.measures.base import finish
from kingpost.core.measures.eigenvector import EigenvectorSettings
from kingpost.core.measures.katz import KatzSettings
from kingpost.core.measures.radius import spectral_radius
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.result import Stop
from kingpost.core.standing import TIED
from kingpost.core.watch import Watch


def two_loops(first: float, second: float, bridge: float | None = None) -> Graph:
    """Nodes 0 and 1 with self-loops of these weights: rho of each is its weight."""
    edges = [(0, 0, first), (1, 1, second)]
    return build(2, edges + ([] if bridge is None else [(0, 1, bridge)]))


def two_cycles(first: float, second: float, bridge: bool) -> Graph:
    """Two cycles of three whose edges all weigh ``first`` and ``second``."""
    edges = [(i, (i + 1) % 3, first) for i in range(3)]
    edges += [(3 + i, 3 + (i + 1) % 3, second) for i in range(3)]
    return build(6, edges + ([(0, 3, 1.0)] if bridge else []))


ONE_UP = np.nextafter(2.0, 3.0)


@pytest.mark.parametrize("gap", [1e-3, 1e-8, 1e-12, 1e-14, 2.0**-51])
@pytest.mark.parametrize("make", [two_loops, two_cycles])
@pytest.mark.parametrize("bridged", [False, True])
@pytest.mark.parametrize("upper", ["first", "second"])
def test_nearly_tied_components(gap: float, make: object, bridged: bool, upper: str) -> None:
    """The truth, or words; never the vector of the wrong component."""
    radii = (2.0 * (1 + gap), 2.0) if upper == "first" else (2.0, 2.0 * (1 + gap))
    assert radii[0] != radii[1]
    if make is two_loops:
        graph = two_loops(*radii, 1.0 if bridged else None)
    else:
        graph = two_cycles(*radii, bridged)
    for flow in ("along", "against"):
        result = measure("eigenvector").rank(graph, EigenvectorSettings(flow=flow))
        truth = exact.eigenvector(graph, flow)
        assert truth is not None
        if result.refusal is None:
            exact.confirm(result, truth, informative=gap > 1e-9)
        else:
            assert gap < 1e-10, result.reason


@pytest.mark.parametrize("make", [two_loops, two_cycles])
def test_tied_components(make: object) -> None:
    apart = two_loops(2.0, 2.0) if make is two_loops else two_cycles(2.0, 2.0, False)
    refused = measure("eigenvector").rank(apart)
    assert refused.stop is Stop.REFUSED
    assert "tie" in refused.reason
    assert "--component" in refused.reason
    # Where one feeds the other, only the fed one has a vector: of x = (u, w), (A^T - 2) w = u_0
    # e_0 has no solution with u > 0.
    chain = two_loops(2.0, 2.0, 1.0) if make is two_loops else two_cycles(2.0, 2.0, True)
    for flow in ("along", "against"):
        truth = exact.eigenvector(chain, flow)
        assert truth is not None
        result = measure("eigenvector").rank(chain, EigenvectorSettings(flow=flow))
        exact.confirm(result, truth)
        assert (result.scores > 0).tolist() == [x > 0 for x in truth]


@pytest.mark.parametrize("sweeps", [1, 2, 5])
def test_few_sweeps_decide_no_tie(sweeps: int) -> None:
    # The first component, a lopsided path, has the larger radius but a slow bracket.
    rng = np.random.default_rng(5)
    edges = [(i, i + 1, float(w)) for i, w in enumerate(rng.uniform(1, 3, 11))]
    edges += [(v, u, w) for u, v, w in edges]
    edges += [(12 + u, 12 + v, 0.99 * w) for u, v, w in edges]
    graph = build(24, [*edges, (0, 12, 1.0)])
    result = measure("eigenvector").rank(graph, EigenvectorSettings(max_sweeps=sweeps))
    truth = exact.eigenvector(graph, "along")
    assert truth is not None
    assert result.stop is not Stop.REFUSED, result.reason
    exact.confirm(result, truth, informative=False)


def lossy(leaves: int, copies: int) -> Graph:
    """A hub with a self-loop of 1 whose many other givers each vanish when added to 1.

    rho = (1 + sqrt(1 + 4 k e)) / 2 with k leaves and e = weight in x weight out, 2^-53 (1 - tiny):
    each is lost in a plain sum that has reached 1.
    """
    e = 2.0**-53
    hub = np.arange(copies) * (leaves + 1)
    leaf = (hub[:, None] + 1 + np.arange(leaves)).ravel()
    owner = np.repeat(hub, leaves)
    source = np.concatenate((hub, leaf, owner))
    target = np.concatenate((hub, owner, leaf))
    weight = np.concatenate((np.ones(copies), np.full(len(leaf), e), np.ones(len(leaf))))
    return from_arrays(copies * (leaves + 1), source, target, weight)


@pytest.mark.parametrize("copies", [1, 2, 3])
def test_the_bracket_of_rho_survives_sums_that_lose_their_tails(copies: int) -> None:
    leaves = 20_000
    graph = lossy(leaves, copies)
    rho = (1 + mpmath.sqrt(1 + 4 * leaves * mpf(2) ** -53)) / 2
    for width in (1e-6, 1e-12):
        graph.structure.cache.clear()
        found = finish(spectral_radius(graph, width, Watch()))
        assert found is not None
        assert found.low <= rho <= found.high, (float(rho - found.low), float(found.high - rho))


def star_scores(edges: int) -> tuple[mpf, mpf]:
    return mpmath.sqrt(mpf(1) / 2), mpmath.sqrt(mpf(1) / (2 * edges))


@pytest.mark.parametrize("leaves", [3, 500, 4_000])
def test_undirected_stars_at_the_limit(leaves: int) -> None:
    """Closed forms: rho = sqrt(m); Katz centre (1 + m a) / (1 - m a^2), leaf (1 + a) / (...)."""
    graph = from_arrays(
        leaves + 1, np.zeros(leaves, np.int64), np.arange(1, leaves + 1), None, directed=False
    )
    centre, leaf = star_scores(leaves)
    result = measure("eigenvector").rank(graph)
    exact.confirm(result, [centre] + [leaf] * leaves)
    low, high = result.facts["rho"]
    assert low <= mpmath.sqrt(leaves) <= high
    result = measure("katz").rank(graph, KatzSettings(alpha_fraction=0.999))
    a = mpf(result.facts["alpha"])
    bottom = 1 - leaves * a * a
    exact.confirm(result, [(1 + leaves * a) / bottom] + [(1 + a) / bottom] * leaves)
    assert (result.standing.rail[1:-1] == TIED).all()
    # Surfer on the star: c = ((1-d)/n)(1 + d m)/(1 - d^2), leaf (1-d)/n + d c/m.
    for damping in (0.85, 0.999):
        d, n = mpf(damping), leaves + 1
        c = ((1 - d) / n) * (1 + d * leaves) / (1 - d * d)
        result = measure("surfer").rank(graph, SurferSettings(damping=damping))
        exact.confirm(result, [c] + [(1 - d) / n + d * c / leaves] * leaves)
    # d = 1: degrees over 2 m, although the walk is periodic.
    result = measure("surfer").rank(graph, SurferSettings(damping=1.0))
    exact.confirm(result, [mpf(1) / 2] + [mpf(1) / (2 * leaves)] * leaves)


def hub_truth(edges: int, damping: float, alpha: float) -> tuple[list, list]:
    """The gallery's hub: leaves 1..m point at 0, 0 points at 1; three kinds of nodes."""
    n, d, a = edges + 1, mpf(damping), mpf(alpha)
    base = (1 - d) / n
    # x0 = base + d ((m - 1) base + x1), x1 = base + d x0
    x0 = (base + d * (edges - 1) * base + d * base) / (1 - d * d)
    k0 = (1 + a * (edges - 1) + a) / (1 - a * a)
    surf = [x0, base + d * x0] + [base] * (edges - 1)
    return surf, [k0, 1 + a * k0] + [mpf(1)] * (edges - 1)


@pytest.mark.parametrize("edges", [1, 2, 10_000])
def test_a_hub(edges: int) -> None:
    graph = of(gallery.hub(edges))
    surf, walks = hub_truth(edges, 0.999, 0.999)
    exact.confirm(measure("surfer").rank(graph, SurferSettings(damping=0.999)), surf)
    exact.confirm(measure("katz").rank(graph, KatzSettings(alpha=0.999)), walks)
    # The component {0, 1} is a cycle of two: rho = 1, both alike, leaves exactly zero.
    half = mpmath.sqrt(mpf(1) / 2)
    result = measure("eigenvector").rank(graph)
    exact.confirm(result, [half, half] + [mpf(0)] * (edges - 1))
    assert result.facts["period"] == 2


def test_a_hub_of_a_million_edges() -> None:
    edges = 1_000_000
    graph = of(gallery.hub(edges))
    for name, settings, truth in (
        ("surfer", SurferSettings(damping=0.999), hub_truth(edges, 0.999, 0.5)[0][:3]),
        ("katz", KatzSettings(alpha=0.5), hub_truth(edges, 0.999, 0.5)[1][:3]),
    ):
        result = measure(name).rank(graph, settings)
        assert result.stop in (Stop.CONVERGED, Stop.STALLED)
        assert (result.scores[2:] == result.scores[2]).all()
        low, high = result.bound.interval(result.scores)
        for node, value in enumerate(truth):
            assert mpf(float(low[node])) <= value <= mpf(float(high[node]))
        kinds = [1, 1, edges - 1]
        off = sum(
            k * abs(mpf(float(s)) - t)
            for k, s, t in zip(kinds, result.scores[:3], truth, strict=True)
        )
        whole = sum(k * mpf(float(s)) for k, s in zip(kinds, result.scores[:3], strict=True))
        assert off <= mpf(result.bound.value) * whole
        assert result.proven_order == graph.n  # 0, then 1, then a tie of all others


@pytest.mark.parametrize("backwards", [False, True])
def test_long_chains(backwards: bool) -> None:
    n = 10_000
    source, target = np.arange(n - 1), np.arange(1, n)
    graph = from_arrays(n, *((target, source) if backwards else (source, target)))
    flow = "against" if backwards else "along"
    # Katz at alpha = 1 counts the walks that end at a node: k + 1, whole numbers.
    result = measure("katz").rank(graph, KatzSettings(alpha=1.0, flow=flow))
    assert result.scores.tolist() == list(range(1, n + 1))
    exact.confirm(result, [mpf(k) for k in range(1, n + 1)])
    assert result.edge_visits <= 1.2 * graph.stored
    assert result.proven_order == n
    # Surfer: x_k in proportion to (1 - d^(k+1)) / (1 - d).
    d = mpf(0.999)
    powers = [mpf(1)]
    for _ in range(n):
        powers.append(powers[-1] * d)
    shape = [1 - p for p in powers[1:]]
    whole = sum(shape)
    result = measure("surfer").rank(graph, SurferSettings(damping=0.999, flow=flow))
    exact.confirm(result, [value / whole for value in shape])
    assert result.edge_visits <= 1.2 * graph.stored


def test_a_long_cycle_with_a_chord_near_the_limit() -> None:
    # One cycle of n and a shortcut past node 1: an ill-separated, barely aperiodic chain.
    n = 40
    graph = build(n, [(i, (i + 1) % n) for i in range(n)] + [(0, 2)])
    for damping in (0.999, 1 - 1e-6):
        result = measure("surfer").rank(graph, SurferSettings(damping=damping, tol=1e-9))
        exact.confirm(result, exact.surfer(graph, "along", damping))
    result = measure("katz").rank(graph, KatzSettings(alpha_fraction=0.999))
    exact.confirm(result, exact.katz(graph, "along", result.facts["alpha"]))
    truth = exact.eigenvector(graph, "along")
    assert truth is not None
    exact.confirm(measure("eigenvector").rank(graph), truth)


@pytest.mark.parametrize("fraction", [1 - 1e-6, 1 - 1e-9, 1 - 1e-11])
def test_katz_very_near_the_limit(fraction: float) -> None:
    rng = np.random.default_rng(3)
    pairs = {(int(u), int(v)) for u, v in rng.integers(0, 14, (60, 2))}
    graph = build(14, [(u, v, float(10 ** rng.uniform(-2, 2))) for u, v in sorted(pairs)])
    result = measure("katz").rank(graph, KatzSettings(alpha_fraction=fraction))
    exact.confirm(
        result, exact.katz(graph, "along", result.facts["alpha"]), informative=fraction < 1 - 1e-10
    )


@pytest.mark.parametrize("tol", [1e-10, 1e-16])
def test_cancelling_signs_on_an_acyclic_graph(tol: float) -> None:
    # 3 x 0.1 - 0.3 and a chain behind it: the sum is all rounding.
    graph = build(5, [(0, 2, 3.0), (1, 2, 1.0), (2, 3, 1e6), (3, 4, 7.0)])
    beta = np.array([0.1, -0.3, 0.0, 0.0, -1e-11])
    result = measure("katz").rank(graph, KatzSettings(alpha=1.0, beta=beta, tol=tol))
    exact.confirm(result, exact.katz(graph, "along", 1.0, beta))


def test_ties_are_not_claimed_for_teleports_that_differ_in_the_last_bit() -> None:
    # Nodes 0 and 1 differ only by one unit in the last place of where jumps land; 2 dangles.
    graph = build(4, [(0, 2), (1, 2), (3, 0), (3, 1)])
    teleport = np.array([0.1, np.nextafter(0.1, 1.0), 0.2, 0.3])
    teleport /= teleport.sum()
    assert teleport[0] != teleport[1]
    settings = SurferSettings(teleport=teleport, dangling="uniform")
    result = measure("surfer").rank(graph, settings)
    exact.confirm(result, exact.surfer(graph, "along", 0.85, teleport, np.ones(4)))


def test_ties_are_not_claimed_for_strengths_that_round_alike() -> None:
    # Nodes 0 and 1 give 0.25 each to 2 and 3, and 0.1 + 0.2 against 0.3 elsewhere: their sums
    # are equal as floats only.
    graph = build(6, [(0, 2, 0.25), (0, 4, 0.1), (0, 5, 0.2), (1, 3, 0.25), (1, 4, 0.3)])
    strengths = graph.outward.strengths()
    assert strengths[0] == strengths[1]
    result = measure("surfer").rank(graph)
    exact.confirm(result, exact.surfer(graph, "along", 0.85))
