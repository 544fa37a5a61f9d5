"""Curves in characters, and ranks along a setting as models of the screen."""

from __future__ import annotations

import math

import networkx as nx
import pytest

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.measures import measure
from kingpost.core.watch import Watch
from kingpost.tui.models import along
from kingpost.tui.models.curves import Axes, Curve, curves_chart
from kingpost.tui.terminal import ASCII


def lines(grid):
    return ["".join(char for char, _ in row) for row in grid]


def cells(page, row):
    return [column.text(row) for column in page.listing.head]


def settings_of(name, **given):
    return measure(name).settings(**given)


def test_a_curve_of_powers_is_straight_on_a_log_axis():
    axes = Axes([0.0, 1.0, 2.0, 3.0], ["0", "1", "2", "3"], 1.0, 1_000.0, log=True)
    grid = lines(curves_chart(axes, [Curve("a", "plain", [1, 10, 100, 1_000])], 42, 12, ASCII))
    plot = [row[10:] for row in grid[:10]]
    assert [(y, row.index("a")) for y, row in enumerate(plot) if "a" in row] == [
        (0, 30), (3, 20), (6, 10), (9, 0),
    ]  # fmt: skip
    assert plot[1].strip() == "..."  # the line between
    assert grid[0].startswith("   1.00k |")
    assert grid[9].startswith("       1 |")
    assert grid[11].split() == ["0", "1", "2", "3"]


def test_rank_one_stands_at_the_top_and_the_front_over_the_others():
    axes = Axes([0.0, 1.0], ["x", "y"], 1.0, 10.0, log=True, top_low=True)
    curves = [Curve("a", "plain", [1, 10]), Curve("b", "plain", [1, 1])]
    assert lines(curves_chart(axes, curves, 30, 8, ASCII))[0][10] == "a"
    grid = curves_chart(axes, curves, 30, 8, ASCII, front=1)
    assert grid[0][10] == ("b", "cursor")


def test_what_is_not_known_leaves_a_gap():
    axes = Axes([0.0, 1.0, 2.0], ["0", "1", "2"], 0.0, 1.0)
    grid = lines(curves_chart(axes, [Curve("a", "plain", [1, math.nan, 0])], 30, 8, ASCII))
    assert sum(row.count("a") for row in grid) == 2
    assert not any("." in row[10:] for row in grid[:6])


@pytest.mark.parametrize("size", [(0, 0), (14, 4), (60, 3)])
def test_no_room_for_curves(size):
    axes = Axes([0.0, 1.0], ["x", "y"], 0.0, 1.0)
    grid = curves_chart(axes, [Curve("a", "plain", [0, 1])], *size)
    assert [len(row) for row in grid] == [size[0]] * size[1]


def test_ranks_along_the_damping_are_those_networkx_finds(graph):
    settings = settings_of("surfer")
    over = along.checked("damping=0.2:0.95:4", settings)
    answer = along.along_answer(graph, "surfer", settings, over)
    page = answer.pages[0]
    names = [cells(page, row)[1] for row in range(page.listing.count)]
    other = nx.DiGraph()
    other.add_nodes_from(graph.label(i) for i in range(graph.n))
    for node in range(graph.n):
        near, weights = graph.outward.row(node)
        for to, weight in zip(near.tolist(), weights.tolist(), strict=True):
            other.add_edge(graph.label(node), graph.label(to), weight=weight)
    for column, value in enumerate(over.values):
        scores = nx.pagerank(other, alpha=value, tol=1e-12, max_iter=1_000)
        for row, name in enumerate(names):
            better = sum(score > scores[name] + 1e-9 for score in scores.values())
            alike = sum(abs(score - scores[name]) <= 1e-9 for score in scores.values())
            told = f"{better + 1}" if alike == 1 else f"{better + 1}-{better + alike}"
            assert cells(page, row)[2 + column] == told
    assert names[0] in page.words(0)
    assert any("a" in line for line in lines(page.draw(60, 12, ASCII, 0)))


def test_choices_are_swept_and_have_no_leader_changes(graph):
    settings = settings_of("surfer")
    over = along.checked("dangling=teleport,uniform", settings)
    answer = along.along_answer(graph, "surfer", settings, over)
    assert [page.name for page in answer.pages] == ["ranks", "values", "in words"]
    assert [cells(answer.pages[1], row)[0] for row in range(2)] == ["teleport", "uniform"]
    assert lines(answer.pages[0].draw(60, 12, ASCII, 0))[-1].split() == ["teleport", "uniform"]


def test_what_is_offered_can_be_swept(graph):
    for name in ("surfer", "katz", "communicability"):
        settings = settings_of(name)
        choices = along.offered(settings)
        assert choices
        for text, _ in choices:
            assert along.checked(text, settings)
    assert along.offered(settings_of("degree")) == []


@pytest.mark.parametrize("text", ["damping", "damping=2:3:4", "steepness=1:2:3", "damping=a,b"])
def test_what_cannot_be_swept_is_a_sentence(text):
    with pytest.raises(SettingsError) as trouble:
        along.checked(text, settings_of("surfer"))
    assert "--over" not in trouble.value.sentence


def test_a_sweep_given_up_ends(graph):
    watch = Watch()
    watch.cancel()
    settings = settings_of("surfer")
    with pytest.raises(Interrupted):
        along.along_answer(
            graph, "surfer", settings, along.checked("damping=0.5,0.8", settings), watch
        )
