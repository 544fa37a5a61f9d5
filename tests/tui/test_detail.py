"""The lines around the table: what they say, and that they fit."""

from __future__ import annotations

import dataclasses

import pytest
from rich.cells import cell_len

from kingpost.core.insight.contributions import contributions
from kingpost.tui.models import detail
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.terminal import UNICODE


def words(pieces):
    return "".join(text for text, _ in pieces)


@pytest.fixture
def sitting(graph, bench, make_result):
    made = Sitting(graph, "plain", names=bench.names, find=bench.find)
    made.record(make_result(graph, [1, 2, 6, 3, 2, 1], measure="plain"))
    made.record(make_result(graph, [6, 5, 4, 3, 2, 1], measure="mirror"))
    return made


def test_where_space_is_short_the_flow_is_kept_longest(graph):
    wide = words(detail.graph_line(graph, "along", 6, 120))
    assert wide == (" hand_made.parquet   6 nodes  8 edges   score flows along caller -> callee")
    short = words(detail.graph_line(graph, "against", 4, 62))
    assert short.endswith("flows against caller -> callee")
    assert "4 of 6 nodes" in short


def test_a_filter_stands_before_the_flow(graph):
    origin = dataclasses.replace(graph.origin, where="calls > 5 AND region = 'far\x1b[2J north'")
    filtered = dataclasses.replace(graph, origin=origin)
    wide = words(detail.graph_line(filtered, "along", 6, 200))
    assert "where: calls > 5 AND region = 'far\\e[2J north'  score flows along" in wide
    short = words(detail.graph_line(filtered, "along", 6, 80))
    assert "where: calls > 5 AND re" in short[:80]


def test_the_proof_is_kept_where_space_is_short(graph, sitting):
    for width in (40, 80, 120):
        line = words(detail.terms_line(graph, sitting.result, width))
        assert cell_len(line) == width
        assert line.endswith("order proven to 6 of 6")
    assert "weight calls" in line


def test_what_was_not_solved_just_now_says_so(graph, sitting):
    kept = dataclasses.replace(sitting.result, solved_on="2031-04-05T06:07:08Z")
    for width, said in ((80, "from the store; order"), (120, "solved on 2031-04-05; order")):
        line = words(detail.terms_line(graph, kept, width))
        assert cell_len(line) == width
        assert said in line
        assert line.endswith("order proven to 6 of 6")
    assert cell_len(words(detail.terms_line(graph, kept, 40))) == 40


def test_a_graph_without_weights_says_so(graph, sitting):
    bare = dataclasses.replace(graph, origin=dataclasses.replace(graph.origin, weight=None))
    assert "no weights" in words(detail.terms_line(bare, sitting.result, 120))


@pytest.mark.parametrize("width", [30, 60, 80, 120, 200])
def test_rulers_of_all_rows_stand_below_each_other(sitting, width):
    starts = set()
    for node in range(6):
        line = words(detail.ruler_line(sitting, node, width, UNICODE))
        assert cell_len(line) <= width
        starts.add(line.index("  1 "))
        assert "P" in line
        assert "M" in line
    assert len(starts) == 1


def test_supports_name_the_strongest_and_count_the_rest(graph, make_result):
    result = make_result(graph, graph.inward.strengths(), measure="degree")
    given = contributions(graph, result, 2)
    line = words(detail.supports_line(graph, given, 50, UNICODE))
    assert line.startswith(" held up by  kiosk 50% ████  ")
    assert line.endswith(" more")
    assert cell_len(line) <= 50
    full = words(detail.supports_line(graph, given, 200, UNICODE))
    assert "more" not in full
    lonely = contributions(graph, result, 5)
    assert "no neighbour gives score to it" in words(
        detail.supports_line(graph, lonely, 80, UNICODE)
    )


def test_options_have_no_dashes_on_the_screen():
    assert detail.on_screen("use --measure katz\x1b") == "use measure katz\\e"
