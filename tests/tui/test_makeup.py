"""The makeup of a graph: degrees drawn, components listed, pages of words, without a screen."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kingpost.core.insight.spectrum import spectrum
from kingpost.core.watch import Watch
from kingpost.tui.models import makeup
from kingpost.tui.models.pairs import Row, wrapped
from kingpost.tui.terminal import ASCII

SCORES = [0.1, 0.4, 0.9, 0.3, 0.2, 0.1]


@given(st.lists(st.integers(0, 30), max_size=40), st.floats(0.5, 31.0))
def test_a_tail_counts_nodes_with_at_least_so_many(degrees, asked):
    tail = makeup.tail_of("in", np.array(degrees, dtype=np.int64))
    assert tail.none == degrees.count(0)
    assert tail.at_least(asked) == sum(degree >= asked for degree in degrees)


def test_a_drawing_of_a_power_law_is_a_straight_line():
    # 1,000 / k nodes with at least k neighbours, k = 1, 10, 100, 1,000: slope -1 on these axes.
    degrees = np.repeat([1, 10, 100, 1_000], [900, 90, 9, 1])
    rows = makeup.degree_chart([makeup.tail_of("in", degrees)], 1_000, 43, 12, ASCII)
    lines = ["".join(char for char, _ in row) for row in rows]
    assert len(lines) == 12
    assert all(len(line) == 43 for line in lines)
    assert lines[0].startswith("   1,000 |o")
    assert lines[9].startswith("       1 |")
    # A step ends where the degree is reached: after 0, 1, 2 and 3 thirds of the axis.
    assert [lines[row][10:42].rfind("o") for row in (0, 3, 6, 9)] == [0, 10, 20, 31]
    assert lines[11].split() == ["1", "10", "100", "1,000"]


def test_nothing_to_draw_and_little_room(make_graph):
    empty = make_graph(["a", "b"], [])
    for width, height in ((80, 20), (12, 3), (0, 0)):
        rows = makeup.degree_chart(makeup.tails(empty), 2, width, height)
        assert len(rows) == height
        assert all(len(row) == width for row in rows)


def test_degrees_in_words(graph):
    rows = makeup.degree_rows(makeup.tails(graph), graph.n)
    # In-degrees 1 2 4 1 0 0, out-degrees 2 1 1 1 2 1.
    assert rows[0].text == (
        "2 nodes have none, half at least 1, a tenth at least 4, a hundredth at least 4, "
        "the highest 4"
    )
    assert rows[1].text.startswith("0 nodes have none, half at least 1, a tenth at least 2")


@settings(deadline=None)  # compiling the loops takes its time
@given(st.data())
def test_components_are_those_networkx_finds(make_graph, make_result, data):
    n = data.draw(st.integers(1, 9))
    ends = st.integers(0, n - 1)
    edges = [(u, v, 1.0) for u, v in sorted(data.draw(st.sets(st.tuples(ends, ends), max_size=14)))]
    graph = make_graph([f"n{i}" for i in range(n)], edges)
    scores = data.draw(st.lists(st.integers(0, 5), min_size=n, max_size=n))
    result = make_result(graph, scores)
    other = nx.DiGraph()
    other.add_nodes_from(range(n))
    other.add_weighted_edges_from(edges)
    for make, find in (
        (makeup.strong_parts, nx.strongly_connected_components),
        (makeup.weak_parts, nx.weakly_connected_components),
    ):
        parts = make(graph, result, Watch())
        found = [frozenset(parts.members(row).tolist()) for row in range(parts.count)]
        assert set(found) == {frozenset(part) for part in find(other)}
        assert [part.nodes for part in parts.parts] == sorted(map(len, found), reverse=True)
        for part, members in zip(parts.parts, found, strict=True):
            assert part.edges == other.subgraph(members).number_of_edges()
            assert part.first == min(members, key=lambda node: (-scores[node], node))
        assert parts.total == len(found)
        assert parts.singles == sum(len(members) == 1 for members in found)


def test_many_components_are_cut_short(make_graph, monkeypatch):
    monkeypatch.setattr(makeup, "MOST_PARTS", 3)
    graph = make_graph(["a", "b", "c", "d", "e"], [(0, 1, 1.0), (1, 0, 1.0)])
    parts = makeup.strong_parts(graph, None, Watch())
    assert parts.words == "4 strong components, 3 of one node, the largest 3 listed"
    assert [part.nodes for part in parts.parts] == [2, 1, 1]


def test_a_graph_of_nothing(make_graph):
    graph = make_graph(["a"], [])
    assert makeup.strong_parts(graph, None, Watch()).words == "1 strong component, 1 of one node"
    assert makeup.ingest_rows(graph)[0].title


def test_rows_read_say_how(graph):
    told = {row.name: row.text for row in makeup.ingest_rows(graph)}
    assert told["edge"] == "caller -> callee"
    assert told["weight"] == "calls"
    assert told["file"] == "hand_made.parquet"


def test_the_spectrum_in_words(graph):
    # The cycle gate <-> kiosk weighs 1 and 6: eigenvalues +-sqrt 6, the rest 0.
    told = {row.name: row.text for row in makeup.spectrum_rows(spectrum(graph, "eigenvector"))}
    assert told["eigenvalue 1"].startswith(f"{6**0.5:.9g}"[:8])
    assert told["eigenvalue 2"].startswith("-2.449")
    assert told["zeros"].startswith("4 more are 0")


@pytest.mark.parametrize("width", [40, 80])
def test_long_sayings_take_several_rows(width):
    rows = wrapped([Row("name", "word " * 40), Row("x", "short")], width)
    assert " ".join(row.text for row in rows if row.text != "short").split() == ["word"] * 40
    assert max(len(row.text) for row in rows) <= width - 12
    assert [row.name for row in rows].count("name") == 1
