"""pack, shelf, --no-store, and what every command says about what is kept."""

from __future__ import annotations

import json
import os
import re
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result
from keeping import EDGES

from kingpost.tui.cli import cli


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words], env={"COLUMNS": "100"})


@pytest.fixture
def calls(tmp_path: Path) -> Path:
    path = tmp_path / "calls.parquet"
    pq.write_table(pa.table(EDGES), path)
    return path


def shelf() -> Path:
    return Path(os.environ["KINGPOST_CACHE_DIR"]) / "shelf"


def lasting(text: str) -> str:
    return " ".join(word for word in text.replace("\n  ", " ").split() if "─" not in word)


def test_the_second_answer_comes_from_the_store_and_says_so(calls: Path) -> None:
    first, second = run("rank", calls), run("rank", calls)
    assert "from the store" not in first.stdout
    before, said, after = lasting(second.stdout).partition("; from the store, solved on ")
    assert said
    assert after[:2] == "20"
    assert f"{before} {after.partition(' ')[2]}" == lasting(first.stdout)
    assert second.stderr == first.stderr  # notes about the table are repeated


def test_json_says_when_it_was_solved(calls: Path) -> None:
    answers = [json.loads(run("rank", calls, "--format", "json").stdout) for _ in range(2)]
    stamps = [answer["solve"].pop("from_store_solved_on") for answer in answers]
    assert stamps[0] is None
    assert stamps[1].endswith("Z")
    for answer in answers:
        answer["solve"].pop("seconds")
    assert answers[0] == answers[1]


def test_the_log_of_a_kept_result_is_its_log(calls: Path, tmp_path: Path) -> None:
    for name in ("a.csv", "b.csv"):
        assert run("rank", calls, "--log", tmp_path / name).exit_code == 0
    assert (tmp_path / "a.csv").read_bytes() == (tmp_path / "b.csv").read_bytes()


@pytest.mark.parametrize(
    "words",
    [
        ["rank"],
        ["audit"],
        ["node", "a"],
        ["why", "a", "--than", "b"],
        ["agree"],
        ["drift"],
        [""],
    ],
)
def test_no_store_writes_and_reads_nothing(calls: Path, words: list[str]) -> None:
    command, *rest = words
    given = [calls, calls] if command == "drift" else [calls, *rest]
    line = [*([command] if command else []), *given, "--no-store"]
    assert run(*line).exit_code == 0, run(*line).stderr
    assert not shelf().exists()
    assert run(*line[:-1]).exit_code == 0
    assert shelf().exists()
    assert "from the store" not in run(*line).stdout


def test_a_shelf_that_cannot_be_written_costs_a_sentence(calls: Path) -> None:
    plain = run("rank", calls, "--no-store")
    shelf().parent.mkdir()
    shelf().write_text("in the way")
    done = run("rank", calls)
    assert done.exit_code == 0
    assert done.stdout == plain.stdout
    (note,) = set(done.stderr.splitlines()) - set(plain.stderr.splitlines())
    assert note.startswith("kingpost: note: ")
    assert "cannot be written to" in note


def test_a_damaged_store_costs_a_sentence(calls: Path) -> None:
    first = run("rank", calls)
    for path in shelf().rglob("*.arrow"):
        path.write_bytes(path.read_bytes()[:-1])
    done = run("rank", calls)
    assert done.stdout == first.stdout
    (note,) = set(done.stderr.splitlines()) - set(first.stderr.splitlines())
    assert "the kept copy of this graph is not used, the table is read anew" in note


def test_pack_and_open(calls: Path, tmp_path: Path) -> None:
    assert run("rank", calls).exit_code == 0
    done = run("pack", calls, "--out", tmp_path / "calls.pack")
    assert done.exit_code == 0, done.stderr
    assert done.stdout.startswith("packed calls.parquet into ")
    assert done.stdout.endswith("7 nodes, 8 edges, 1 result\n")
    audit = run("audit", calls).stdout
    rows = json.loads(run("rank", calls, "--format", "json").stdout)["rows"]
    calls.unlink()
    pack = tmp_path / "calls.pack"
    again = json.loads(run("rank", pack, "--format", "json").stdout)
    assert again["rows"] == rows
    assert again["solve"]["from_store_solved_on"] is not None
    # Nothing is said of the memory that loading takes: a pack is not loaded.
    rest = re.sub(r"\nMemory\n.*?\n(?=\n)", "", audit, flags=re.DOTALL)
    assert rest != audit
    assert run("audit", pack).stdout == rest
    assert run("node", pack, "a").exit_code == 0
    assert run("drift", pack, pack).exit_code == 0


def test_pack_refuses_in_a_sentence(calls: Path, tmp_path: Path) -> None:
    for words, said in (
        (["pack", calls], "--out"),
        (["pack", calls, "--out", calls], "is a file"),
        (["pack", calls, "--out", tmp_path], "holds other things"),
        (["pack", tmp_path / "none", "--out", tmp_path / "p"], "there is no file"),
    ):
        done = run(*words)
        assert done.exit_code == 2
        assert said in done.stderr
        assert len(done.stderr.splitlines()) == 1
    run("pack", calls, "--out", tmp_path / "p")
    done = run("rank", tmp_path / "p", "--undirected")
    assert done.exit_code == 2
    assert "is a pack, made with directed=True" in done.stderr


def test_shelf_lists_sizes_and_clears(calls: Path) -> None:
    empty = run("shelf")
    assert empty.exit_code == 0
    assert empty.stdout.startswith("0 graphs, 0 results, 0 bytes in ")
    run("rank", calls)
    run("rank", calls, "--measure", "katz", "--alpha-fraction", "0.5")
    run("rank", calls, "--undirected", "--measure", "degree")
    text = run("shelf").stdout
    assert text.startswith("2 graphs, 3 results, ")
    assert "at most 20.0 GB are kept; what was used longest ago goes first" in lasting(text)
    for words in ("calls.parquet", "7 nodes, 8 edges", "surfer", "katz alpha_fraction=0.5"):
        assert words in text
    facts = json.loads(run("shelf", "--format", "json").stdout)
    sizes = [path.stat().st_size for path in shelf().rglob("*") if path.is_file()]
    assert facts["bytes"] == sum(sizes) == sum(entry["bytes"] for entry in facts["entries"])
    assert facts["limit_bytes"] == 20 * 10**9
    assert {entry["kind"] for entry in facts["entries"]} == {"graph", "result"}
    assert facts["entries"][0]["inputs"] == [str(calls)]
    key = facts["entries"][0]["key"]
    assert run("shelf", key[:8]).stdout.startswith("1 graph, ")
    done = run("shelf", "--clear", key[:8])
    assert done.stdout.startswith("taken away: 1 graph, ")
    assert run("shelf").stdout.startswith("1 graph, ")
    wrong = run("shelf", "--clear", "nobody")
    assert wrong.exit_code == 2
    assert "nothing on the shelf is called nobody" in wrong.stderr
    assert json.loads(run("shelf", "--clear", "--format", "json").stdout)["cleared"]
    assert run("shelf").stdout.startswith("0 graphs, 0 results")
    assert run("rank", calls).exit_code == 0


def test_shelf_shows_what_is_damaged_and_hides_what_could_act(calls: Path, tmp_path: Path) -> None:
    hostile = tmp_path / "\x1b[31mred.parquet"
    calls.rename(hostile)
    run("rank", hostile)
    assert "\x1b" not in run("shelf").stdout
    assert "\\e[31mred.parquet" in run("shelf").stdout
    for path in shelf().rglob("manifest.json"):
        path.write_text("{")
    text = run("shelf").stdout
    assert text.count("(damaged)") == 2
    assert run("shelf", "--clear").stdout.startswith("taken away: 1 graph, 1 result")
