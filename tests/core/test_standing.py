"""Orders, ties and ranges against their definitions, pair by pair; classes against plain rounds."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core import standing as module
from kingpost.core.colours import colours
from kingpost.core.gallery import layered_dag, rmat
from kingpost.core.graph import Adjacency
from kingpost.core.ingest import from_table
from kingpost.core.measures import measure
from kingpost.core.operators import Pull, walk
from kingpost.core.result import Bound, BoundKind
from kingpost.core.standing import OPEN, PROVEN, TIED, UNRANKED, falling_order, settle, stand
from kingpost.core.watch import Watch


@st.composite
def proven_scores(draw):
    """Exact values by class, and scores within a bound of them."""
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    n, kinds = draw(st.integers(1, 40)), draw(st.integers(1, 12))
    value = rng.random(kinds) * 10.0 ** rng.integers(-3, 3)
    value[rng.random(kinds) < 0.2] = 0.0
    classes = rng.integers(0, kinds, n)
    exact = value[classes]
    relative = float(10.0 ** rng.integers(-9, 0)) if rng.random() < 0.7 else None
    absolute = float(10.0 ** rng.integers(-6, 0)) if rng.random() < 0.5 else None
    if rng.random() < 0.2:
        absolute = rng.random(n) * 0.1
    room = np.full(n, 3.0)
    for most in (None if relative is None else relative * exact, absolute):
        if most is not None:
            room = np.minimum(room, most)
    scores = exact + room * 0.4 * rng.uniform(-1, 1, n)
    zero = exact == 0.0 if rng.random() < 0.5 else None
    bound = Bound(BoundKind.COMPONENTWISE, 0.1, relative, absolute)
    return scores, bound, zero, classes.astype(np.int64)


@settings(deadline=None)
@given(proven_scores(), st.booleans())
def test_standing_is_what_its_definition_says(case, related):
    scores, bound, zero, classes = case
    n = len(scores)
    symmetry = classes if related else None
    found = stand(scores, bound, zero, symmetry)
    low, high = bound.interval(scores)
    if zero is not None:
        low[zero] = high[zero] = 0.0
    order = found.order
    assert sorted(order) == list(range(n))
    low, high = low[order], high[order]

    def tied(i: int) -> bool:
        a, b = order[i], order[i + 1]
        point = low[i] == high[i] and low[i + 1] == high[i + 1] and scores[a] == scores[b]
        nought = zero is not None and zero[a] and zero[b]
        return bool(point or nought or (symmetry is not None and symmetry[a] == symmetry[b]))

    ties = [tied(i) for i in range(n - 1)] + [False]
    apart = [i == n - 1 or min(low[: i + 1]) > max(high[i + 1 :]) for i in range(n)]
    for i in range(n):
        unsure = low[i] <= 0.0 <= high[i] and low[i] < high[i]
        expected = TIED if ties[i] else UNRANKED if unsure else PROVEN if apart[i] else OPEN
        assert found.rail[i] == expected
    first = [1 + sum(low[j] > high[i] for j in range(n)) for i in range(n)]
    last = [n - sum(high[j] < low[i] for j in range(n)) for i in range(n)]
    begin = 0
    for i in range(n):
        if not ties[i]:
            assert set(found.first[begin : i + 1]) == {min(first[begin : i + 1])}
            assert set(found.last[begin : i + 1]) == {max(last[begin : i + 1])}
            begin = i + 1
    unsettled = [i for i in range(n) if not (apart[i] or ties[i])]
    proven = n
    if unsettled:
        proven = unsettled[0]
        while proven and ties[proven - 1]:
            proven -= 1
    assert found.proven == proven
    if symmetry is None or not unsettled:
        plain = sorted(range(n), key=lambda node: (-scores[node], node))
        if symmetry is None:
            assert list(order) == plain
    else:  # members of a class stand together, at the place of the highest of them
        best = {kind: max(scores[classes == kind]) for kind in set(classes.tolist())}
        assert [best[classes[node]] for node in order] == sorted(
            (best[kind] for kind in classes.tolist()), reverse=True
        )
        heads = [classes[node] for i, node in enumerate(order) if i == 0 or not ties[i - 1]]
        assert len(heads) >= len(set(heads))


def test_intervals_far_out_of_order_get_the_same_ranges(monkeypatch):
    rng = np.random.default_rng(5)
    scores, wide = rng.random(300), rng.random(300) ** 6
    bound = Bound(BoundKind.L1, 0.5, absolute=wide)
    found = stand(scores, bound)
    monkeypatch.setattr(module, "_STEPS", 0)  # never from the place before: always by search
    searched = stand(scores, bound)
    assert np.array_equal(found.first, searched.first)
    assert np.array_equal(found.last, searched.last)


@settings(deadline=None)
@given(st.lists(st.sampled_from([0.0, -0.0, 1.0, 2.5, -3.0, 1e-300, np.inf]), max_size=60))
def test_falling_order_is_a_stable_sort(values):
    array = np.array(values, dtype=np.float64)
    assert np.array_equal(falling_order(array), np.argsort(-array, kind="stable"))


def rounds(rows: Adjacency, scale: np.ndarray, b: np.ndarray) -> list[int]:
    """Classes by plain rounds over sorted tuples; weights and scales by value."""
    weights = np.ones(len(rows.neighbours)) if rows.weights is None else rows.weights
    n = len(rows.offsets) - 1
    colour = list(np.unique(np.broadcast_to(b, n), return_inverse=True)[1].ravel().tolist())
    while True:
        told = [
            (
                colour[i],
                tuple(
                    sorted(
                        (colour[rows.neighbours[k]], scale[rows.neighbours[k]], weights[k])
                        for k in range(rows.offsets[i], rows.offsets[i + 1])
                        if scale[rows.neighbours[k]] != 0.0
                    )
                ),
            )
            for i in range(n)
        ]
        kinds = {kind: number for number, kind in enumerate(sorted(set(told)))}
        fresh = [kinds[kind] for kind in told]
        if len(kinds) == len(set(colour)):
            return fresh
        colour = fresh


def same_classes(one, other) -> bool:
    pairs = set(zip(list(one), list(other), strict=True))
    return len(pairs) == len(set(one)) == len(set(other))


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("shape", ["cyclic", "acyclic"])
def test_pools_leave_the_classes_as_they_are(seed, shape):
    import pyarrow as pa

    edges = rmat(7, 260, seed=seed) if shape == "cyclic" else layered_dag(5, 12, 2, seed=seed)
    graph = from_table(pa.table({"source": edges.source, "target": edges.target}))
    matrix, strength = walk(graph, "along", 0.85)
    matrix = Pull(matrix.rows, np.where(matrix.scale != 0, strength, 0.0))
    b = np.ones(1)
    expected = rounds(matrix.rows, matrix.scale, b)
    without = colours(matrix, b, Watch())
    assert same_classes(without, expected)
    assert all(without[node] == node for node in set(without.tolist()))  # first members
    assert (without <= np.arange(graph.n)).all()
    rng = np.random.default_rng(seed)
    coarse = rng.integers(0, 4, max(expected) + 1)[expected].astype(np.uint32)
    fine = np.unique(expected, return_inverse=True)[1].ravel().astype(np.uint32)
    for pools in (np.zeros(graph.n, np.uint32), coarse, fine):
        assert same_classes(colours(matrix, b, Watch(), pools=pools), expected)
        staged = colours(matrix, b, Watch(), graph.structure, "along", pools)
        plain = colours(matrix, b, Watch(), graph.structure, "along")
        assert same_classes(staged, plain)


@pytest.mark.parametrize("name", ["surfer", "katz", "eigenvector", "communicability"])
def test_a_solve_stands_the_same_with_and_without_pools(name):
    import pyarrow as pa

    edges = rmat(9, 1_500, seed=8)
    graph = from_table(pa.table({"source": edges.source, "target": edges.target}))
    one = measure(name)
    result = one.rank(graph, one.settings(), Watch())
    assert result.symmetry is not None
    alike = result.symmetry
    slow = settle(result.scores, result.bound, result.exact_zero, lambda _: alike(None))
    fast = result.standing
    assert np.array_equal(slow.rail, fast.rail)
    assert np.array_equal(slow.first, fast.first)
    assert np.array_equal(slow.last, fast.last)
    assert slow.proven == fast.proven
    assert (fast.rail == TIED).any()
    assert np.array_equal(slow.order, fast.order)
