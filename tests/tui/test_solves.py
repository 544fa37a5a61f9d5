"""The list of solves, two of them compared, what a solve will cost, and logs kept in files."""

from __future__ import annotations

import json
import math
import os

import pytest
from scipy.stats import kendalltau

from kingpost.core.errors import OutputError
from kingpost.core.measures import measure
from kingpost.core.measures.katz import DEFAULT_FRACTION
from kingpost.core.result import Iteration
from kingpost.tui.models.cost import (
    cost_words,
    factor_of,
    known_radius,
    plain_sweeps,
    seconds_words,
)
from kingpost.tui.models.keeping import keep_log
from kingpost.tui.models.solves import Solves, compare, differing, entries

A = [6.0, 5.0, 4.0, 3.0, 2.0, 1.0]
B = [5.0, 6.0, 4.0, 1.0, 2.0, 3.0]


def test_differences_furthest_first(graph, make_result):
    found = compare(graph, make_result(graph, A), make_result(graph, B, measure="mirror"))
    # Ranks 1..6 against 2 1 3 6 5 4: quotients 2, 2, 1, 1.5, 1, 1.5.
    assert [graph.label(found.item(row)) for row in range(6)] == [
        "berth", "fare", "kiosk", "ticket", "gate", "quay",
    ]  # fmt: skip
    texts = [[column.text(found.item(row)) for column in found.head] for row in range(3)]
    assert texts == [["berth", "1", "2", "-1"], ["fare", "2", "1", "+1"], ["kiosk", "4", "6", "-2"]]
    # scipy's tau, an independent reference.
    assert f"tau-b {kendalltau(A, B).statistic:.4f}" in found.words
    assert "33% of the nodes at the same rank" in found.words


def test_ties_have_no_distance_of_their_own(graph, make_result):
    tied = make_result(graph, [1.0] * 6)
    found = compare(graph, tied, tied)
    assert found.moved.tolist() == [0] * 6
    assert "tau-b nan" in found.words


def test_settings_that_are_not_the_usual(plain_settings):
    assert differing(plain_settings()) == ""
    changed = plain_settings(pull=0.25, flow="against", tol=1e-6)
    assert differing(changed) == "flow against, tol 1e-06, pull 0.25"


def test_the_newest_solve_stands_first(graph, make_result):
    first, second = make_result(graph, A), make_result(graph, B, measure="mirror")
    listed = Solves(entries([], [first, second]), picked=first)
    texts = [listed.head[column].text(0) for column in (0, 1, 2)]
    assert texts == ["2", "mirror", "converged"]
    assert [listed.marked(row) for row in (0, 1)] == [False, True]


# ---- cost ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("tol", "factor", "sweeps"), [(1e-10, 0.85, 142), (1e-3, 0.1, 3), (0.5, 0.9, 7), (1e-9, 0.0, 1)]
)
def test_plain_sweeps_are_the_least_that_reach_the_tolerance(tol, factor, sweeps):
    assert plain_sweeps(tol, factor) == sweeps
    assert factor**sweeps <= tol * (1 + 1e-9)
    assert sweeps == 1 or factor ** (sweeps - 1) > tol


def test_no_promise_at_a_damping_of_one():
    assert plain_sweeps(1e-10, 1.0) is None


def test_cost_of_a_surfer(graph):
    surfer = measure("surfer")
    settings = surfer.settings(damping=0.5, tol=1e-6)
    assert "not known before the strong components" in cost_words(graph, "surfer", settings)
    # The cycle gate <-> kiosk holds two of the eight edges; 0.5^20 < 1e-6 < 0.5^19.
    _ = graph.structure
    words = cost_words(graph, "surfer", settings)
    assert "2 of 8 edges lie on cycles" in words
    assert "at most 20 plain sweeps (damping 0.5), 40 edge visits" in words
    result = surfer.rank(graph, settings)
    later = cost_words(graph, "surfer", settings, result)
    assert f"the last solve took {result.sweeps:,} sweeps" in later
    assert "no number of plain sweeps" in cost_words(graph, "surfer", surfer.settings(damping=1.0))


def test_cost_of_katz_by_whatever_gives_alpha(graph):
    katz = measure("katz")
    assert factor_of("katz", katz.settings())[0] == DEFAULT_FRACTION
    assert factor_of("katz", katz.settings(alpha_fraction=-0.5))[0] == 0.5
    assert math.isnan(factor_of("katz", katz.settings(alpha=0.1))[0])
    rho = known_radius([measure("degree").rank(graph), katz.rank(graph)])
    # gate <-> kiosk with weights 1 and 6: rho is the root of 6.
    assert rho == pytest.approx(6**0.5)
    assert factor_of("katz", katz.settings(alpha=0.1), rho)[0] == pytest.approx(0.1 * 6**0.5)


def test_cost_without_cycles_and_without_iteration(make_graph):
    chain = make_graph(["a", "b", "c"], [(0, 1, 1.0), (1, 2, 1.0)])
    _ = chain.structure
    assert "no edge lies on a cycle" in cost_words(chain, "surfer", measure("surfer").settings())
    assert "one pass over the edges (2)" in cost_words(
        chain, "degree", measure("degree").settings()
    )
    assert "no prediction" in cost_words(chain, "eigenvector", measure("eigenvector").settings())


def test_seconds_in_words():
    shown = [seconds_words(s) for s in (0.01, 3.14, 45.2, 600, 10_000)]
    assert shown == ["0.1 s", "3.1 s", "45 s", "10 min", "3 h"]


# ---- logs in files ---------------------------------------------------------------------------


@pytest.fixture
def solved(graph, make_result):
    log = tuple(Iteration(i, 10.0**-i, 3 * 10.0**-i, 8 * i, i / 100) for i in (1, 2, 3))
    return make_result(graph, A, log=log)


def test_a_log_is_written_once(solved, tmp_path):
    path = tmp_path / "plain.json"
    assert keep_log(solved, f" {path} ") == str(path)
    rows = json.loads(path.read_text())
    assert [row["residual"] for row in rows] == [0.1, 0.01, 0.001]
    kept = path.read_bytes()
    with pytest.raises(OutputError, match=r"already; choose another name"):
        keep_log(solved, str(path))
    assert path.read_bytes() == kept


def test_a_link_to_nowhere_is_not_followed(solved, tmp_path):
    (tmp_path / "link.csv").symlink_to(tmp_path / "elsewhere.csv")
    with pytest.raises(OutputError, match="already"):
        keep_log(solved, str(tmp_path / "link.csv"))
    assert not (tmp_path / "elsewhere.csv").exists()


@pytest.mark.parametrize("name", ["", "log.txt", "nowhere/log.csv"])
def test_what_cannot_be_written_is_a_sentence(solved, tmp_path, monkeypatch, name):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(OutputError):
        keep_log(solved, name)
    assert os.listdir(tmp_path) == []


def test_a_full_disk_is_a_sentence(solved, tmp_path, monkeypatch):
    def full(number):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputError, match="No space left"):
        keep_log(solved, str(tmp_path / "log.csv"))
    assert os.listdir(tmp_path) == []
