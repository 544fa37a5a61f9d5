"""Spectra against numpy, mpmath, networkx and closed forms (Brouwer and Haemers 2012, ch. 1)."""

from __future__ import annotations

import mpmath
import networkx as nx
import numpy as np
import pytest
from graphs import build, classics, dense, from_arrays, from_networkx, graphs, of
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import gallery
from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.insight.rates import observed_rate
from kingpost.core.insight.spectrum import MEASURES, spectrum
from kingpost.core.measures import measure
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.result import Iteration
from kingpost.core.watch import Watch

FLOWS = st.sampled_from(["along", "against"])


def complexes(found):
    return np.array([complex(v.real, v.imaginary) for v in found.values])


def falling(values):
    values = np.asarray(values)
    return values[np.argsort(-np.abs(values), kind="stable")]


def google(graph, d, flow="along"):
    """The surfer's matrix written out from the edges."""
    a = dense(graph)
    a = a if flow == "along" else a.T
    n = graph.n
    out = a.sum(axis=1, keepdims=True)
    walk = np.where(out > 0, a / np.where(out > 0, out, 1), 1 / n)
    return (d * walk + (1 - d) / n).T


def exact_symmetric(graph):
    with mpmath.workdps(40):
        found = mpmath.eigsy(mpmath.matrix(dense(graph).tolist()), eigvals_only=True)
        return sorted(found, key=lambda x: -abs(x))


@settings(max_examples=40, deadline=None)
@given(graphs(most=8, directed=False))
def test_every_value_of_a_symmetric_matrix_lies_between_its_ends(graph):
    found = spectrum(graph, "eigenvector", count=graph.n)
    truth = sorted(exact_symmetric(graph))
    values = sorted(found.values, key=lambda v: v.real)
    assert len(values) + found.zeros == graph.n
    left = list(truth)
    if found.zeros:  # nodes on no cycle are isolated here: as many zeros more
        for _ in range(found.zeros):
            left.remove(min(left, key=abs))
    for value, right in zip(values, left, strict=True):
        assert mpmath.mpf(value.low) <= right <= mpmath.mpf(value.high)
    low, high = found.radius
    assert low <= abs(truth[-1]) * (1 + 1e-30)
    assert max(abs(x) for x in truth) <= mpmath.mpf(high)


@settings(max_examples=40, deadline=None)
@given(graphs(most=8, directed=True, weights=("plain", "tame")), FLOWS)
def test_residuals_bound_a_distance_to_singularity(graph, flow):
    """theta is an eigenvalue of B + E, |E| <= residual: so sigma_min(B - theta I) <= residual."""
    found = spectrum(graph, "eigenvector", measure("eigenvector").settings(flow=flow), count=8)
    matrix = dense(graph).T if flow == "along" else dense(graph)
    assert len(found.values) + found.zeros == graph.n
    for value in found.values:
        theta = complex(value.real, value.imaginary)
        least = np.linalg.svd(matrix - theta * np.eye(graph.n), compute_uv=False)[-1]
        assert least <= value.residual + 1e-13 * (1 + np.abs(matrix).sum())
    if found.values:
        rho = np.abs(np.linalg.eigvals(matrix)).max()
        assert found.radius[0] <= rho * (1 + 1e-6) + 1e-9
        assert rho <= found.radius[1] * (1 + 1e-6) + 1e-9


@settings(max_examples=40, deadline=None)
@given(graphs(most=7, weights=("plain", "tame")), FLOWS, st.sampled_from([0.3, 0.85, 1.0]))
def test_the_surfers_values_are_those_of_its_written_out_matrix(graph, flow, d):
    found = spectrum(graph, "surfer", SurferSettings(damping=d, flow=flow), count=7)
    matrix = google(graph, d, flow)
    for value in found.values:
        theta = complex(value.real, value.imaginary)
        least = np.linalg.svd(matrix - theta * np.eye(graph.n), compute_uv=False)[-1]
        assert least <= value.residual + 1e-14
    assert found.values[0].modulus == pytest.approx(1.0, abs=1e-6)
    second = falling(np.linalg.eigvals(matrix))[1:2]
    low, high = found.second
    for value in second:
        assert low - 1e-6 <= abs(value) <= high + 1e-6


def test_two_closed_classes_make_damping_itself_an_eigenvalue():
    """Haveliwala and Kamvar 2003."""
    graph = build(5, [(0, 1), (1, 0), (2, 3), (3, 2), (4, 2), (4, 3)])
    found = spectrum(graph, "surfer")
    assert found.second == (0.85, 0.85)
    assert found.values[1].modulus == pytest.approx(0.85, abs=1e-12)
    assert any("2 closed classes" in note for note in found.notes)
    hanging = build(6, [(0, 1), (1, 0), (2, 3), (3, 2), (4, 2), (4, 3), (4, 5)])
    assert spectrum(hanging, "surfer").second == (0.85, 0.85)
    joined = build(4, [(0, 1), (1, 0), (2, 0), (2, 3)])  # 3 dangles: one class
    assert spectrum(joined, "surfer").second[0] == 0.0


@pytest.mark.parametrize("name", ["karate", "les miserables", "florentine", "davis"])
def test_networkx_adjacency_spectrum(name):
    graph = classics()[name]
    other = {
        "karate": nx.karate_club_graph,
        "les miserables": nx.les_miserables_graph,
        "florentine": nx.florentine_families_graph,
        "davis": nx.davis_southern_women_graph,
    }[name]()
    weight = "weight" if name == "les miserables" else None
    right = falling(nx.adjacency_spectrum(other, weight=weight).real)
    found = spectrum(graph, "eigenvector", count=graph.n)
    assert found.complete
    np.testing.assert_allclose(np.sort([v.real for v in found.values]), np.sort(right), atol=1e-10)
    assert found.gap == pytest.approx(1 - abs(right[1]) / abs(right[0]), abs=1e-10)


def test_closed_forms():
    ring = of(gallery.cycle(5))  # directed: the five roots of unity
    found = spectrum(ring, "eigenvector", count=5)
    np.testing.assert_allclose(np.sort_complex(complexes(found) ** 5), np.ones(5), atol=1e-12)
    assert found.gap == pytest.approx(0.0, abs=1e-12)
    assert found.predicted.digit > 1e6
    assert any("period 5" in note for note in found.notes)
    clique = spectrum(of(gallery.complete(6)), "eigenvector", count=6)
    assert [round(v.real, 9) for v in clique.values] == [5, -1, -1, -1, -1, -1]
    assert clique.predicted.factor == pytest.approx(0.2)
    assert clique.predicted.digit == pytest.approx(1 / np.log10(5))
    plain = from_arrays(5, np.zeros(4, int), np.arange(1, 5), directed=False)
    star = spectrum(plain, "eigenvector", count=5)
    np.testing.assert_allclose([v.real for v in star.values], [2, -2, 0, 0, 0], atol=1e-12)
    halves = spectrum(build(7, [(u, v) for u in range(3) for v in range(3, 7)]), "hits", count=3)
    np.testing.assert_allclose([v.real for v in halves.values], [12**0.5, 0, 0], atol=1e-12)
    assert halves.about == "singular value"


def test_without_a_cycle_all_is_zero():
    found = spectrum(of(gallery.path(9)), "eigenvector")
    assert found.values == ()
    assert found.zeros == 9
    assert found.radius == (0.0, 0.0)
    assert found.gap is None
    assert "exactly 0" in found.notes[0]
    assert spectrum(build(0, []), "surfer").notes[0].startswith("the graph has no nodes")
    assert spectrum(build(3, []), "hits").radius == (0.0, 0.0)
    alone = spectrum(build(1, []), "surfer")
    assert [v.real for v in alone.values] == [1.0]
    assert alone.predicted is None


def grid(rows, columns):
    """Undirected; eigenvalues 2 cos(i pi/(rows + 1)) + 2 cos(j pi/(columns + 1))."""
    place = np.arange(rows * columns).reshape(rows, columns)
    source = np.concatenate((place[:, :-1].ravel(), place[:-1].ravel()))
    target = np.concatenate((place[:, 1:].ravel(), place[1:].ravel()))
    return from_arrays(rows * columns, source, target, directed=False)


def test_lanczos_on_a_grid_has_the_closed_form():
    rows, columns = 22, 31
    found = spectrum(grid(rows, columns), "eigenvector", count=6)
    assert not found.complete
    i = 2 * np.cos(np.arange(1, rows + 1) * np.pi / (rows + 1))
    j = 2 * np.cos(np.arange(1, columns + 1) * np.pi / (columns + 1))
    right = falling((i[:, None] + j).ravel())[:6]
    assert np.abs(np.abs(complexes(found)) - np.abs(right)).max() < 1e-9
    for value in found.values:
        assert any(value.low <= x <= value.high for x in right)
    assert found.gap == pytest.approx(0.0, abs=1e-9)  # bipartite: -rho is an eigenvalue


@pytest.mark.parametrize("name", ["eigenvector", "surfer", "hits"])
def test_arnoldi_against_numpy(name):
    other = nx.gnp_random_graph(410, 0.02, seed=5, directed=True)
    graph = from_networkx(other)
    found = spectrum(graph, name, count=4)
    assert not found.complete
    if name == "hits":
        right = np.linalg.svd(dense(graph), compute_uv=False)
    else:
        right = falling(
            np.linalg.eigvals(dense(graph).T if name != "surfer" else google(graph, 0.85))
        )
    np.testing.assert_allclose([v.modulus for v in found.values][:4], np.abs(right[:4]), rtol=1e-8)
    for value in found.values:
        assert value.residual < 1e-7 * found.values[0].modulus
    upper = [v.imaginary for v in found.values if v.imaginary]
    assert sum(upper) == pytest.approx(0.0, abs=1e-12)  # conjugates are kept together


def test_the_predicted_rate_is_that_of_power_iteration():
    graph = classics()["karate"]
    found = spectrum(graph, "eigenvector")
    a, x = dense(graph), np.arange(1.0, 35.0)  # not orthogonal to any vector of interest
    right = np.linalg.eigh(a)[1][:, -1]
    errors = []
    for _ in range(80):
        x = a @ x
        x /= np.linalg.norm(x)
        errors.append(np.linalg.norm(x - np.abs(right)))
    rate = (errors[60] / errors[40]) ** (1 / 20)
    assert found.predicted.factor == pytest.approx(rate, rel=0.02)
    surfer = spectrum(graph, "surfer")
    m, x = google(graph, 0.85), np.arange(1.0, 35.0) / 595
    moves = []
    for _ in range(40):
        y = m @ x
        moves.append(np.abs(y - x).sum())
        x = y
    assert surfer.predicted.factor == pytest.approx((moves[35] / moves[25]) ** 0.1, rel=0.02)


def test_observed_rates_are_read_off_the_log():
    def line(k, residual, part=""):
        return Iteration(k, residual, float("nan"), k, 0.0, part=part)

    halving = [line(k, 2.0**-k) for k in range(1, 21)]
    rate = observed_rate(halving)
    assert rate.factor == pytest.approx(0.5)
    assert (rate.first, rate.last) == (1, 20)
    assert rate.digit == pytest.approx(1 / np.log10(2))
    floor = [*halving, *(line(k, 2.0**-19) for k in range(21, 60))]
    assert observed_rate(floor).factor == pytest.approx(0.5)
    prepared = [line(k, 0.9**k, "spectral radius: bracket") for k in range(1, 40)]
    mixed = prepared + [line(40 + k, 0.25**k) for k in range(1, 9)]
    mixed += [line(49, 0.5, "certificate"), line(50, 1e-9, "certificate: certified")]
    assert observed_rate(mixed).factor == pytest.approx(0.25)
    assert observed_rate([line(1, 0.0)]) is None
    assert observed_rate([]) is None
    assert observed_rate(halving[:2]) is None


def test_a_solves_own_log_and_settings_are_used():
    graph = classics()["karate"]
    result = measure("katz").rank(graph, measure("katz").settings(alpha=0.05))
    found = spectrum(graph, "katz", result=result)
    assert found.matrix.startswith("alpha A")
    assert found.predicted.factor == pytest.approx(0.05 * 6.725697727631747, rel=1e-9)
    assert found.observed is not None
    assert found.observed.factor < found.predicted.factor  # Gauss-Seidel and mixing gain on it
    negative = measure("katz").rank(graph, measure("katz").settings(alpha=-0.05))
    assert spectrum(graph, "katz", result=negative).predicted.factor == pytest.approx(
        found.predicted.factor
    )
    hits = measure("hits").rank(graph)
    assert spectrum(graph, "hits", result=hits).radius == hits.facts["sigma"]


def test_refusals_and_cancelling():
    graph = classics()["karate"]
    with pytest.raises(SettingsError, match="degree iterates no matrix"):
        spectrum(graph, "degree")
    with pytest.raises(SettingsError, match="from 1"):
        spectrum(graph, "surfer", count=0)
    huge = build(3, [(0, 1, 1e300), (1, 0, 1e300), (1, 2, 1e300), (2, 0, 1e300)])
    found = spectrum(huge, "hits")  # sums of two such weights are still numbers
    assert np.isfinite([v.real for v in found.values]).all()
    for name in MEASURES:
        watch = Watch()
        watch.cancel()
        with pytest.raises(Interrupted):
            spectrum(of(gallery.rmat(10, 8_000, seed=1)), name, watch=watch)


@pytest.mark.parametrize("name", ["eigenvector", "surfer", "hits"])
def test_the_same_bits_for_one_thread_and_two(name):
    graph = of(gallery.rmat(10, 8_000, seed=1))
    one, two = (spectrum(graph, name, watch=Watch(threads=t)) for t in (1, 2))
    assert one.values == two.values
