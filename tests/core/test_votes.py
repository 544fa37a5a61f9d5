"""Ratings from pairwise outcomes against 60-digit Perron vectors and matrices written out."""

from __future__ import annotations

from itertools import combinations
from pathlib import Path

import exact
import mpmath
import numpy as np
import pyarrow.parquet as pq
import pytest
from exact import mpf
from graphs import build, from_arrays, graphs, of
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import gallery
from kingpost.core.errors import NodeNotFound, SettingsError
from kingpost.core.ingest import load
from kingpost.core.insight.spectrum import spectrum
from kingpost.core.measures.votes import MEASURE, VotesSettings, ballot
from kingpost.core.result import BoundKind, Stop
from kingpost.core.watch import Watch

SAMPLES = Path(__file__).parents[2] / "sample_graphs"


def rank(graph, watch=None, **chosen):
    return MEASURE.rank(graph, VotesSettings(**chosen), watch)


def points(graph, flow):
    """``S[i, j]`` from the outgoing edges alone, as exact numbers."""
    s = {}
    for u in range(graph.n):
        for v, w in zip(*graph.outward.row(u), strict=True):
            if u != int(v):
                winner, loser = (int(v), u) if flow == "along" else (u, int(v))
                s[winner, loser] = mpf(float(w))
    return s


def earned(link, mine, theirs, unit):
    """The three links as the literature writes them, in 60 digits."""
    if link == "logistic":
        return 1 / (1 + mpmath.exp(-(mine - theirs) / unit))
    x = (mine + 1) / (mine + theirs + 2)
    if link == "laplace":
        return x
    return mpf(1) / 2 + mpmath.sign(x - mpf(1) / 2) * mpmath.sqrt(abs(2 * x - 1)) / 2


def groups_of(graph, s):
    """Nodes joined by meetings, by plain search."""
    near = {i: set() for i in range(graph.n)}
    for i, j in s:
        near[i].add(j)
        near[j].add(i)
    left, found = set(range(graph.n)), []
    while left:
        todo = [left.pop()]
        group = set(todo)
        while todo:
            for other in near[todo.pop()] & left:
                left.discard(other)
                group.add(other)
                todo.append(other)
        found.append(sorted(group))
    return found, near


def truth(graph, unit, *, flow="along", link="laplace", division="vote", diagonal=0.0):
    """The Perron vector of the one group, sum 1, to 60 digits; None where there is not just one."""
    s = points(graph, flow)
    groups, near = groups_of(graph, s)
    large = [group for group in groups if len(group) > 1]
    if len(large) != 1:
        return None
    nodes = large[0]
    rows = [{} for _ in range(graph.n)]
    for i in nodes:
        for j in near[i]:
            rows[i][j] = earned(link, s.get((i, j), mpf(0)), s.get((j, i), mpf(0)), unit)
        if diagonal:
            rows[i][i] = mpf(diagonal)
    if division == "vote":
        for j in nodes:
            whole = sum(rows[i].get(j, mpf(0)) for i in nodes)
            for i in nodes:
                if j in rows[i]:
                    rows[i][j] /= whole
    else:
        for i in nodes:
            rows[i] = {j: value / len(near[i]) for j, value in rows[i].items()}
    rho, y = exact.perron(rows, nodes)
    if division == "vote":
        assert abs(rho - 1) < mpf(10) ** -45
    x = [mpf(0)] * graph.n
    for node, value in zip(nodes, y, strict=True):
        x[node] = value / sum(y)
    return x, rho


@settings(max_examples=60, deadline=None)
@given(
    graphs(most=7),
    st.sampled_from(["along", "against"]),
    st.sampled_from(["laplace", "skew", "logistic"]),
    st.sampled_from(["vote", "games"]),
    st.sampled_from([0.0, 0.5]),
)
def test_every_claim_holds_in_sixty_digits(graph, flow, link, division, diagonal):
    chosen = {"flow": flow, "link": link, "division": division, "diagonal": diagonal}
    found = rank(graph, **chosen)
    right = truth(graph, mpf(found.facts.get("unit", 1.0)), **chosen)
    if right is None:
        assert found.stop is Stop.REFUSED
        assert "met" in found.refusal.reason
        return
    assert found.stop in (Stop.CONVERGED, Stop.STALLED), found.reason
    weights = graph.outward.weights
    tame = weights is None or weights.max() < 100 * weights.min()
    if tame:
        assert found.bound.kind is BoundKind.COMPONENTWISE
    exact.confirm(found, right[0], informative=tame)
    low, high = found.facts["rho"]
    assert mpf(low) <= right[1] * (1 + exact.TINY)
    assert right[1] * (1 - exact.TINY) <= mpf(high)


def test_two_nodes_by_hand():
    # 0 beat 1 by 3: it earns 4/5 of 1's vote, all of it, as there is no other.
    found = rank(build(2, [(1, 0, 3.0)]))
    assert found.scores.tolist() == pytest.approx([0.5, 0.5])  # each has but one to vote for
    with_own = rank(build(2, [(1, 0, 3.0)]), diagonal=0.5)
    # Columns (0.5, 0.2)/0.7 and (0.8, 0.5)/1.3: x = (56/91 : 26/91).
    assert with_own.scores.tolist() == pytest.approx([56 / 82, 26 / 82], rel=1e-10)
    games = rank(build(2, [(1, 0, 3.0)]), division="games")
    assert games.scores.tolist() == pytest.approx([2 / 3, 1 / 3], rel=1e-10)  # sqrt(.8) : sqrt(.2)
    assert games.facts["rho"][0] == pytest.approx(0.4, rel=1e-10)


def test_scores_both_ways_and_margins_one_way_are_read_alike():
    both = build(3, [(0, 1, 21.0), (1, 0, 14.0), (1, 2, 7.0), (2, 1, 3.0), (0, 2, 1.0)])
    s = points(both, "along")
    assert s[1, 0] == 21
    assert s[0, 1] == 14
    for link in ("laplace", "skew", "logistic"):
        found = rank(both, link=link)
        exact.confirm(found, truth(both, mpf(found.facts["unit"]), link=link)[0])
    assert rank(both, link="logistic").facts["unit"] == pytest.approx((7 + 4 + 1) / 3)
    margins = build(3, [(0, 1, 7.0), (1, 2, 4.0), (0, 2, 1.0)])
    one, two = rank(both, link="logistic"), rank(margins, link="logistic")
    np.testing.assert_allclose(one.scores, two.scores, rtol=1e-9)  # only the margin counts there


def test_matrix_is_column_stochastic_and_earnings_of_a_pair_sum_to_one():
    graph = of(gallery.rmat(7, 500, seed=3))
    for link in ("laplace", "skew", "logistic"):
        made = ballot(graph, VotesSettings(link=link, diagonal=0.25), Watch())
        rows = made.matrix.rows
        dense = np.zeros((graph.n, graph.n))
        for i in range(graph.n):
            near, values = rows.row(i)
            assert (np.diff(near.astype(int)) > 0).all()
            dense[i, near] = values
        off = dense - np.diag(np.diag(dense))
        met = off > 0
        assert (met == met.T).all()
        np.testing.assert_allclose((off + off.T)[met], 1.0, rtol=1e-15)
        busy = made.opponents > 0
        assert (np.diag(dense)[busy] == 0.25).all()
        assert (made.opponents == met.sum(axis=1)).all()
        np.testing.assert_allclose((dense * made.matrix.scale).sum(axis=0)[busy], 1.0, rtol=1e-14)


def test_tastings_have_the_ranks_the_sample_page_states():
    """Wins counted, not weighed: a row each, whatever its margin."""
    graph = load(
        SAMPLES / "cheese_tastings.parquet",
        source="loser", target="winner", weight="margin", weight_as="none",
    )  # fmt: skip
    found = rank(graph)
    places = {graph.name(node): k + 1 for k, node in enumerate(found.standing.order.tolist())}
    assert places["Nine Acre"] == 1
    assert places["Parson's Doorstop"] == 2
    assert places["Lantern Fell"] == 6
    # The same by numpy, from the rows of the table.
    table = pq.read_table(SAMPLES / "cheese_tastings.parquet").to_pydict()
    names = sorted(set(table["loser"]) | set(table["winner"]))
    at = {name: k for k, name in enumerate(names)}
    wins = np.zeros((60, 60))
    for loser, winner in zip(table["loser"], table["winner"], strict=True):
        wins[at[winner], at[loser]] += 1
    met = wins + wins.T > 0
    share = np.where(met, (wins + 1) / (wins + wins.T + 2), 0.0)
    values, vectors = np.linalg.eig(share / share.sum(axis=0))
    right = np.abs(vectors[:, np.argmax(values.real)].real)
    np.testing.assert_allclose(found.scores, right / right.sum(), rtol=1e-10)
    assert found.facts["pairs that met"] == 419


def test_groups_that_never_met_have_no_common_rating():
    graph = build(6, [(0, 1), (1, 2), (2, 0), (3, 4)])
    found = rank(graph)
    assert found.stop is Stop.REFUSED
    assert "2 groups of nodes (of 2 to 3, 0 in one, 3 in another) never met" in found.reason
    inside = rank(graph, component="3")
    assert inside.scores[:3].tolist() == [0, 0, 0]
    assert inside.scores[3:5].sum() == pytest.approx(1.0)
    assert inside.exact_zero.tolist() == [True] * 3 + [False] * 2 + [True]
    assert "met nobody" in rank(graph, component="5").refusal.reason
    with pytest.raises(NodeNotFound):
        rank(graph, component="nobody")
    alone = rank(build(4, [(0, 1, 2.0), (2, 2, 5.0)]))
    assert alone.scores[2:].tolist() == [0, 0]
    assert "2 of them met nobody" in alone.conventions["group"]
    assert rank(build(4, [(0, 1, 2.0), (2, 2, 5.0)]), diagonal=0.5).exact_zero[2]


@pytest.mark.parametrize("edges", [[], [(0, 0), (1, 1)]])
def test_without_a_meeting_there_is_nothing_to_rate(edges):
    assert "no two nodes have met" in rank(build(2, edges)).refusal.reason


def test_the_empty_graph_is_refused_in_words():
    assert "no nodes" in rank(build(0, [])).refusal.reason


def test_ties_are_proven_where_outcomes_are_alike():
    ring = rank(of(gallery.cycle(6)))  # each beat the next: all alike
    assert ring.proven_order == 6
    assert ring.standing.range_of(3) == (1, 6)
    drawn = rank(build(4, [(u, v, 2.0) for u, v in combinations(range(4), 2)], directed=False))
    assert drawn.proven_order == 4
    assert "every meeting is a draw" in drawn.conventions["outcomes"]
    uneven = rank(build(4, [(0, 1), (1, 2), (2, 3), (3, 0, 2.0)]))
    assert uneven.standing.range_of(1) != (1, 4)


def test_acyclic_and_adversarial_outcomes():
    # A knock-out tree: everybody lost once. A star: everybody lost to one. Routs of 1e9 to 0.
    for graph in (of(gallery.star(40)), of(gallery.path(30))):
        found = rank(graph)
        assert found.stop is Stop.CONVERGED
        exact.confirm(found, truth(graph, mpf(1))[0])
    rout = build(5, [(0, 1, 1e9), (1, 2, 1e-9), (2, 3, 1e9), (3, 4, 1.0), (4, 0, 1e6)])
    for link in ("laplace", "skew"):
        found = rank(rout, link=link)
        exact.confirm(found, truth(rout, mpf(1), link=link)[0], informative=False)
        assert np.isfinite(found.scores).all()
    flat = rank(rout, link="logistic", unit=1e-6)  # margins far beyond the scale of the link
    assert np.isfinite(flat.scores).all()
    assert flat.scores.sum() == pytest.approx(1.0)


def test_a_hub_of_many_opponents():
    n = 100_000
    graph = from_arrays(n + 1, np.arange(1, n + 1), np.zeros(n, int))  # all lost to 0
    found = rank(graph)
    assert found.stop is Stop.CONVERGED
    # Votes of the others all go to 0, its own vote is shared alike.
    assert found.scores[0] == pytest.approx(0.5, rel=1e-10)
    assert found.scores[1:] == pytest.approx(0.5 / n, rel=1e-9)
    assert found.proven_order == n + 1


def test_settings_out_of_range():
    for wrong in (
        {"link": "raw"}, {"unit": 0.0}, {"unit": -1.0}, {"division": "half"}, {"diagonal": -0.5},
    ):  # fmt: skip
        with pytest.raises(SettingsError):
            VotesSettings(**wrong)


def test_conventions_say_what_the_matrix_holds():
    graph = build(3, [(0, 1, 2.0), (1, 2, 1.0)])
    words = rank(graph, link="logistic", unit=2.0, diagonal=0.5).conventions
    assert "weight of source = j, target = i" in words["outcomes"]
    assert "0.5 with itself" in words["diagonal"]
    assert words["unit"] == "2 (as given)"
    assert "rho = 1" in words["division"]
    assert rank(graph).conventions["diagonal"] == "zero"
    against = rank(graph, flow="against", division="games").conventions
    assert "weight of target = j, source = i" in against["outcomes"]
    assert "number of nodes met" in against["division"]


def test_limit_order_and_cancel():
    graph = of(gallery.rmat(9, 4_000, seed=3))
    whole = rank(graph, tol=1e-12)
    early = rank(graph, tol=1e-12, stop="order:3")
    assert early.proven_order >= 3
    assert early.sweeps <= whole.sweeps
    for line in (0, 2, 9):
        watch, seen = Watch(), []

        def halt(news, seen=seen, watch=watch, line=line):
            seen.append(news)
            if len(seen) == line:
                watch.cancel()

        if line == 0:
            watch.cancel()
        found = MEASURE.rank(graph, VotesSettings(tol=1e-13), watch, halt)
        assert found.stop is Stop.CANCELLED
        assert np.isfinite(found.scores).all()
        assert found.scores.sum() == pytest.approx(1.0)


def test_the_same_bits_for_one_thread_and_two():
    graph = of(gallery.rmat(10, 9_000, seed=5))
    for link in ("laplace", "skew", "logistic"):
        one, two = (rank(graph, Watch(threads=t), link=link) for t in (1, 2))
        assert (one.scores == two.scores).all()
        assert one.bound.value == two.bound.value


def test_its_spectrum_starts_at_one():
    graph = load(SAMPLES / "cheese_tastings.parquet", source="loser", target="winner")
    found = spectrum(graph, "votes", result=rank(graph))
    assert found.radius == (1.0, 1.0)
    assert found.values[0].real == pytest.approx(1.0, abs=1e-12)
    assert 0 < found.gap < 1
