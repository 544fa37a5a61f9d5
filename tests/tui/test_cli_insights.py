"""The commands of the insights, through click's runner."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
HARBOUR = SAMPLES / "harbour_calls.parquet"
FAILOVER = SAMPLES / "harbour_calls_failover.parquet"
CALLS = ("--weight", "calls_per_min")


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def answered(*words: object) -> dict:
    done = run(*words, "--format", "json")
    assert done.exit_code == 0, done.stderr
    return json.loads(done.stdout)


def every_format(tmp_path: Path, sheet: str, *words: object) -> None:
    """csv, tsv and parquet hold the same rows as json; text has every line within the width."""
    rows = answered(*words)[sheet]
    target = tmp_path / "answer.parquet"
    assert run(*words, "--sheet", sheet, "--out", target).exit_code == 0
    table = pq.read_table(target)
    assert table.num_rows == len(rows)
    assert list(table.column_names) == list(rows[0])
    assert b"kingpost" in table.schema.metadata
    for mark, form in ((",", "csv"), ("\t", "tsv")):
        done = run(*words, "--sheet", sheet, "--format", form)
        read = list(csv.DictReader(io.StringIO(done.stdout), delimiter=mark))
        assert [row.keys() for row in read] == [row.keys() for row in rows]
        key = next(iter(rows[0]))
        assert [row[key] for row in read] == [str(row[key]) for row in rows]
    text = run(*words).stdout
    assert max(map(len, text.splitlines())) <= 100
    assert run(*words, "--format", "markdown").exit_code == 0


@pytest.fixture
def nasty(tmp_path: Path) -> Path:
    """Names that would act on a terminal or as markup."""
    table = pa.table(
        {
            "source": ["\x1b[31mred", "[bold]x[/bold]", "a\u202eb", "\x1b[31mred"],
            "target": ["[bold]x[/bold]", "a\u202eb", "\x1b[31mred", "a\u202eb"],
        }
    )
    path = tmp_path / "nasty.parquet"
    pq.write_table(table, path)
    return path


def harmless(done: Result) -> None:
    assert done.exit_code == 0, done.stderr
    assert "\x1b" not in done.stdout
    assert "\u202e" not in done.stdout


def test_agree(tmp_path: Path) -> None:
    words = ("agree", HARBOUR, *CALLS, "--measures", "surfer,katz,degree")
    found = answered(*words)
    assert [(pair["a"], pair["b"]) for pair in found["pairs"]] == [
        ("surfer", "katz"),
        ("surfer", "degree"),
        ("katz", "degree"),
    ]
    assert found["p"] == 0.98
    assert len(found["nodes"]) == 10
    assert found["nodes"][0]["surfer_rank_low"] >= 1
    every_format(tmp_path, "pairs", *words)
    every_format(tmp_path, "nodes", *words)
    text = run(*words).stdout
    assert "rank-biased overlap with p = 0.98" in text
    assert "by that count" in text


def test_agree_sets_a_refused_measure_aside(tmp_path: Path) -> None:
    path = tmp_path / "chain.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 3]}), path)
    found = answered("agree", path)
    assert "no cycle" in found["refused"]["eigenvector"]
    alone = run("agree", path, "--measures", "eigenvector,degree")
    assert alone.exit_code == 2
    assert "two measures with an answer" in alone.stderr or "two measures" in str(alone.exception)


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--measures", "surfer"], "at least two"),
        (["--measures", "surfer,surfer"], "named twice"),
        (["--measures", "surfer,pagerang"], "no measure is called"),
        (["--persistence", "1"], "between 0 and 1"),
        (["--measures", "surfer,degree", "--alpha", "0.1"], "takes no --alpha"),
        (["--age", "vintage"], "no node attribute"),
    ],
)
def test_agree_refuses_in_a_sentence(words: list[str], told: str) -> None:
    done = run("agree", HARBOUR, *words)
    assert done.exit_code == 2
    assert told in done.stderr


def test_agree_names_are_harmless(nasty: Path) -> None:
    harmless(run("agree", nasty, "--measures", "surfer,degree"))
    harmless(run("agree", nasty, "--measures", "surfer,degree", "--format", "markdown"))


def test_why(tmp_path: Path) -> None:
    words = ("why", FAILOVER, "lease-umpire", *CALLS)
    found = answered(*words)
    assert found["rank"] == [11, 11]
    assert [row["node"] for row in found["terms"][:2]] == [
        "seat-inventory-standby",
        "snapshot-replay",
    ]
    assert sum(row["amount"] for row in found["terms"]) + found["gap"] == pytest.approx(
        found["score"], abs=1e-15
    )
    assert abs(found["gap"]) <= found["gap_allowed"]
    every_format(tmp_path, "terms", *words)
    every_format(tmp_path, "paths", *words)
    assert "> seat-inventory-standby > lease-umpire" in run(*words).stdout


def test_why_than(tmp_path: Path) -> None:
    words = ("why", FAILOVER, "lease-umpire", "--than", "seat-inventory", *CALLS)
    found = answered(*words)
    assert found["proven"] is True
    assert sum(row["difference"] for row in found["terms"]) == pytest.approx(found["lead"])
    assert found["sentence"] in " ".join(run(*words).stdout.split())
    every_format(tmp_path, "terms", *words)


def test_why_refuses_in_a_sentence(tmp_path: Path, nasty: Path) -> None:
    assert "NAME" in run("why", HARBOUR).stderr
    missing = run("why", HARBOUR, "lease-umpyre")
    assert missing.exit_code == 2
    assert "lease-umpire" in missing.stderr or "lease-umpire" in str(missing.exception)
    unknown = run("why", HARBOUR, "identity", "--measure", "hits")
    assert unknown.exit_code == 2
    path = tmp_path / "chain.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 3]}), path)
    none = run("why", path, "2", "--measure", "eigenvector")
    assert none.exit_code == 3
    assert "no cycle" in none.stderr
    harmless(run("why", nasty, "[bold]x[/bold]"))
    harmless(run("why", nasty, "[bold]x[/bold]", "--than", "\x1b[31mred"))


def test_drift(tmp_path: Path) -> None:
    words = ("drift", HARBOUR, FAILOVER, *CALLS)
    found = answered(*words)
    counts = found["counts"]
    assert (counts["new"], counts["gone"]) == (1, 1)
    assert len(found["moves"]) == sum(counts.values()) - counts["same"]
    top = found["moves"][0]
    assert (top["node"], top["change"], top["rank_before_low"], top["rank_after_high"]) == (
        "seat-inventory-standby",
        "risen",
        370,
        10,
    )
    assert {row["node"] for row in found["edges"]} >= {"seat-inventory-standby", "lease-umpire"}
    every_format(tmp_path, "edges", *words)
    done = run(*words)
    text = " ".join(done.stdout.split())
    assert "lease-umpire rose from rank 324 to 11" in text
    assert "no assessment of safety" in text
    target = tmp_path / "moves.parquet"
    assert run(*words, "--out", target).exit_code == 0
    assert pq.read_table(target).num_rows == len(found["moves"])


def test_drift_refuses_in_a_sentence(tmp_path: Path, nasty: Path) -> None:
    path = tmp_path / "numbers.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 3]}), path)
    done = run("drift", path, HARBOUR)
    assert done.exit_code == 2
    assert run("drift", path, path, "--measure", "eigenvector").exit_code == 3
    assert run("drift", HARBOUR).exit_code == 2
    harmless(run("drift", nasty, nasty))
    same = answered("drift", HARBOUR, HARBOUR)
    assert same["moves"] == []


def test_trial(tmp_path: Path) -> None:
    words = ("trial", HARBOUR, *CALLS, "--without", "audit-trail")
    found = answered(*words)
    assert found["trial"]["without"] == ["audit-trail"]
    assert len(found["standings"]) == found["graph"]["nodes"] - 1
    assert found["standings"][0]["node"] == "identity"
    assert found["counts"]["risen"] == sum(row["change"] == "risen" for row in found["moves"])
    assert 0 < found["mass_moved"] < 1
    assert found["after"]["error_bound"] <= 1e-10
    every_format(tmp_path, "standings", *words)
    text = " ".join(run(*words).stdout.split())
    assert "structure, not traffic engineering" in text
    assert "follow the local change procedure" in text
    assert "trial: without audit-trail" in text
    target = tmp_path / "moves.parquet"
    assert run(*words, "--sheet", "moves", "--out", target).exit_code == 0
    assert pq.read_table(target).num_rows == len(found["moves"])


def test_trial_of_edges() -> None:
    words = ("trial", HARBOUR, *CALLS, "--measure", "katz")
    pair = ("tide-gauge-bridge", "tide-gauge-poller")
    halved = answered(*words, "--scale-edge", *pair, "0.5")
    assert halved["trial"]["edges"] == [{"source": pair[0], "target": pair[1], "factor": 0.5}]
    gone = answered(*words, "--without-edge", *pair, "--top", "5")
    assert gone["trial"]["edges"][0]["factor"] == 0
    assert len(gone["standings"]) == 5
    assert gone["mass_moved"] > halved["mass_moved"] > 0
    assert any("alpha is held" in note for note in gone["notes"])


def test_trial_of_each(tmp_path: Path) -> None:
    words = ("trial", HARBOUR, *CALLS, "--each", "3")
    found = answered(*words)
    assert [row["node"] for row in found["losses"]] == ["audit-trail", "clock-signal", "identity"]
    assert all(row["upstream"] > 300 for row in found["losses"])
    every_format(tmp_path, "losses", *words)
    every_format(tmp_path, "risers", *words)
    assert "357 nodes lose it" in " ".join(run(*words).stdout.split())


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "name what to change"),
        (["--without", "identity", "--each", "3"], "name what to change"),
        (["--without", "identitee"], "did you mean identity"),
        (["--without-edge", "identity"], "requires 2 arguments"),
        (["--without-edge", "identity", "identity"], "is not in the graph"),
        (["--scale-edge", "identity", "key-chest", "x"], "not a valid float"),
        (["--each", "2", "--sheet", "moves"], "losses and risers"),
    ],
)
def test_trial_refuses_in_a_sentence(words: list[str], told: str) -> None:
    done = run("trial", HARBOUR, *words)
    assert done.exit_code == 2
    assert told in done.stderr or told in str(done.exception)


def test_trial_of_odd_names(nasty: Path, tmp_path: Path) -> None:
    harmless(run("trial", nasty, "--without", "a\u202eb"))
    harmless(run("trial", nasty, "--without-edge", "\x1b[31mred", "[bold]x[/bold]"))
    harmless(run("trial", nasty, "--each", "3"))
    path = tmp_path / "arrows.parquet"
    names = {"source": ["-a", "a->b", "a=1"], "target": ["a->b", "a=1", "-a"]}
    pq.write_table(pa.table(names), path)
    found = answered(
        "trial", path, "--without-edge", "-a", "a->b", "--scale-edge", "a->b", "a=1", "2"
    )
    assert [edge["target"] for edge in found["trial"]["edges"]] == ["a->b", "a=1"]


def test_trial_that_leaves_no_answer(tmp_path: Path) -> None:
    path = tmp_path / "ring.parquet"
    pq.write_table(pa.table({"source": [1, 2, 3], "target": [2, 3, 1]}), path)
    done = run("trial", path, "--measure", "eigenvector", "--without", "2")
    assert done.exit_code == 3
    assert "no cycle" in done.stderr
    rows = answered("trial", path, "--measure", "eigenvector", "--each", "1")["losses"]
    assert "no cycle" in rows[0]["refused"]


def test_walk(tmp_path: Path) -> None:
    words = ("walk", HARBOUR, *CALLS, "--from", "bell-relay", "--damping", "0.9")
    found = answered(*words)
    assert [row["step"] for row in found["steps"]] == list(range(11))
    assert found["steps"][0]["most_at"] == "bell-relay"
    assert len(found["places"]) == 1 + 10 * 5
    distances = [row["distance"] for row in found["steps"]]
    assert distances == sorted(distances, reverse=True)
    assert found["mixed"] <= found["searched"] < 45  # 0.9 ** 44 < 0.01
    every_format(tmp_path, "steps", *words)
    every_format(tmp_path, "places", *words)
    assert "mixed after" in " ".join(run(*words).stdout.split())


def test_walk_of_a_small_graph_shows_its_modes(nasty: Path, tmp_path: Path) -> None:
    path = tmp_path / "ring.parquet"
    pq.write_table(pa.table({"source": [1, 2, 3, 4], "target": [2, 3, 4, 1]}), path)
    words = ("walk", path, "--from", "1", "--from", "3", "--steps", "3")
    found = answered(*words)
    assert found["period"] == 4
    assert [row["modulus"] for row in found["modes"]] == pytest.approx([1, 1, 1, 1])
    every_format(tmp_path, "modes", *words)
    text = " ".join(run(*words).stdout.split())
    assert "never mixes" in text
    assert "-1.000000" in text
    harmless(run("walk", nasty, "--from", "a\u202eb", "--dangling", "leak"))


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "'--from'"),
        (["--from", "bell-rely"], "bell-relay"),
        (["--from", "identity", "--eps", "2"], "between 0 and 1"),
        (["--from", "identity", "--steps", "0"], "a number from 1"),
        (["--from", "identity", "--damping", "1.5"], "at most 1"),
        (["--from", "identity", "--sheet", "modes"], "no sheet 'modes'"),
    ],
)
def test_walk_refuses_in_a_sentence(words: list[str], told: str) -> None:
    done = run("walk", HARBOUR, *words)
    assert done.exit_code == 2
    assert told in done.stderr or told in str(done.exception)


def test_sweep(tmp_path: Path) -> None:
    words = ("sweep", HARBOUR, *CALLS, "--over", "damping=0.5:0.99:5", "--first", "4")
    found = answered(*words)
    assert [row["leader"] for row in found["values"]] == ["identity", *["audit-trail"] * 4]
    (change,) = found["changes"]
    assert (change["before"], change["after"]) == ("identity", "audit-trail")
    assert 0.5 < change["low"] < change["high"] < 0.99
    assert change["high"] - change["low"] <= found["interval"] == pytest.approx(0.00049)
    nodes = {row["node"] for row in found["ranks"]}
    assert len(found["ranks"]) == 5 * len(nodes)
    assert set(found["always_first"]) < nodes
    for sheet in ("ranks", "values", "changes"):
        every_format(tmp_path, sheet, *words)
    text = " ".join(run(*words).stdout.split())
    assert "from identity to audit-trail" in text
    # Held against the standings of a solve of its own.
    alone = json.loads(run("rank", HARBOUR, *CALLS, "--damping", "0.99", "--format", "json").stdout)
    low = {row["node"]: row["rank_low"] for row in alone["rows"]}
    for row in found["ranks"]:
        if row["value"] == 0.99:
            assert row["rank_low"] <= low[row["node"]] <= row["rank_high"]


def test_sweep_of_choices_and_readings(nasty: Path) -> None:
    words = ("sweep", HARBOUR, *CALLS, "--measure", "degree")
    found = answered(*words, "--over", "weight-as=asis,none")
    assert [row["value"] for row in found["values"]] == ["asis", "none"]
    assert "changes" not in found
    # Read without weights every row counts, so that a pair in two rows counts twice.
    scores = {(row["value"], row["node"]): row["score"] for row in found["ranks"]}
    assert scores["none", "identity"] == 364
    counting = answered(*words, "--over", "counting=strength,edges")
    assert [row["leader"] for row in counting["values"]] == ["identity", "audit-trail"]
    harmless(run("sweep", nasty, "--over", "dangling=teleport,leak"))
    harmless(run("sweep", nasty, "--over", "teleport=a\u202eb,[bold]x[/bold]"))


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "'--over'"),
        (["--over", "damping"], "it takes NAME="),
        (["--over", "damping=0.5:1.5:3"], "--damping is 1.5"),
        (["--over", "alpha=0.1:0.2:3"], "no setting alpha to sweep"),
        (["--over", "damping=0.5:0.9:3", "--damping", "0.7"], "give it only there"),
        (["--over", "weight-as=asis,cube"], "not cube"),
        (["--over", "damping=0.5:0.9:3", "--interval", "-1"], "a number above 0"),
    ],
)
def test_sweep_refuses_in_a_sentence(words: list[str], told: str) -> None:
    done = run("sweep", HARBOUR, *words)
    assert done.exit_code == 2
    assert told in done.stderr or told in str(done.exception)
