"""A look at one node, against a graph small enough to be looked at by hand."""

from __future__ import annotations

import math

import numpy as np
import pyarrow as pa
import pytest

from kingpost.core.export.node_report import node_json, node_text
from kingpost.core.graph import Graph
from kingpost.core.ingest import from_table
from kingpost.core.insight.node import look, place
from kingpost.core.measures.base import Settings
from kingpost.core.result import Bound, BoundKind, Refusal, Result, Stop


@pytest.fixture
def graph() -> Graph:
    """a -> b (1), a -> c (3), b -> c (2), c -> a (5), d -> c (2), c -> c (1)."""
    return from_table(
        pa.table(
            {
                "source": ["a", "a", "b", "c", "d", "c"],
                "target": ["b", "c", "c", "a", "c", "c"],
                "weight": [1.0, 3.0, 2.0, 5.0, 2.0, 1.0],
            }
        )
    )


def result(scores: list[float], name: str = "made", **about: object) -> Result:
    given: dict[str, object] = {
        "stop": Stop.CONVERGED,
        "reason": "",
        "bound": Bound(BoundKind.COMPONENTWISE, 1e-9, relative=1e-9),
    }
    return Result(name, Settings(), scores=np.array(scores), **(given | about))  # type: ignore[arg-type]


def refused(name: str) -> Result:
    none = Bound(BoundKind.NONE, math.nan)
    refusal = Refusal("there is none", "use another")
    return result([math.nan] * 4, name, stop=Stop.REFUSED, bound=none, refusal=refusal)


def test_neighbours_with_weights_shares_and_ranks(graph: Graph) -> None:
    view = look(graph, 2, {"made": result([4.0, 3.0, 5.0, 1.0])}, "made")
    assert (view.label, view.in_degree, view.out_degree) == ("c", 4, 2)
    assert (view.in_strength, view.out_strength) == (8.0, 6.0)
    found = [(n.label, n.weight, n.share, n.rank) for n in view.inward]
    # b and d weigh the same; b ranks higher.
    assert found == [
        ("a", 3.0, 3 / 8, 2),
        ("b", 2.0, 0.25, 3),
        ("d", 2.0, 0.25, 4),
        ("c", 1.0, 1 / 8, 1),
    ]
    assert [(n.label, n.weight) for n in view.outward] == [("a", 5.0), ("c", 1.0)]


def test_a_limit_cuts_lists_but_not_counts(graph: Graph) -> None:
    view = look(graph, 2, {"made": result([4.0, 3.0, 5.0, 1.0])}, "made", 2)
    assert [n.label for n in view.inward] == ["a", "b"]
    assert view.in_degree == 4


def test_ranges_cover_what_the_bound_leaves_open() -> None:
    loose = result([4.0, 3.9, 1.0, 0.0], bound=Bound(BoundKind.L1, 0.2, absolute=0.2))
    first, low = place(loose, 0), place(loose, 3)
    assert (first.rank, first.low, first.high) == (1, 1, 2)
    assert (first.score_low, first.score_high) == (3.8, 4.2)
    assert first.ranked
    assert not low.ranked


def test_a_zero_by_structure_is_known_exactly() -> None:
    zero = np.array([False, False, False, True])
    found = place(result([4.0, 3.0, 1.0, 0.0], exact_zero=zero), 3)
    assert (found.score_low, found.score_high, found.rank) == (0.0, 0.0, 4)


def test_a_refusal_is_told_in_words_and_leaves_neighbours_unranked(graph: Graph) -> None:
    results = {"odd": refused("odd"), "made": result([4.0, 3.0, 5.0, 1.0])}
    view = look(graph, 0, results, "odd")
    assert view.places[0].refusal == "there is none; use another"
    assert view.places[0].rank is None
    assert {n.rank for n in view.inward + view.outward} == {None}
    text = node_text(graph, view, "along", 80)
    assert "odd: no answer. there is none; use another" in text
    answer = node_json(view, results)
    assert answer["measures"]["odd"]["refused"] == "there is none; use another"
    assert answer["measures"]["made"]["rank"] == 2


SNAPSHOT = """\
table  4 nodes  6 edges  score flows along source -> target
node c

  measure  rank  of  score
  made        1   4  5.000000
  odd: no answer. there is none; use another

pointing at it: 4 nodes, weight 8 in all
  node  weight  share  made rank
  a          3  37.5%          2
  b          2  25.0%          3
  2 more (--top N, --top all)

it points at: 2 nodes, weight 6 in all
  node  weight  share  made rank
  a          5  83.3%          2
  c          1  16.7%          1
"""


def test_text(graph: Graph) -> None:
    results = {"made": result([4.0, 3.0, 5.0, 1.0]), "odd": refused("odd")}
    assert node_text(graph, look(graph, 2, results, "made", 2), "along", 80) == SNAPSHOT
