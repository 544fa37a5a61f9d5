"""Scores rescaled among peers: against numpy a node at a time, and intervals that hold.

The formula is z = (score - mean of the peers) / their standard deviation, after Mariani, Medo and
Zhang (arXiv 1509.01476 and the same authors' paper on milestone papers; from memory).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pyarrow as pa
import pytest
from graphs import from_arrays
from hypothesis import given, settings
from hypothesis import strategies as st

import kingpost.core as kp
from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.graph import Graph
from kingpost.core.insight.cohorts import within
from kingpost.core.result import Bound, BoundKind, Result, Stop
from kingpost.core.standing import OPEN, PROVEN, TIED


def scored(scores: np.ndarray, reach: np.ndarray | float | None = 0.0) -> Result:
    kind = BoundKind.NONE if reach is None else BoundKind.COMPONENTWISE
    bound = Bound(kind, 0.0, absolute=reach)
    return Result("surfer", None, np.asarray(scores, float), Stop.CONVERGED, "", bound)


def labelled(values: object, kind: pa.DataType | None = None) -> Graph:
    column = pa.array(values, kind)
    none = np.empty(0, np.int64)
    graph = from_arrays(len(column), none, none)
    return replace(graph, attributes=pa.table({"group": column}))


def peers_of(values: list, i: int, size: int | None) -> list[int]:
    """The definition, a node at a time: see the docstring of the module tested."""
    same = [j for j, value in enumerate(values) if value == values[i]]
    if size is None or len(same) >= size:
        return same
    ordered = sorted((j for j, v in enumerate(values) if v is not None), key=lambda j: values[j])
    at = [ordered.index(j) for j in same]
    left, right = min(at), max(at) + 1
    more = size - len(same)
    left, right = left - more // 2, right + more - more // 2
    if left < 0:
        left, right = 0, right - left
    if right > len(ordered):
        left, right = left - (right - len(ordered)), len(ordered)
    left, right = max(left, 0), min(right, len(ordered))
    whole = {values[j] for j in ordered[left:right]}
    return [j for j in ordered if values[j] in whole]


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_it_is_the_definition_a_node_at_a_time(data: st.DataObject) -> None:
    n = data.draw(st.integers(1, 40))
    numeric = data.draw(st.booleans())
    some = st.one_of(st.none(), st.integers(0, 9))
    values: list = data.draw(st.lists(some, min_size=n, max_size=n))
    size = data.draw(st.integers(2, 20)) if numeric else None
    rng = np.random.default_rng(data.draw(st.integers(0, 2**20)))
    scores = rng.random(n) + (rng.random(n) < 0.2)
    if not numeric:
        values = [None if v is None else f"g{v}" for v in values]
    graph = labelled(values, pa.int64() if numeric else pa.string())
    found = within(graph, scored(scores), "group", size)
    assert (found.ranked, found.alike, found.valueless) == (
        int((~np.isnan(found.scores)).sum()),
        sum(v is not None for v in values) - found.ranked,
        values.count(None),
    )
    for i in range(n):
        if values[i] is None:
            assert np.isnan(found.scores[i])
            assert (found.peers[i], found.first[i], found.last[i]) == (0, -1, -1)
            continue
        peers = peers_of(values, i, size)
        mine = scores[peers]
        assert found.peers[i] == len(peers)
        assert found.first[i] == 1 + int((mine > scores[i]).sum())
        assert found.last[i] == len(peers) - int((mine < scores[i]).sum())
        if len(peers) == 1 or mine.std() < 1e-12:
            assert np.isnan(found.scores[i])
        else:
            z = (scores[i] - mine.mean()) / mine.std()
            assert found.scores[i] == pytest.approx(z, rel=1e-9, abs=1e-9)
            assert found.low[i] <= found.scores[i] <= found.high[i]
    order = found.standing.order
    assert sorted(order) == list(range(n))
    z = found.scores[order]
    assert not np.isnan(z[: found.ranked]).any()
    assert (np.diff(z[: found.ranked]) <= 1e-12).all()  # of equal ones the last bits may differ
    assert np.isnan(z[found.ranked :]).all()


@settings(max_examples=80, deadline=None)
@given(st.integers(2, 30), st.floats(1e-9, 1e-2), st.integers(0, 2**20), st.booleans())
def test_the_interval_holds_whatever_the_exact_scores_are(
    n: int, blur: float, seed: int, numeric: bool
) -> None:
    rng = np.random.default_rng(seed)
    scores = rng.random(n) ** 4
    reach = blur * rng.random(n)
    values = rng.integers(0, 4, n)
    graph = labelled(values if numeric else [f"g{v}" for v in values])
    found = within(graph, scored(scores, reach), "group", 6 if numeric else None)
    for _ in range(20):
        # Corners of the box are where z is furthest.
        exact = scores + reach * rng.choice([-1.0, 0.0, 1.0], n)
        truth = within(graph, scored(exact), "group", 6 if numeric else None)
        seen = ~np.isnan(found.scores) & ~np.isnan(truth.scores)
        assert (found.low[seen] <= truth.scores[seen]).all()
        assert (truth.scores[seen] <= found.high[seen]).all()
        position = truth.standing.position
        k = found.ranked
        if truth.ranked == k:
            place = position[found.standing.order[:k]] + 1
            assert (found.standing.first[:k] <= place).all()
            assert (place <= found.standing.last[:k]).all()
            proven = found.standing.proven
            assert np.array_equal(np.sort(position[found.standing.order[:proven]]), range(proven))
        valued = found.peers > 0
        assert (found.first[valued] <= truth.first[valued]).all()
        assert (truth.last[valued] <= found.last[valued]).all()


def test_many_members_of_one_value_take_the_sorted_way() -> None:
    rng = np.random.default_rng(2)
    scores, values = rng.random(400), rng.integers(0, 3, 400)
    found = within(labelled(values), scored(scores), "group", 10)
    for i in (0, 17, 399):
        mine = scores[values == values[i]]
        assert found.first[i] == found.last[i] == 1 + int((mine > scores[i]).sum())


def test_ties_are_ties_within_a_group_and_the_rail_says_what_is_proven() -> None:
    graph = kp.from_edges([("a", "x"), ("b", "x"), ("x", "y"), ("x", "z"), ("y", "a"), ("z", "b")])
    graph = replace(graph, attributes=pa.table({"group": ["p", "p", "q", "q", "q"]}))
    result = graph.rank("surfer")  # a and b are alike, and so are y and z
    found = within(graph, result, "group")
    assert (found.ranked, found.alike) == (3, 2)  # a and b: peers of the same score
    assert [graph.label(int(i)) for i in found.standing.order[:3]] == ["x", "y", "z"]
    assert found.standing.rail[:3].tolist() == [PROVEN, TIED, PROVEN]
    assert found.standing.range_of(graph.find("y")) == (2, 3)
    assert (found.first[4], found.last[4]) == (2, 3)
    assert found.standing.range_of(graph.find("a")) == (4, 5)
    assert "2 with peers that all score alike" in found.left_out
    assert "1509.01476" in found.words


def test_a_loose_bound_leaves_the_order_open_and_none_claims_nothing() -> None:
    graph = labelled(["g"] * 4)
    scores = np.array([1.0, 2.0, 2.001, 9.0])
    found = within(graph, scored(scores, 0.01), "group")
    assert found.standing.rail.tolist() == [PROVEN, OPEN, PROVEN, PROVEN]
    assert found.standing.proven == 1
    found = within(graph, scored(scores, None), "group")
    assert found.standing.order.tolist() == [3, 2, 1, 0]
    assert found.standing.proven == 0
    assert found.ranked == 4
    found = within(graph, scored(scores, 5.0), "group")  # the spread is within the error
    assert (found.ranked, found.alike) == (0, 4)


def test_age_alone_no_longer_wins() -> None:
    """Old nodes score 100 times as much; the best of each year come out alike."""
    rng = np.random.default_rng(7)
    year = np.repeat(np.arange(2000, 2020), 60)
    scores = rng.gamma(1.0, size=1200) * 1.3 ** (2020 - year)
    plain = np.argsort(-scores)[:100]
    found = within(labelled(year), scored(scores), "group", 60)
    fair = found.standing.order[:100]
    assert (year[plain] < 2010).mean() > 0.95
    assert 0.3 < (year[fair] < 2010).mean() < 0.7


@pytest.mark.parametrize("kind", ["date", "float", "dictionary", "boolean"])
def test_attributes_of_other_types(kind: str) -> None:
    column = {
        "date": pa.array([0, 365, 365, None], pa.date32()),
        "float": pa.array([0.0, float("nan"), 1.0, 1.0]),
        "dictionary": pa.array(["a", "a", "b", None]).dictionary_encode(),
        "boolean": pa.array([True, False, True, None]),
    }[kind]
    found = within(replace(labelled([0] * 4), attributes=pa.table({"group": column})),
                   scored(np.arange(4.0)), "group")  # fmt: skip
    assert found.valueless == 1


def test_what_cannot_be_grouped_by_is_refused() -> None:
    graph, result = labelled(["a", "b"]), scored(np.array([1.0, 2.0]))
    empty = replace(graph, attributes=None)
    for call, words in [
        (lambda: within(graph, result, "team"), "there are group"),
        (lambda: within(empty, result, "team"), "--nodes"),
        (lambda: within(graph, result, "group", 5), "numbers and dates"),
        (lambda: within(labelled([1, 2]), result, "group", 1), "at least 2"),
        (lambda: within(labelled([[1], [2]]), result, "group"), "list"),
        (lambda: within(graph, kp.from_edges([(1, 2)]).rank("eigenvector"), "group"), "no cycle"),
    ]:
        with pytest.raises(SettingsError, match=words):
            call()
    watch = kp.Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        within(graph, result, "group", watch=watch)


def test_the_empty_graph() -> None:
    found = within(labelled([], pa.int64()), scored(np.empty(0)), "group")
    assert (found.ranked, found.groups) == (0, 0)
