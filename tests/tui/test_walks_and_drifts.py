"""A walk from a node, and the drift between two tables, as models of the screen."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import InputError, Interrupted, KingpostError
from kingpost.core.ingest import LoadOptions
from kingpost.core.measures import measure
from kingpost.core.open import open_graph
from kingpost.core.watch import Watch
from kingpost.tui.models import drifts, walks
from kingpost.tui.models.answers import NOWHERE
from kingpost.tui.terminal import ASCII


def cells(page, row):
    return [column.text(row) for column in page.listing.head]


def lines(grid):
    return ["".join(char for char, _ in row) for row in grid]


def test_the_chance_at_the_start_is_that_of_dense_powers(graph):
    answer = walks.walk_answer(graph, 2, 0.8, "along")
    dense = np.full((graph.n, graph.n), 0.0)
    for node in range(graph.n):
        near, weights = graph.outward.row(node)
        dense[node, near] = weights / weights.sum()
    dense = 0.8 * dense + 0.2 / graph.n
    page = answer.pages[0]
    assert page.listing.count == walks.STEPS + 1
    p = np.eye(graph.n)[2]
    lasting = np.linalg.matrix_power(dense, 500)[0]
    for step in range(walks.STEPS + 1):
        shown = cells(page, step)
        assert shown[0] == str(step)
        assert shown[1] == walks.share(0.5 * float(np.abs(p - lasting).sum()))
        assert shown[2] == walks.share(float(p[2]))
        assert page.listing.node(step) == int(np.argmax(p))
        p = p @ dense
    assert "mixed after" in page.words(0)
    grid = lines(page.draw(60, 12, ASCII, 0))
    assert grid[0][10] in "xo"  # both begin at 1 or near it


def test_places_and_modes_of_a_walk_that_goes_round(make_graph):
    graph = make_graph(list("abc"), [(0, 1, 1.0), (1, 2, 1.0), (2, 0, 1.0)])
    answer = walks.walk_answer(graph, 0, 1.0, "along")
    assert [page.name for page in answer.pages] == ["steps", "places", "modes", "in words"]
    steps, places, modes, words = answer.pages
    assert [graph.label(places.listing.node(row)) for row in range(4)] == ["a", "b", "c", "a"]
    assert cells(places, 1)[1:] == ["b", walks.bar(1.0, 10), "1.0000", "0.3333"]
    assert "multiples of 3" in steps.words(0)
    assert cells(modes, 0)[0] == "1.000000"  # the cube roots of one
    assert {row.name for row in words.rows} >= {"walker", "mixing", "reach", "caution"}
    assert answer.caution.startswith("A walker is a model")


def test_a_walk_that_ends_or_goes_against_the_edges(graph):
    answer = walks.walk_answer(
        graph, 3, 1.0, "against"
    )  # kiosk <- gate <- berth, fare, kiosk, quay
    held = {
        graph.label(answer.pages[1].listing.node(row))
        for row in range(answer.pages[1].listing.count)
    }
    assert {"kiosk", "gate", "fare"} <= held
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        walks.walk_answer(graph, 3, 1.0, "along", watch=watch)


# ---- drift -------------------------------------------------------------------------------------

BEFORE = [("a", "hub", 9.0), ("b", "hub", 8.0), ("c", "spare", 1.0), ("c", "old", 3.0)]
AFTER = [("a", "spare", 9.0), ("b", "spare", 8.0), ("c", "hub", 1.0), ("c", "fresh", 3.0)]


@pytest.fixture
def tables(tmp_path):
    paths = []
    for name, rows in (("before", BEFORE), ("after", AFTER)):
        source, target, weight = zip(*rows, strict=True)
        path = tmp_path / f"{name}.parquet"
        pq.write_table(pa.table({"source": source, "target": target, "weight": weight}), path)
        paths.append(str(path))
    return paths


def drifted(here, other, later=True, name="degree", **settings):
    graph = open_graph([here], options=LoadOptions(), store=False)
    chosen = measure(name)
    result = chosen.rank(graph, chosen.settings(**settings), Watch())
    found = drifts.Other(other, {}, later)
    return graph, drifts.drift_answer(graph, result, found, chosen, Watch(), store=False)


def test_risen_fallen_new_and_gone(tables):
    graph, answer = drifted(*tables)
    assert answer.head == "drift of degree from before.parquet to after.parquet"
    risen, fallen, new, gone, words = answer.pages
    # In-strengths before: hub 17, old 3, spare 1; after: spare 17, fresh 3, hub 1.
    assert cells(risen, 0) == ["spare", "3", "1", "3.00x", "1", "17"]
    assert cells(fallen, 0) == ["hub", "1", "3", "3.00x", "17", "1"]
    assert cells(new, 0) == ["fresh", "2", "3"]
    assert cells(gone, 0) == ["old", "2", "3"]
    assert [page.listing.count for page in (risen, fallen, new, gone)] == [1, 1, 1, 1]
    assert graph.label(risen.listing.node(0)) == "spare"
    assert graph.label(gone.listing.node(0)) == "old"
    assert new.listing.node(0) == NOWHERE  # this table does not have it
    assert risen.words(0).startswith("spare rose from rank 3 to 1; of what it gained, ")
    assert "from a, whose edge is new" in risen.words(0)
    assert "1 risen, 1 fallen, 1 new, 1 gone; 3 the same" in words.rows[0].text


def test_the_other_table_may_be_the_earlier_one(tables):
    before, after = tables
    graph, answer = drifted(after, before, later=False)
    assert answer.head == "drift of degree from before.parquet to after.parquet"
    assert cells(answer.pages[0], 0) == ["spare", "3", "1", "3.00x", "1", "17"]
    assert graph.label(answer.pages[2].listing.node(0)) == "fresh"
    assert answer.pages[3].listing.node(0) == NOWHERE


def test_a_table_against_itself_has_not_changed(tables):
    _, answer = drifted(tables[0], tables[0])
    assert [page.listing.count for page in answer.pages[:4]] == [0, 0, 0, 0]
    assert answer.pages[0].empty == "no node is risen"


def test_what_cannot_be_compared_is_a_sentence(tables, tmp_path):
    with pytest.raises(KingpostError, match="missing"):
        drifted(tables[0], str(tmp_path / "missing.parquet"))
    numbers = tmp_path / "numbers.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 3]}), numbers)
    with pytest.raises(InputError, match="ids"):
        drifted(tables[0], str(numbers))


def test_tables_beside_it_are_offered(tables, tmp_path):
    (tmp_path / "notes.txt").write_text("no table")
    assert drifts.beside([tables[0]]) == [tables[1]]
    with pytest.raises(InputError):
        drifts.beside([str(tmp_path / "gone" / "x.parquet")])
