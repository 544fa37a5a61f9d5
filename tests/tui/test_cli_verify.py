"""``kingpost verify`` as a shell sees it."""

from __future__ import annotations

import json
from pathlib import Path

import networkx as nx
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

HARBOUR = Path(__file__).parents[2] / "sample_graphs" / "harbour_calls.parquet"
CALLS = ("--weight", "calls_per_min")


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


@pytest.fixture(scope="module")
def ranks() -> dict[str, float]:
    graph = nx.MultiDiGraph()
    for row in pq.read_table(HARBOUR).to_pylist():
        graph.add_edge(row["caller"], row["callee"], weight=row["calls_per_min"])
    return nx.pagerank(graph)


def written(path: Path, scores: dict[str, float], form: str = "{!r}") -> Path:
    lines = ["node,score", *(f"{name},{form.format(x)}" for name, x in scores.items())]
    path.write_text("\n".join(lines) + "\n")
    return path


def test_scores_of_networkx_are_named_with_a_command_that_repeats_them(
    tmp_path: Path, ranks: dict[str, float]
) -> None:
    scores = written(tmp_path / "scores.csv", ranks)
    done = run("verify", HARBOUR, scores, *CALLS)
    assert done.exit_code == 0
    text = " ".join(done.stdout.split())
    assert "these are random-surfer (PageRank) scores with damping 0.85" in text
    assert "so computes networkx.pagerank" in text
    assert "solved loosely" in text
    assert max(map(len, done.stdout.splitlines())) <= 100
    answer = json.loads(run("verify", HARBOUR, scores, *CALLS, "--format", "json").stdout)
    assert answer["verdict"] == "close"
    assert answer["parameters"] == {"damping": 0.85}
    assert answer["command"] == "--measure surfer --damping 0.85"
    assert 0 < answer["error_bound"] < 0.01
    assert answer["equations"][0]["place"] == "best"
    # The command it names gives the same scores, to the error stated.
    words = answer["command"].split()
    again = run("rank", HARBOUR, *CALLS, *words, "--format", "json", "--top", "all")
    ours = {row["node"]: row["score"] for row in json.loads(again.stdout)["rows"]}
    off = sum(abs(ours[name] - x) for name, x in ranks.items())
    assert off <= answer["error_bound"] * sum(ranks.values()) * 1.01


def test_differences_are_a_sheet_of_their_own(tmp_path: Path, ranks: dict[str, float]) -> None:
    plain = nx.DiGraph()
    plain.add_edges_from(
        (row["caller"], row["callee"]) for row in pq.read_table(HARBOUR).to_pylist()
    )
    scores = written(tmp_path / "katz.csv", nx.katz_centrality(plain, 0.01, max_iter=5000))
    words = ("verify", HARBOUR, scores, *CALLS)
    answer = json.loads(run(*words, "--format", "json").stdout)
    assert [row["choice"] for row in answer["differences"]] == ["weights", "alpha", "normalisation"]
    sheet = run(*words, "--sheet", "differences", "--format", "csv").stdout.splitlines()
    assert sheet[0] == '"choice","theirs","ours"'
    assert '"alpha","0.01","0.85/rho"' in sheet


def test_what_fits_nothing_ends_with_status_3(tmp_path: Path, ranks: dict[str, float]) -> None:
    made_up = {name: (7919 * i % 997) / 997 for i, name in enumerate(sorted(ranks))}
    done = run("verify", HARBOUR, written(tmp_path / "noise.csv", made_up), *CALLS)
    assert done.exit_code == 3
    assert "none of the" in done.stdout
    few = dict(sorted(ranks.items(), key=lambda item: -item[1])[:100])
    done = run("verify", HARBOUR, written(tmp_path / "few.csv", few), *CALLS)
    assert done.exit_code == 3
    assert "299 nodes of the table have no score" in done.stdout


def test_bad_input_is_one_sentence(tmp_path: Path, ranks: dict[str, float]) -> None:
    order = {name: i + 1 for i, name in enumerate(sorted(ranks, key=lambda name: -ranks[name]))}
    for words, said in [
        (["verify", HARBOUR], "EDGES... and then a file of SCORES"),
        (["verify", HARBOUR, tmp_path / "none.csv"], "there is no file"),
        (["verify", HARBOUR, written(tmp_path / "ranks.csv", order)], "ranks 1 to 399"),
        (["verify", HARBOUR, written(tmp_path / "x.csv", {"x": 1.5})], "none of the 399 nodes"),
        (["verify", HARBOUR, HARBOUR, "--score-column", "region"], "of type"),
    ]:
        done = run(*words, *CALLS)
        assert done.exit_code == 2, done.stdout
        assert said in done.stderr.splitlines()[-1]
        assert done.stdout == ""
