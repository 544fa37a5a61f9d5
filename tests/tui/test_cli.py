"""kingpost rank through click's runner: options, formats, what they print and write."""

from __future__ import annotations

import csv
import io
import json
import math
import os
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

HOSTILE = [
    "\x1b[31mred",
    "[bold]x[/bold]",
    "\N{RIGHT-TO-LEFT OVERRIDE}txt.exe",
    "y" * 5_000,
    "\N{FERRY}",
    'a "quoted", name',
    "new\nline",
    "nul\x00",
]


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


@pytest.fixture
def calls(tmp_path: Path) -> Path:
    """A small weighted graph with a cycle (a, b, c), a dangling node (d) and a source (e)."""
    table = pa.table(
        {
            "caller": ["a", "b", "c", "e", "e", "b", "a"],
            "callee": ["b", "c", "a", "a", "d", "d", "b"],
            "calls": [1.0, 2.0, 1.0, 3.0, 1.0, 2.0, 1.0],
        }
    )
    path = tmp_path / "calls.parquet"
    pq.write_table(table, path)
    return path


@pytest.fixture
def teams(tmp_path: Path) -> Path:
    path = tmp_path / "teams.parquet"
    pq.write_table(
        pa.table(
            {
                "id": ["a", "b", "c", "d", "e"],
                "team": ["pier", "pier", "boats", None, "[b]x[/b]"],
                "base": [1.0, 2.0, 3.0, 4.0, 5.0],
            }
        ),
        path,
    )
    return path


@pytest.fixture
def hostile(tmp_path: Path) -> Path:
    path = tmp_path / "hostile.parquet"
    pq.write_table(pa.table({"source": HOSTILE, "target": HOSTILE[1:] + HOSTILE[:1]}), path)
    return path


def test_rank_prints_a_table_with_everything_needed_to_trust_it(calls: Path, teams: Path) -> None:
    done = run("rank", calls, "--nodes", teams)
    assert done.exit_code == 0, done.output
    for words in (
        "calls.parquet  5 nodes  6 edges  score flows along caller -> callee",
        "surfer  damping=0.85",
        "weight: calls",
        "converged:",
        "error at most",
        "componentwise",
        "order proven to 5 of 5",
        "conventions  ",
        "dangling nodes:",
        "[b]x[/b]",
        "proven above the next",
    ):
        assert " ".join(words.split()) in " ".join(done.stdout.split()), words  # lines may break
    assert "took caller -> callee" in done.stderr
    assert done.stderr.startswith("kingpost: note: ")


def test_a_bare_table_prints_the_standings_where_there_is_no_terminal(calls: Path) -> None:
    bare, ranked = run(calls, "--no-store"), run("rank", calls, "--no-store")
    assert bare.exit_code == 0

    def lasting(text: str) -> list[str]:
        return [line for line in text.splitlines() if "seconds" not in line]

    assert lasting(bare.stdout) == lasting(ranked.stdout)


def test_a_table_called_like_a_command_is_reached_by_its_path(
    calls: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(calls.parent)
    os.rename(calls, "rank")
    assert run("./rank").exit_code == 0
    assert run("rank", "rank").exit_code == 0
    assert run("--damping", "0.5", "./rank").exit_code == 0
    wrong = run("--damping", "0.5", "audit", "./rank")
    assert wrong.exit_code == 2
    assert "comes first" in wrong.stderr


def test_json_keys_and_values(calls: Path, teams: Path) -> None:
    done = run("rank", calls, "--nodes", teams, "--format", "json", "--top", 2)
    assert done.exit_code == 0, done.output
    answer = json.loads(done.stdout)
    assert list(answer) == [
        "input",
        "graph",
        "account",
        "measure",
        "settings",
        "conventions",
        "solve",
        "rows",
    ]
    assert list(answer["solve"]) == [
        "stop",
        "sweeps",
        "edge_visits",
        "error_bound",
        "bound_kind",
        "proven_order",
        "seconds",
        "from_store_solved_on",
    ]
    assert list(answer["solve"]["seconds"]) == ["load", "prepare", "solve"]
    assert list(answer["rows"][0]) == [
        "rank",
        "rank_low",
        "rank_high",
        "node",
        "score",
        "in_degree",
        "out_degree",
        "team",
        "base",
    ]
    assert answer["input"]["source"] == "caller"
    assert answer["account"]["rows_read"] == 7
    assert answer["account"]["merged"] == 1
    assert answer["graph"]["nodes"] == 5
    assert answer["measure"] == "surfer"
    assert answer["settings"]["damping"] == 0.85
    assert answer["solve"]["stop"] == "converged"
    assert 0 <= answer["solve"]["error_bound"] <= 1e-10
    assert answer["solve"]["seconds"]["load"] > 0
    assert len(answer["rows"]) == 2


@pytest.mark.parametrize("form", ["csv", "tsv", "json"])
def test_hostile_names_come_back_exactly_from_text(hostile: Path, form: str) -> None:
    done = CliRunner().invoke(cli, ["rank", str(hostile), "--format", form])
    assert done.exit_code == 0, done.stderr
    text = done.stdout_bytes.decode()
    if form == "json":
        names = [row["node"] for row in json.loads(text)["rows"]]
    else:
        rows = csv.DictReader(
            io.StringIO(text, newline=""), delimiter="," if form == "csv" else "\t"
        )
        names = [row["node"] for row in rows]
    assert sorted(names) == sorted(HOSTILE)


def test_hostile_names_come_back_exactly_from_parquet(hostile: Path, tmp_path: Path) -> None:
    out = tmp_path / "ranks.parquet"
    assert run("rank", hostile, "--out", out).exit_code == 0
    assert sorted(pq.read_table(out).column("node").to_pylist()) == sorted(HOSTILE)


@pytest.mark.parametrize("form", ["table", "markdown"])
def test_hostile_names_are_inert_where_they_are_read(hostile: Path, form: str) -> None:
    done = run("rank", hostile, "--format", form)
    assert done.exit_code == 0
    assert all(char.isprintable() or char == "\n" for char in done.stdout)
    assert "\\e" in done.stdout


@pytest.mark.parametrize(
    ("name", "start"),
    [
        ("a.csv", b'"rank","rank_low"'),
        ("a.tsv", b'"rank"\t"rank_low"'),
        ("a.json", b'{\n  "input"'),
        ("a.parquet", b"PAR1"),
        ("a.md", b"- calls.parquet"),
        ("a.txt", b"calls.parquet"),
    ],
)
def test_out_tells_the_format_and_leaves_nothing_else(
    calls: Path, tmp_path: Path, name: str, start: bytes
) -> None:
    folder = tmp_path / "out"
    folder.mkdir()
    done = run("rank", calls, "--out", folder / name)
    assert (done.exit_code, done.stdout) == (0, "")
    assert (folder / name).read_bytes().startswith(start)
    assert os.listdir(folder) == [name]


@pytest.mark.parametrize(("form", "rows"), [("table", 20), ("markdown", 20), ("csv", 30)])
def test_tables_are_cut_and_data_is_not(tmp_path: Path, form: str, rows: int) -> None:
    path = tmp_path / "ring.parquet"
    ids = [f"n{i:02}" for i in range(30)]
    pq.write_table(pa.table({"source": ids, "target": ids[1:] + ids[:1]}), path)
    for top, expected in ((None, rows), (7, 7), ("all", 30)):
        words = ["rank", path, "--format", form] + ([] if top is None else ["--top", top])
        done = run(*words)
        assert done.exit_code == 0
        assert len([i for i in ids if i in done.stdout]) == expected


def test_log_holds_the_sweeps(calls: Path, tmp_path: Path) -> None:
    log = tmp_path / "sweeps.csv"
    done = run("rank", calls, "--log", log, "--format", "json")
    lines = list(csv.DictReader(log.open()))
    answer = json.loads(done.stdout)
    assert int(lines[-1]["index"]) == answer["solve"]["sweeps"]
    assert int(lines[-1]["edge_visits"]) == answer["solve"]["edge_visits"]


def scores(*words: object) -> dict[str, float]:
    done = run("rank", *words, "--format", "json")
    assert done.exit_code == 0, done.stderr
    return {row["node"]: row["score"] for row in json.loads(done.stdout)["rows"]}


def test_flow_against_counts_what_a_node_points_at(calls: Path) -> None:
    # By hand: strength in is a 4, b 2, c 2, d 3, e 0; strength out a 2, b 4, c 1, d 0, e 4.
    given = scores(calls, "--measure", "degree")
    assert given == {"a": 4.0, "b": 2.0, "c": 2.0, "d": 3.0, "e": 0.0}
    given = scores(calls, "--measure", "degree", "--flow", "against")
    assert given == {"a": 2.0, "b": 4.0, "c": 1.0, "d": 0.0, "e": 4.0}
    given = scores(calls, "--measure", "degree", "--counting", "edges")
    assert given == {"a": 2.0, "b": 1.0, "c": 1.0, "d": 2.0, "e": 0.0}


def test_loading_options_reach_the_graph(calls: Path) -> None:
    # By hand, on the same seven rows.
    degree = ("--measure", "degree")
    assert scores(calls, *degree, "--parallel", "count")["b"] == 2.0
    assert scores(calls, *degree, "--parallel", "max")["b"] == 1.0
    assert scores(calls, *degree, "--weight-as", "none")["a"] == 2.0
    assert scores(calls, *degree, "--undirected")["e"] == 4.0
    inverse = scores(calls, *degree, "--weight-as", "inverse", "--parallel", "max")
    assert inverse["d"] == 1.5
    swapped = scores(calls, *degree, "--source", "callee", "--target", "caller")
    assert swapped["e"] == 4.0
    logs = scores(calls, *degree, "--weight-as", "log1p")
    assert logs["c"] == pytest.approx(math.log(3.0), rel=1e-15)


def test_teleport_by_node_and_by_file_agree_and_are_told(calls: Path, tmp_path: Path) -> None:
    by_node = scores(calls, "--teleport", "b")
    file = tmp_path / "jumps.csv"
    file.write_text("id,weight\nb,3\n")
    assert scores(calls, "--teleport", file) == by_node
    two = run("rank", calls, "--teleport", "b", "--teleport", "c", "--format", "json")
    assert "b, c" in json.loads(two.stdout)["conventions"]["teleport"]
    unknown = run("rank", calls, "--teleport", "bb")
    assert unknown.exit_code == 2
    assert "'bb'" in unknown.stderr


def test_teleport_prefers_a_node_to_a_file_of_its_name(
    calls: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    expected = scores(calls, "--teleport", "b")
    monkeypatch.chdir(calls.parent)
    Path("b").write_text("no table at all")
    assert scores(calls, "--teleport", "b") == expected


def test_every_option_is_a_settings_field_and_every_field_can_be_set() -> None:
    from dataclasses import fields

    from kingpost.core.ingest import LoadOptions
    from kingpost.core.measures import NAMES, measure
    from kingpost.tui.commands import options, rank

    known = {item.name for name in NAMES for item in fields(measure(name).settings)}
    assert set(options.SETTINGS) <= known
    declared = {parameter.name for parameter in rank.rank.params}
    assert {*options.SETTINGS, "also"} <= declared
    loading = {item.name for item in fields(LoadOptions)}
    assert loading - declared == {"directed"}


def test_ascii_where_the_locale_has_no_more(hostile: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("LC_ALL", "C")
    for form in ("table", "markdown", "json"):
        assert run("rank", hostile, "--format", form).stdout.isascii()
    monkeypatch.setenv("LC_ALL", "C.UTF-8")
    assert not run("rank", hostile).stdout.isascii()


def test_what_was_lost_is_told(calls: Path, tmp_path: Path) -> None:
    nodes = tmp_path / "some.csv"
    nodes.write_text("id,team\na,x\nzz,y\na,z\n")
    said = run("rank", calls, "--nodes", nodes).stderr
    assert "node table: 1 of 3 rows joined" in said
    assert "1 of nodes that no edge names" in said
    assert "1 repeated" in said
    assert "4 nodes without a row" in said
    bad = tmp_path / "bad.parquet"
    pq.write_table(
        pa.table({"source": ["a", None, "b"], "target": ["b", "a", "a"], "weight": [1.0, 1, -1]}),
        bad,
    )
    refused = run("rank", bad)
    assert refused.exit_code == 2
    skipped = run("rank", bad, "--bad-rows", "skip")
    assert skipped.exit_code == 0
    assert skipped.stderr.count("skipped 1 row: ") == 2


def test_a_setting_by_its_name(calls: Path) -> None:
    named = run("rank", calls, "--format", "json", "--damping", "0.5")
    told = run("rank", calls, "--format", "json", "--set", "damping=0.5")
    assert json.loads(named.stdout)["rows"] == json.loads(told.stdout)["rows"]
    for words, said in (
        ("damping", "NAME=VALUE"),
        ("damping=much", "takes a number"),
        ("max-sweeps=1.5", "takes a whole number"),
        ("nonsense=1", "no measure takes it"),
        ("counting=edges", "belongs to degree"),
    ):
        done = run("rank", calls, "--set", words)
        assert done.exit_code == 2
        assert said in done.stderr
