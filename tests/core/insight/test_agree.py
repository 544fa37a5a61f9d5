"""Agreement of rankings: against scipy, published values, and counting by definition."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pytest
from graphs import build
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.ingest import load
from kingpost.core.insight.agree import agree
from kingpost.core.insight.ranks import (
    agreement,
    inversions,
    rank_biased_overlap,
    ranks_from_scores,
    ranks_of,
    rbo_weight,
    spearman,
    tau_b,
    top_overlap,
)
from kingpost.core.measures import measure
from kingpost.core.watch import Watch

ROOT = Path(__file__).parents[3]
ENTRIES = {
    item["id"]: item for item in json.loads((ROOT / "tests/checks/check_values.json").read_text())
}
PAIRS = st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)), min_size=2, max_size=60)


def ranked(values):
    return ranks_from_scores(np.asarray(values, float))


@given(PAIRS)
def test_tau_b_and_spearman_are_scipys(pairs):
    x, y = (np.array(side, float) for side in zip(*pairs, strict=True))
    if len(set(x)) == 1 or len(set(y)) == 1:
        assert math.isnan(tau_b(ranked(x), ranked(y)))
        assert math.isnan(spearman(ranked(x), ranked(y)))
        return
    assert tau_b(ranked(x), ranked(y)) == pytest.approx(stats.kendalltau(x, y).statistic, abs=1e-14)
    assert spearman(ranked(x), ranked(y)) == pytest.approx(
        stats.spearmanr(x, y).statistic, abs=1e-12
    )


def test_tau_b_of_a_long_list_is_scipys():
    rng = np.random.default_rng(4)
    x = rng.integers(0, 30_000, 100_000).astype(float)
    y = x + rng.normal(0, 8_000, 100_000).round(-2)
    assert tau_b(ranked(x), ranked(y)) == pytest.approx(stats.kendalltau(x, y).statistic, abs=1e-13)


@pytest.mark.parametrize("name", ["kendall-1970-taub", "hollander-wolfe-tau"])
def test_published_values_of_tau(name):
    item = ENTRIES[name]  # sources stand in the entries
    found = tau_b(ranked(item["parameters"]["x"]), ranked(item["parameters"]["y"]))
    assert found == pytest.approx(item["expected"][0], abs=item["tolerance"])


def test_published_value_of_spearman():
    item = ENTRIES["hollander-wolfe-spearman"]
    found = spearman(ranked(item["parameters"]["x"]), ranked(item["parameters"]["y"]))
    assert found == pytest.approx(item["expected"][0], abs=item["tolerance"])


def test_published_average_overlap():
    """Webber, Moffat, Zobel 2010, figure 5: two lists that do not hold the same items."""
    item = ENTRIES["ao-webber-fig5"]
    a, b = item["parameters"]["a"], item["parameters"]["b"]
    letters = sorted(set(a + b))
    first = [np.array([list_.find(c) + 1 or 99 for c in letters]) for list_ in (a, b)]
    shares = agreement(*first, 7)
    average = np.cumsum(shares) / np.arange(1, 8)
    assert average == pytest.approx(item["expected"], abs=item["tolerance"])


def test_published_weight_of_the_head():
    item = ENTRIES["rbo-weight-p0.9-top10"]
    assert rbo_weight(0.9, 10) == pytest.approx(item["expected"][0], abs=item["tolerance"])


@given(PAIRS, st.floats(0.05, 0.97))
def test_overlap_is_its_definition(pairs, p):
    """Webber et al., equation (4), with tied items at the first of their ranks; sets by hand."""
    x, y = (list(side) for side in zip(*pairs, strict=True))
    n = len(x)
    first = [[1 + sum(other > value for other in side) for value in side] for side in (x, y)]
    wanted = 0.0
    for d in range(1, 2_000):
        s, t = ({i for i in range(n) if ranks[i] <= d} for ranks in first)
        wanted += (1 - p) * p ** (d - 1) * 2 * len(s & t) / (len(s) + len(t))
        if p**d < 1e-13:
            break
    assert rank_biased_overlap(ranked(x), ranked(y), p) == pytest.approx(wanted, abs=1e-11)
    s, t = ({i for i in range(n) if ranks[i] <= 2} for ranks in first)
    assert top_overlap(ranked(x), ranked(y), 2) == 2 * len(s & t) / (len(s) + len(t))


def test_weight_of_the_head_is_what_disjoint_heads_lose():
    """By definition: lists that share nothing at first and everything after rank 10."""
    tops = np.arange(20)
    a, b = ranked(-tops), ranked(-np.concatenate((tops[10:], tops[:10])))
    # At depth 10 < d <= 20 they share 2 (d - 10) of d; check against the same sum by hand.
    p = 0.8
    wanted = sum(0.2 * p ** (d - 1) * 2 * (d - 10) / d for d in range(11, 20)) + p**19
    assert rank_biased_overlap(a, b, p) == pytest.approx(wanted, abs=1e-14)


@given(st.lists(st.integers(0, 50), max_size=200))
@settings(max_examples=50)
def test_inversions_are_counted(values):
    wanted = sum(a > b for i, a in enumerate(values) for b in values[i + 1 :])
    assert inversions(np.array(values, np.uint32)) == wanted


def test_p_outside_its_range_is_refused():
    with pytest.raises(SettingsError, match="between 0 and 1"):
        rank_biased_overlap(ranked([1, 2]), ranked([1, 2]), 1.0)


def test_cancelled_between_passes():
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        tau_b(ranked(range(100)), ranked(range(100)), watch)


def test_ties_of_a_result_are_classes():
    """A star: the leaves' equations are the same, so they are one class whatever the bits."""
    star = build(5, [(i, 0) for i in range(1, 5)])
    ranks = ranks_of(measure("surfer").rank(star))
    assert ranks.sizes.tolist() == [1, 4]
    assert ranks.mean.tolist() == [1.0, 3.5, 3.5, 3.5, 3.5]
    assert ranks.first.tolist() == [1, 2, 2, 2, 2]


@pytest.fixture(scope="module")
def reef():
    graph = load(
        ROOT / "sample_graphs/reef_citations.parquet",
        nodes=str(ROOT / "sample_graphs/reef_papers.parquet"),
    )
    return graph, {name: measure(name).rank(graph) for name in ("surfer", "katz", "degree")}


def test_the_reef_says_why(reef):
    """sample_graphs/README.md: cited five times, once by a paper that cites only two."""
    graph, results = reef
    found = agree(graph, results, apart=400)
    row = next(row for row in found.apart if graph.label(row.node) == "rk-1985-0007")
    assert (row.high, row.low) == ("surfer", "degree")
    assert row.ranks["surfer"][0] == 7
    told = {reason.kind: reason.words for reason in row.reasons}
    assert "5 nodes point at it" in told["degree"]
    assert "rk-1989-0012" in told["feeders"]
    assert "2 nodes in all" in told["feeders"]
    assert "year 1985, older than" in told["age"]


def test_pairs_agree_with_scipy_on_the_reef(reef):
    graph, results = reef
    found = agree(graph, results)
    assert [(pair.a, pair.b) for pair in found.pairs] == [
        ("surfer", "katz"),
        ("surfer", "degree"),
        ("katz", "degree"),
    ]
    for pair in found.pairs:
        x, y = (found.ranks[name].mean for name in (pair.a, pair.b))
        assert pair.tau_b == pytest.approx(stats.kendalltau(x, y).statistic, abs=1e-13)
        assert pair.spearman == pytest.approx(stats.spearmanr(x, y).statistic, abs=1e-12)
        assert pair.top == pytest.approx(
            len(set(np.flatnonzero(x <= 100)) & set(np.flatnonzero(y <= 100))) / 100
        )
    factors = [row.factor for row in found.apart]
    assert factors == sorted(factors, reverse=True)
    counts, edges = found.scatter("surfer", "katz", 12)
    assert counts.sum() == graph.n
    assert len(edges) == 13


def test_measures_without_an_answer_are_set_aside():
    path = build(3, [(0, 1), (1, 2)])
    results = {name: measure(name).rank(path) for name in ("surfer", "eigenvector", "degree")}
    found = agree(path, results)
    assert found.names == ("surfer", "degree")
    assert "no cycle" in found.refused["eigenvector"]
    with pytest.raises(SettingsError, match="two measures with an answer"):
        agree(path, {"eigenvector": results["eigenvector"], "degree": results["degree"]})


def test_an_age_that_is_none_is_refused(reef):
    graph, results = reef
    with pytest.raises(SettingsError, match="no node attribute is called vintage"):
        agree(graph, results, age="vintage")
    with pytest.raises(SettingsError, match="an age is a number or a date"):
        agree(graph, results, age="venue")
