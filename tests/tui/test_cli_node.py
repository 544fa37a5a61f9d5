"""kingpost node and kingpost audit, through click's runner."""

from __future__ import annotations

import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.core.measures import COMPANY
from kingpost.tui.cli import cli


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


@pytest.fixture
def calls(tmp_path: Path) -> Path:
    """A cycle a, b, c with chords, fed by e; d is dangling."""
    table = pa.table(
        {
            "caller": ["a", "b", "c", "e", "e", "b", "c"],
            "callee": ["b", "c", "a", "a", "d", "d", "b"],
            "calls": [1.0, 2.0, 1.0, 3.0, 1.0, 2.0, 4.0],
        }
    )
    path = tmp_path / "calls.parquet"
    pq.write_table(table, path)
    return path


@pytest.fixture
def chain(tmp_path: Path) -> Path:
    path = tmp_path / "chain.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 3]}), path)
    return path


def test_ranks_are_those_that_rank_gives(calls: Path) -> None:
    done = run("node", calls, "b", "--format", "json")
    assert done.exit_code == 0, done.stderr
    answer = json.loads(done.stdout)
    assert list(answer["measures"]) == list(COMPANY)
    for name in COMPANY:
        rows = json.loads(run("rank", calls, "--measure", name, "--format", "json").stdout)["rows"]
        row = next(row for row in rows if row["node"] == "b")
        found = answer["measures"][name]
        assert [found[key] for key in ("rank", "rank_low", "rank_high", "score")] == [
            row[key] for key in ("rank", "rank_low", "rank_high", "score")
        ]
        assert found["score_low"] <= found["score"] <= found["score_high"]
    # By hand: 4 of 5 from c, 1 of 5 from a; 2 of 4 to c and to d.
    assert [(n["node"], n["weight"], n["share"]) for n in answer["in_neighbours"]] == [
        ("c", 4.0, 0.8),
        ("a", 1.0, 0.2),
    ]
    assert {n["node"] for n in answer["out_neighbours"]} == {"c", "d"}
    assert (answer["in_strength"], answer["out_strength"]) == (5.0, 4.0)


def test_neighbours_are_ranked_by_the_measure_asked_for(calls: Path) -> None:
    done = run("node", calls, "b", "--measure", "degree", "--format", "json")
    answer = json.loads(done.stdout)
    assert answer["leading"] == "degree"
    # By hand, strength in: a 4, b 5, c 2, d 3, e 0.
    ranks = {n["node"]: n["rank"] for n in answer["in_neighbours"] + answer["out_neighbours"]}
    assert ranks == {"a": 2, "c": 4, "d": 3}


def test_text_names_every_measure_and_both_sides(calls: Path) -> None:
    done = run("node", calls, "b")
    assert done.exit_code == 0
    for words in (*COMPANY, "pointing at it: 2 nodes", "it points at: 2 nodes", "surfer rank"):
        assert words in done.stdout, words


def test_a_measure_without_an_answer_says_so_in_words(chain: Path) -> None:
    done = run("node", chain, "2")
    assert done.exit_code == 0
    assert "eigenvector: no answer. " in done.stdout
    answer = json.loads(run("node", chain, "2", "--format", "json").stdout)
    assert answer["node"] == 2
    assert "refused" in answer["measures"]["eigenvector"]
    assert answer["measures"]["katz"]["rank"] == 2


def test_options_go_to_the_measures_that_take_them(calls: Path) -> None:
    done = run("node", calls, "b", "--damping", "0.5", "--beta", "2", "--format", "json")
    measures = json.loads(done.stdout)["measures"]
    assert measures["surfer"]["settings"]["damping"] == 0.5
    assert measures["katz"]["settings"]["beta"] == 2.0
    assert "damping" not in measures["degree"]["settings"]


def test_an_unknown_name_meets_the_nearest(tmp_path: Path) -> None:
    path = tmp_path / "names.parquet"
    pq.write_table(pa.table({"source": ["seat-inventory"], "target": ["identity"]}), path)
    done = run("node", path, "identty")
    assert done.exit_code == 2
    assert "did you mean identity?" in done.stderr


def test_a_name_with_a_dash_follows_two_dashes(tmp_path: Path) -> None:
    path = tmp_path / "dash.parquet"
    pq.write_table(pa.table({"source": ["-v"], "target": ["b"]}), path)
    done = run("node", "--format", "json", "--", path, "-v")
    assert json.loads(done.stdout)["node"] == "-v"


def test_attributes_keep_their_names(calls: Path, tmp_path: Path) -> None:
    nodes = tmp_path / "nodes.csv"
    nodes.write_text("id,team,rank\na,x,7\nb,[bold]y[/bold],8\n")
    answer = json.loads(run("node", calls, "b", "--nodes", nodes, "--format", "json").stdout)
    assert answer["attributes"] == {"team": "[bold]y[/bold]", "rank": 8}
    assert "[bold]y[/bold]" in run("node", calls, "b", "--nodes", nodes).stdout


def test_a_limit_reached_is_status_1(calls: Path) -> None:
    done = run("node", calls, "b", "--max-sweeps", 1)
    assert done.exit_code == 1
    assert "sweep limit" in done.stdout
    assert "surfer: sweep limit" in done.stderr


def test_beta_by_number_attribute_and_file(calls: Path, tmp_path: Path) -> None:
    nodes = tmp_path / "nodes.csv"
    nodes.write_text("id,base,team\na,1,x\nb,2,x\nc,3,x\nd,4,x\ne,5,x\n")
    file = tmp_path / "base.csv"
    file.write_text("id,value\na,1\nb,2\nc,3\nd,4\ne,5\n")

    def answer(*words: object) -> tuple[dict[str, float], str]:
        done = run("rank", calls, "--measure", "katz", "--format", "json", *words)
        assert done.exit_code == 0, done.stderr
        found = json.loads(done.stdout)
        return {r["node"]: r["score"] for r in found["rows"]}, found["conventions"]["beta"]

    by_name, words = answer("--nodes", nodes, "--beta", "base")
    assert "attribute base" in words
    by_file, words = answer("--beta", file)
    assert "base.csv" in words
    assert by_file == by_name
    one, _ = answer("--beta", 1)
    assert answer()[0] == one
    assert one != by_name
    wrong = run("rank", calls, "--measure", "katz", "--nodes", nodes, "--beta", "team")
    assert wrong.exit_code == 2
    assert "not a number" in wrong.stderr
    wrong = run("rank", calls, "--measure", "katz", "--beta", "inf")
    assert (wrong.exit_code, wrong.stdout) == (2, "")


def test_audit_as_text_json_and_file(calls: Path, tmp_path: Path) -> None:
    done = run("audit", calls)
    assert done.exit_code == 0
    for words in ("Table", "Rows", "Structure", "Degrees", "spectral radius", "guess"):
        assert words in done.stdout
    out = tmp_path / "audit.json"
    assert run("audit", calls, "--out", out).exit_code == 0
    structure = json.loads(out.read_text())["structure"]
    assert (structure["nodes"], structure["edges"], structure["dangling"]) == (5, 7, 1)
    low, high = structure["radius"]
    # The cycle's block has the characteristic polynomial x^3 - 8 x - 2 (by hand).
    assert low**3 - 8 * low - 2 <= 1e-9
    assert high**3 - 8 * high - 2 >= -1e-9
