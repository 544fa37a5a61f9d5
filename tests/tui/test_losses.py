"""What the loss of a node would do, as models of the screen, against solves from scratch."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

from kingpost.core.errors import SettingsError
from kingpost.core.insight.edit import edit_of, edited
from kingpost.core.measures import measure
from kingpost.core.watch import Watch
from kingpost.tui.models import losses


def solved(graph, name, **settings):
    chosen = measure(name)
    return chosen.rank(graph, chosen.settings(**settings), Watch())


def cells(page, row):
    return [column.text(row) for column in page.listing.head]


def directed(graph):
    found = nx.DiGraph()
    found.add_nodes_from(range(graph.n))
    for node in range(graph.n):
        found.add_edges_from((node, int(other)) for other in graph.outward.row(node)[0])
    return found


def test_standings_without_a_node_are_those_of_the_graph_without_it(graph):
    result = solved(graph, "surfer")
    answer = losses.loss_answer(graph, result, 0)
    assert [page.name for page in answer.pages] == ["standings", "risen", "fallen", "in words"]
    page = answer.pages[0]
    left, _ = edited(graph, edit_of(graph, [0]), Watch())
    again = solved(left, "surfer")
    shown = [graph.label(page.listing.node(row)) for row in range(page.listing.count)]
    assert len(shown) == 5
    ranks = [
        again.standing.range_of(next(i for i in range(left.n) if left.label(i) == name))
        for name in shown
    ]
    told = [cells(page, row)[2] for row in range(page.listing.count)]
    assert told == [f"{a}" if a == b else f"{a}-{b}" for a, b in ranks]
    assert [cells(page, row)[0] for row in range(5)] == shown


def test_reachability_lost_is_what_networkx_finds(graph):
    result = solved(graph, "degree")
    whole = directed(graph)
    for node in range(graph.n):
        answer = losses.loss_answer(graph, result, node)
        up, down = nx.ancestors(whole, node), nx.descendants(whole, node)
        left = whole.subgraph(set(whole) - {node})
        # Of those that reach a node on a cycle and are reached by it, both are asked.
        lost = [v for v in down if v != node and not any(
            u != node and (u == v or nx.has_path(left, u, v)) for u in up)]  # fmt: skip
        words = answer.pages[-1].rows[0].text
        several = "nodes" if len(up) != 1 else "node"
        assert words.startswith(f"{len(up):,} {several} that reach {graph.name(node)} lose it")
        told = f"{len(lost):,} can no longer be reached" if lost and up else "none is cut off"
        assert told in words


def test_the_caution_stays_in_sight_and_is_told_in_full(graph):
    answer = losses.loss_answer(graph, solved(graph, "katz"), 2)
    assert "not traffic engineering" in answer.caution
    assert "local change procedure" in answer.caution
    told = {row.name: row.text for row in answer.pages[-1].rows}
    assert "this is structure" in told["caution"]
    assert "alpha" in told  # which is held


def test_risen_and_fallen_are_listed_by_how_far(make_graph):
    # A chain a > b > c beside d > e: without a, b falls to the last and d, e rise over it.
    graph = make_graph(list("abcdef"), [(0, 1, 5.0), (3, 4, 2.0), (5, 4, 1.0), (1, 2, 1.0)])
    answer = losses.loss_answer(graph, solved(graph, "degree"), 0)
    _, risen, fallen, _ = answer.pages
    assert [cells(fallen, row)[0] for row in range(fallen.listing.count)] == ["b"]
    assert "e" in [cells(risen, row)[0] for row in range(risen.listing.count)]
    assert cells(risen, 0)[3].startswith("risen 2.00x")
    assert fallen.title == "1 node falls beyond the uncertainty"


def test_a_measure_without_an_answer_then_says_so(make_graph):
    # a and b feed each other; without a no edge lies on a cycle.
    graph = make_graph(list("abc"), [(0, 1, 1.0), (1, 0, 1.0), (1, 2, 1.0)])
    answer = losses.loss_answer(graph, solved(graph, "eigenvector"), 0)
    assert [page.name for page in answer.pages] == ["in words"]
    assert "has none then" in {row.name: row.text for row in answer.pages[0].rows}["no answer"]


def test_the_only_node_cannot_be_lost(make_graph):
    graph = make_graph(["a"], [])
    with pytest.raises(SettingsError, match="every node"):
        losses.loss_answer(graph, solved(graph, "degree"), 0)
    assert losses.losses_answer(graph, solved(graph, "degree")).pages[0].listing.count == 0


def test_losses_one_by_one_are_the_single_ones(graph):
    result = solved(graph, "surfer")
    page = losses.losses_answer(graph, result, 4).pages[0]
    assert page.listing.count == 4
    first = int(result.standing.order[0])
    assert page.listing.node(0) == first
    single = losses.loss_answer(graph, result, first)
    risen = single.pages[1].listing.count
    assert cells(page, 0)[8] == str(risen)
    assert page.words(0).startswith(f"Without {graph.name(first)} (rank 1), ")
    shares = [float(cells(page, row)[2].strip("%")) for row in range(4)]
    assert shares == [round(100 * s) for s in np.sort(result.scores)[::-1][:4]]
