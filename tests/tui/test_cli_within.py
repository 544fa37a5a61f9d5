"""``rank --within`` and ``--spreadsheet-safe`` as a shell sees them."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
REEF = (SAMPLES / "reef_citations.parquet", "--nodes", SAMPLES / "reef_papers.parquet")
HARBOUR = (SAMPLES / "harbour_calls.parquet", "--nodes", SAMPLES / "harbour_services.parquet",
           "--weight", "calls_per_min")  # fmt: skip


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def test_ranks_within_years_in_every_format(tmp_path: Path) -> None:
    words = ("rank", *REEF, "--within", "year", "--top", "5")
    done = run(*words)
    assert done.exit_code == 0, done.stderr
    assert "among peers" in done.stdout
    assert "arXiv 1509.01476" in " ".join(done.stdout.split())
    answer = json.loads(run(*words, "--format", "json").stdout)
    assert answer["conventions"]["cohorts"].startswith("ranked by z")
    rows = answer["rows"]
    assert [row["rank"] for row in rows] == [1, 2, 3, 4, 5]
    assert all(row["rescaled_low"] <= row["rescaled"] <= row["rescaled_high"] for row in rows)
    assert {row["year"] for row in rows} != {rows[0]["year"]}
    text = run(*words, "--format", "csv").stdout
    assert [float(row["rescaled"]) for row in csv.DictReader(io.StringIO(text))] == [
        row["rescaled"] for row in rows
    ]
    target = tmp_path / "ranks.parquet"
    assert run(*words, "--out", target).exit_code == 0
    assert pq.read_table(target).column("peers").to_pylist() == [row["peers"] for row in rows]
    assert "among peers" in run(*words, "--format", "markdown").stdout


def test_groups_by_a_text_say_who_has_no_peers() -> None:
    done = run("rank", *HARBOUR, "--within", "team", "--top", "3")
    assert "4 without a value" in " ".join(done.stdout.split())


def test_what_does_not_go_is_one_sentence() -> None:
    for words, said in [
        (("--within", "crew"), "no node attribute is called so; there are team"),
        (("--within", "team", "--window", "9"), "numbers and dates"),
        (("--window", "9"), "--window goes with --within"),
        (("--spreadsheet-safe",), "for csv and tsv, not for table"),
    ]:
        done = run("rank", *HARBOUR, *words)
        assert done.exit_code == 2
        assert said in done.stderr.splitlines()[-1]
        assert done.stdout == ""


def test_formulas_are_made_plain_on_request_and_said(tmp_path: Path) -> None:
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": ["=1+1", "b"], "target": ["b", "@c"]}), path)
    exact = run("rank", path, "--format", "csv")
    assert '"=1+1"' in exact.stdout
    done = run("rank", path, "--format", "csv", "--spreadsheet-safe")
    assert '"\'=1+1"' in done.stdout
    assert '"\'@c"' in done.stdout
    assert '"b"' in done.stdout
    assert "2 cells begin with an apostrophe" in done.stderr
    done = run("agree", path, "--measures", "surfer,degree", "--sheet", "nodes", "--format", "csv",
               "--spreadsheet-safe")  # fmt: skip
    assert done.exit_code == 0, done.stderr
    assert '"=' not in done.stdout
