"""Terms of a score: they sum to it within the bound, and are what dense algebra says."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from graphs import build, dense, graphs
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.errors import SettingsError
from kingpost.core.export.why_answer import than_sentence
from kingpost.core.ingest import load
from kingpost.core.insight.why import than, why
from kingpost.core.measures import measure
from kingpost.core.measures.degree import DegreeSettings
from kingpost.core.measures.eigenvector import EigenvectorSettings
from kingpost.core.measures.katz import KatzSettings
from kingpost.core.measures.surfer import SurferSettings

SAMPLES = Path(__file__).parents[3] / "sample_graphs"


@st.composite
def solved(draw):
    """A graph and a result of any measure that has terms, under any of its conventions."""
    graph = draw(graphs())
    flow = draw(st.sampled_from(["along", "against"]))
    tol = draw(st.sampled_from([1e-3, 1e-6, 1e-10]))
    kind = draw(st.sampled_from(["surfer", "katz", "eigenvector", "degree"]))
    if kind == "surfer":
        own = np.array(draw(st.lists(st.integers(0, 3), min_size=graph.n, max_size=graph.n)))
        chosen = SurferSettings(
            flow=flow,
            tol=tol,
            damping=draw(st.sampled_from([0.0, 0.5, 0.85, 0.99, 1.0])),
            dangling=draw(st.sampled_from(["teleport", "uniform", "leak"])),
            teleport=own if own.any() and draw(st.booleans()) else None,
        )
    elif kind == "katz":
        beta = draw(st.sampled_from([1.0, 0.3, -1.0]))
        fraction = draw(st.sampled_from([None, 0.5, 0.95, -0.7]))
        chosen = KatzSettings(flow=flow, tol=tol, alpha_fraction=fraction, beta=beta)
    elif kind == "eigenvector":
        component = draw(st.sampled_from([None, "0"]))
        chosen = EigenvectorSettings(flow=flow, tol=tol, component=component)
    else:
        counting = draw(st.sampled_from(["strength", "edges"]))
        chosen = DegreeSettings(flow=flow, counting=counting)
    return graph, measure(kind).rank(graph, chosen)


@given(solved())
@settings(max_examples=250, deadline=None)
def test_terms_sum_to_the_score_within_the_bound(case):
    graph, result = case
    if result.refusal is not None:
        with pytest.raises(SettingsError, match="has no answer here"):
            why(graph, result, 0)
        return
    for node in range(graph.n):
        found = why(graph, result, node)
        whole = float(found.amount.sum()) + sum(found.parts.values())
        assert found.gap == pytest.approx(found.score - whole, abs=1e-15 + 1e-12 * abs(whole))
        assert abs(found.gap) <= found.allowed
        assert (np.diff(found.amount) <= 0).all()


def test_terms_are_those_of_dense_algebra():
    """A surfer with its own teleport and dangling distributions; numpy's solver."""
    graph = build(5, [(0, 1, 2.0), (1, 2, 1.0), (2, 0, 3.0), (0, 3, 1.0), (1, 3, 4.0), (4, 0)])
    teleport, hop, d = np.array([1.0, 0, 0, 0, 3.0]) / 4, np.array([0, 1.0, 1.0, 0, 0]) / 2, 0.8
    chosen = SurferSettings(damping=d, teleport=teleport, dangling=hop)
    result = measure("surfer").rank(graph, chosen)
    matrix = dense(graph)
    out = matrix.sum(axis=1)
    walk = np.where(out[:, None] > 0, matrix / np.where(out > 0, out, 1)[:, None], hop)
    x = np.linalg.solve(np.eye(5) - d * walk.T, (1 - d) * teleport)
    found = why(graph, result, 1)
    assert found.neighbours.tolist() == [0]
    assert found.amount[0] == pytest.approx(d * 2 / 3 * x[0], abs=1e-10)
    assert found.parts["dangling"] == pytest.approx(d * x[3] / 2, abs=1e-10)
    assert found.parts["teleport"] == 0.0
    assert why(graph, result, 4).parts["teleport"] == pytest.approx(0.2 * 0.75)


def test_a_tight_bound_would_catch_a_wrong_term():
    """The bound of the gap is of the size of the solve's own error, not a blanket excuse."""
    graph = load(SAMPLES / "harbour_calls.parquet", weight="calls_per_min")
    for name in ("surfer", "katz", "eigenvector"):
        result = measure(name).rank(graph)
        for node in range(0, graph.n, 40):
            found = why(graph, result, node)
            assert found.allowed <= 1e-7 * result.scores.max()


@given(solved(), st.floats(0.02, 0.5))
@settings(max_examples=100, deadline=None)
def test_paths_carry_what_they_say(case, least):
    """Against a search of all simple paths by brute force."""
    graph, result = case
    if result.refusal is not None or (result.scores < 0).any():
        return
    node = graph.n - 1
    found = why(graph, result, node, least=least, depth=4)
    if found.paths is None:
        return
    shares = [why(graph, result, head) for head in range(graph.n)]

    def longer(path, share):
        one = shares[path[0]]
        for feeder, part in zip(one.neighbours.tolist(), one.share.tolist(), strict=True):
            if feeder not in path and share * part >= least * (1 - 1e-9):
                yield (feeder, *path), share * part

    ended, open_ = {}, [((node,), 1.0)]
    while open_:
        path, share = open_.pop()
        more = list(longer(path, share))
        if more and len(path) <= 4:
            open_ += more
        elif len(path) > 2:
            ended[path] = share
    assert {path.nodes for path in found.paths} == set(ended)
    for path in found.paths:
        assert path.share == pytest.approx(ended[path.nodes])


def test_a_difference_is_the_sum_of_its_terms():
    graph = load(SAMPLES / "harbour_calls_failover.parquet", weight="calls_per_min")
    result = measure("surfer").rank(graph)
    first, second = graph.find("lease-umpire"), graph.find("seat-inventory")
    found = than(graph, result, first, second)
    assert found.proven
    assert sum(term.difference for term in found.terms) == pytest.approx(found.lead, abs=1e-15)
    assert graph.label(found.terms[0].node) == "seat-inventory-standby"
    words = than_sentence(graph, result, found)
    assert words.startswith(
        "lease-umpire (rank 11) and seat-inventory (rank 93): lease-umpire lead"
    )
    back = than_sentence(graph, result, than(graph, result, second, first))
    assert "lease-umpire leads by" in back
    assert "It gets more from seat-inventory-standby" in back


def test_the_umpire_of_the_failover():
    """sample_graphs/README.md: 85.7 % from the standby, 7.9 % from snapshot-replay."""
    graph = load(SAMPLES / "harbour_calls_failover.parquet", weight="calls_per_min")
    found = why(graph, measure("surfer").rank(graph), graph.find("lease-umpire"))
    told = [
        (graph.label(int(n)), round(float(s), 3))
        for n, s in zip(found.neighbours, found.share, strict=True)
    ]
    assert told[:2] == [("seat-inventory-standby", 0.857), ("snapshot-replay", 0.079)]
    assert graph.label(found.paths[0].nodes[-2]) == "seat-inventory-standby"


def test_equal_and_unproven_are_said():
    graph = build(3, [(0, 2), (1, 2)])
    result = measure("surfer").rank(graph)
    assert "have the same score" in than_sentence(graph, result, than(graph, result, 0, 1))
    graph = load(SAMPLES / "harbour_calls.parquet")
    rough = measure("surfer").rank(graph, SurferSettings(tol=0.5))
    low, high = rough.bound.interval(rough.scores)
    order = rough.standing.order
    overlap = low[order[:-1]] <= high[order[1:]]
    differ = rough.scores[order[:-1]] > rough.scores[order[1:]]
    at = int(np.flatnonzero(overlap & differ)[0])
    found = than(graph, rough, int(order[at]), int(order[at + 1]))
    assert "not proven apart" in than_sentence(graph, rough, found)


def test_measures_without_terms_are_refused():
    graph = build(3, [(0, 1), (1, 2), (2, 0), (0, 2)])
    with pytest.raises(SettingsError, match="the terms of hits are not known"):
        why(graph, measure("hits").rank(graph), 0)
    with pytest.raises(SettingsError, match="least share of a path"):
        why(graph, measure("surfer").rank(graph), 0, least=0.0)
