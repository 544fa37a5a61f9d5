"""Drift: claims held against tight solves, terms against their own sum, samples against README."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa
import pytest
from graphs import build, graphs
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from kingpost.core.errors import InputError, SettingsError
from kingpost.core.export.drift_answer import cause_sentence
from kingpost.core.graph import Graph
from kingpost.core.ingest import from_table, load
from kingpost.core.insight.align import align
from kingpost.core.insight.drift import FALLEN, GONE, NEW, RISEN, SAME, drift
from kingpost.core.measures import measure
from kingpost.core.measures.surfer import SurferSettings

SAMPLES = Path(__file__).parents[3] / "sample_graphs"


def renamed(graph: Graph, names: list[int]) -> Graph:
    return Graph(pa.array(names), graph.outward, graph.inward, graph.directed)


@st.composite
def two_tables(draw):
    """Two small graphs whose ids overlap in part."""
    first, second = draw(graphs(directed=True)), draw(graphs(directed=True))
    kept = draw(st.lists(st.integers(0, 14), min_size=9, max_size=9, unique=True))
    return first, renamed(second, sorted(kept[: second.n]))


@given(two_tables())
@settings(max_examples=100, deadline=None)
def test_alignment_is_a_dictionary(case):
    before, after = case
    ids = align(before, after)
    labels = ids.labels.to_pylist()
    assert sorted(labels) == sorted({*before.labels.to_pylist(), *after.labels.to_pylist()})
    for graph, nodes, places in (
        (before, ids.before, ids.at_before),
        (after, ids.after, ids.at_after),
    ):
        at = {label: node for node, label in enumerate(graph.labels.to_pylist())}
        assert nodes.tolist() == [at.get(label, -1) for label in labels]
        assert [labels[place] for place in places] == graph.labels.to_pylist()


@given(two_tables(), st.sampled_from([0.3, 0.05, 1e-3, 1e-10]))
@settings(max_examples=150, deadline=None)
def test_no_claim_goes_beyond_the_bound(case, tol):
    """A rise or fall claimed from rough solves is one in nearly exact solves."""
    surfer, chosen = measure("surfer"), SurferSettings(tol=tol)
    rough = drift(*case, *(surfer.rank(graph, chosen) for graph in case))
    exact = [surfer.rank(graph, SurferSettings(tol=1e-13)) for graph in case]
    for place, kind in enumerate(rough.kind.tolist()):
        old, new = int(rough.ids.before[place]), int(rough.ids.after[place])
        assert (kind == NEW) == (old < 0)
        assert (kind == GONE) == (new < 0)
        if kind in (RISEN, FALLEN):
            was, now = exact[0].standing.range_of(old), exact[1].standing.range_of(new)
            assert now[1] < was[0] if kind == RISEN else now[0] > was[1]
            assert rough.factor[place] > 1
            true = was[0] / now[1] if kind == RISEN else now[0] / was[1]
            assert rough.factor[place] <= true * (1 + 1e-12)


@given(two_tables(), st.sampled_from(["surfer", "katz", "eigenvector", "degree"]))
@settings(max_examples=150, deadline=None)
def test_changes_of_the_terms_are_the_rise(case, name):
    results = [measure(name).rank(graph) for graph in case]
    assume(all(result.refusal is None for result in results))
    found = drift(*case, *results, causes=9, edges=2)
    for cause in found.causes:
        terms = sum(edge.change for edge in cause.edges) + cause.rest + cause.own
        assert terms == pytest.approx(
            cause.rise, abs=1e-8 * max(map(max, (r.scores for r in results)))
        )
        for edge in cause.edges:
            assert edge.by_edge + edge.by_feeder == pytest.approx(
                edge.change, abs=1e-12 + 1e-12 * abs(edge.after)
            )
            assert (edge.edge == "new") == (edge.before == 0 and edge.edge == "new")


@pytest.fixture(scope="module")
def harbour():
    """An ordinary hour and a failover hour, by surfer."""
    names = ("harbour_calls.parquet", "harbour_calls_failover.parquet")
    graphs_ = [load(SAMPLES / name, weight="calls_per_min") for name in names]
    return graphs_, [measure("surfer").rank(graph) for graph in graphs_]


def test_the_failover(harbour):
    """sample_graphs/README.md, section "A failover hour"."""
    graphs_, results = harbour
    found = drift(*graphs_, *results)
    at = {label: place for place, label in enumerate(found.ids.labels.to_pylist())}

    def ranks(name):
        place = at[name]
        return found.before[place].tolist(), found.after[place].tolist(), int(found.kind[place])

    assert ranks("seat-inventory") == ([10, 10], [93, 93], FALLEN)
    assert ranks("seat-inventory-standby") == ([370, 370], [10, 10], RISEN)
    assert ranks("lease-umpire") == ([324, 324], [11, 11], RISEN)
    assert ranks("snapshot-replay")[2] == NEW
    assert ranks("winter-timetable-import")[2] == GONE
    risen = found.ordered(RISEN)
    assert [found.ids.labels[int(place)].as_py() for place in risen[:2]] == [
        "seat-inventory-standby",
        "lease-umpire",
    ]
    climb = found.before[risen, 0] - found.after[risen, 1]
    assert (climb[2:] < 30).all()  # "No other service rises by 30 places"
    words = [cause_sentence(found, cause) for cause in found.causes]
    assert words[0].startswith("seat-inventory-standby rose from rank 370 to 10")
    assert "new edges" in words[0]
    assert "92% from seat-inventory-standby" in words[1]
    assert "8% from snapshot-replay, whose edge is new" in words[1]


def test_a_table_against_itself_has_not_changed(harbour):
    graphs_, results = harbour
    found = drift(graphs_[0], graphs_[0], results[0], results[0])
    assert (found.kind == SAME).all()
    assert found.causes == ()


def test_ids_of_different_width_are_the_same_ids():
    wide = from_table(pa.table({"source": pa.array([1, 2], pa.int64()), "target": [2, 3]}))
    slim = from_table(
        pa.table({"source": pa.array([2, 9], pa.int16()), "target": pa.array([3, 2], pa.int16())})
    )
    ids = align(wide, slim)
    assert ids.labels.to_pylist() == [1, 2, 3, 9]
    assert ids.after.tolist() == [-1, 0, 1, 2]


def test_what_cannot_be_compared_is_refused(harbour):
    graphs_, results = harbour
    numbers = build(3, [(0, 1), (1, 2)])
    other = measure("surfer").rank(numbers)
    with pytest.raises(InputError, match="the ids are int64 in graph and string in harbour"):
        drift(numbers, graphs_[0], other, results[0])
    with pytest.raises(SettingsError, match="one measure and one flow"):
        drift(graphs_[0], numbers, results[0], measure("degree").rank(numbers))
    with pytest.raises(SettingsError, match="no cycle"):
        drift(numbers, numbers, measure("eigenvector").rank(numbers), other)


def test_measures_without_terms_still_tell_who_moved():
    first = build(4, [(0, 1), (1, 2), (2, 0), (3, 0)])
    second = build(4, [(0, 1), (1, 2), (2, 0), (3, 2), (1, 3)])
    found = drift(first, second, *(measure("hits").rank(g) for g in (first, second)))
    assert found.causes == ()
    assert len(found.kind) == 4
    assert np.isfinite(found.scores).all()
