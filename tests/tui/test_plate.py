"""The plate of a node, the drawing of its neighbourhood, and ways, without a screen."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core.insight.nearby import Nearby, nearby
from kingpost.tui.models.outline import columns, outline, strands
from kingpost.tui.models.plate import plate
from kingpost.tui.models.ways import Steps, course_words, targets, ways
from kingpost.tui.terminal import ASCII, UNICODE

SCORES = [0.1, 0.4, 0.9, 0.3, 0.2, 0.1]


def test_the_neighbourhood_is_the_induced_subgraph(graph, make_result):
    # gate (2) is fed by berth, fare, kiosk, quay and gives to kiosk, which stands above.
    near = nearby(graph, make_result(graph, SCORES), 2)
    assert set(near.above) == {0, 1, 3, 4}
    assert near.below == ()
    assert near.edges == ((0, 1), (0, 2), (1, 2), (2, 3), (3, 2), (4, 1), (4, 2))
    assert near.left_out == 0


def test_the_strongest_stay_where_there_are_too_many(make_graph, make_result):
    names = [f"n{i:02d}" for i in range(61)]
    edges = [(i, 0, float(i)) for i in range(1, 31)] + [(0, i, float(i)) for i in range(31, 61)]
    graph = make_graph(names, edges)
    near = nearby(graph, make_result(graph, [1.0] * 61, measure="katz", alpha=0.1), 0, 11)
    assert near.above == (30, 29, 28, 27, 26)
    assert near.below == (60, 59, 58, 57, 56)
    assert near.left_out == 50
    # Few on one side leave their room to the other.
    few = make_graph(names[:6], [(1, 0, 1.0), *((0, i, 1.0) for i in range(2, 6))])
    assert nearby(few, make_result(few, [1.0] * 6), 0, 5).below == (2, 3, 4)


def test_a_drawing_by_hand():
    # Rows: a, b give to c; c gives to d; a gives to b; b gives to d.
    near = Nearby(2, (0, 1), (3,), ((0, 1), (0, 2), (1, 2), (1, 3), (2, 3)), frozenset(), 0)
    drawn = outline(near, 40, UNICODE)
    assert drawn.lines == (
        "·●···●",
        "·●···◀·●",
        "·◀·●   │",
        "···◀···◀",
    )
    assert outline(near, 40, ASCII).lines[1] == ".o...<.o"
    narrow = outline(near, 6)
    assert narrow.hidden == 1
    assert all(len(line) <= 6 for line in narrow.lines)


@st.composite
def neighbourhoods(draw):
    above, below = draw(st.integers(0, 6)), draw(st.integers(0, 6))
    n = above + 1 + below
    order = draw(st.permutations(range(n)))
    ends = st.integers(0, n - 1)
    pairs = draw(st.sets(st.tuples(ends, ends).filter(lambda p: p[0] != p[1]), max_size=30))
    edges = tuple(sorted(pairs))
    return Nearby(order[above], order[:above], order[above + 1 :], edges, frozenset(), 0)


@given(neighbourhoods())
def test_every_edge_can_be_read_off_the_drawing(near):
    near = Nearby(near.centre, tuple(near.above), tuple(near.below), near.edges, near.loops, 0)
    drawn = outline(near, 1_000)
    assert drawn.hidden == 0
    read = set()
    for x in range(1, max(map(len, drawn.lines), default=0), 2):
        cells = [line[x] if x < len(line) else " " for line in drawn.lines]
        # A line runs from its first mark to its last; empty or crossing cells part them.
        runs, run = [], []
        for row, cell in enumerate([*cells, " "]):
            if cell in " ·":
                if run:
                    runs.append(run)
                run = []
            else:
                run.append((row, cell))
        assert all(run[0][1] != "│" and run[-1][1] != "│" for run in runs)
        for run in runs:
            givers = [row for row, cell in run if cell == "●"]
            takers = [row for row, cell in run if cell == "◀"]
            assert min(len(givers), len(takers)) == 1
            read |= {(near.rows[a], near.rows[b]) for a in givers for b in takers}
    assert read == set(near.edges)


@given(neighbourhoods())
def test_strands_hold_every_edge_and_never_overlap(near):
    near = Nearby(near.centre, tuple(near.above), tuple(near.below), near.edges, near.loops, 0)
    found = strands(near)
    rows = near.rows
    read = {(rows[a], rows[b]) for s in found for a in s.givers for b in s.takers}
    assert read == set(near.edges)
    assert all(min(len(s.givers), len(s.takers)) == 1 for s in found)
    places = columns(found)
    for i, a in enumerate(found):
        for j, b in enumerate(found[:i]):
            assert places[i] != places[j] or a.foot + 1 < b.top or b.foot + 1 < a.top


def test_a_plate_says_everything(graph, make_result):
    result = make_result(graph, SCORES, error=0.01)
    other = make_result(graph, SCORES[::-1], measure="mirror")
    rows = plate(graph, result, [("P", result), ("M", other)], 1, 80).rows
    told = {row.name: row.text for row in rows}
    assert told["P plain"] == "rank 2 of 6   score 0.40 ~   at most 1.0e-02 off"
    assert told["M mirror"].startswith("rank 4 of 6   score 0.200   at most 0.0e+00 off")
    assert (told["team"], told["tier"]) == ("(none)", "1")
    assert {row.node for row in rows} == {None, 0, 1, 2, 4}


def test_a_plate_of_a_node_that_stands_alone(make_graph, make_result):
    graph = make_graph(["a", "b"], [])
    rows = plate(graph, make_result(graph, [1.0, 1.0]), [], 0, 80).rows
    assert "stands alone" in rows[-1].text


# ---- ways ------------------------------------------------------------------------------------


def test_ways_both_ways_and_either(graph, make_graph, make_result):
    found = ways(graph, 4, 3)  # quay -> gate -> kiosk; nothing leads to quay
    assert [(way.course, way.nodes) for way in found] == [("along", (4, 2, 3))]
    assert course_words(found[0]) == "2 steps along the edges"
    found = ways(graph, 5, 4)  # ticket -> berth -> fare or gate <- quay
    assert [(way.course, way.edges) for way in found] == [("either", 3)]
    steps = Steps(graph, make_result(graph, SCORES), found[0])
    assert [[c.text(row) for c in steps.head] for row in (0, 3)] == [
        ["0", "ticket", "starts", "5-6"],
        ["3", "quay", "back by 5", "4"],
    ]
    assert ways(make_graph(["a", "b"], []), 0, 1) == []


@pytest.mark.parametrize(
    ("text", "nodes"), [("gate", (2,)), ("K", (3, 5)), ("t", (0, 2, 5)), ("zz", ())]
)
def test_names_that_a_text_leads_to(graph, text, nodes):
    assert targets(graph, text).nodes == nodes


def test_many_names_are_counted(make_graph):
    graph = make_graph([f"n{i:03d}" for i in range(250)], [])
    found = targets(graph, "n")
    assert (len(found.nodes), found.more) == (100, 150)
    assert np.all(np.diff(found.nodes) == 1)
