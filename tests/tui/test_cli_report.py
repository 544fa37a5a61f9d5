"""``kingpost report`` as a shell sees it."""

from __future__ import annotations

import shlex
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
HARBOUR = (SAMPLES / "harbour_calls.parquet", "--nodes", SAMPLES / "harbour_services.parquet",
           "--weight", "calls_per_min")  # fmt: skip


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def test_the_command_in_a_report_writes_the_same_report(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1700000000")
    out = tmp_path / "report.md"
    listed = tmp_path / "list.csv"
    listed.write_text("node,note\nidentity,asked about twice\n")
    words = ("--measures", "katz,degree", "--alpha-fraction", "0.5", "--shortlist", listed)
    words = (*words, "--question", "Who carries it?", "--no-store", "--threads", "1")
    done = run("report", *HARBOUR, "--out", out, *words)
    assert done.exit_code == 0, done.stderr
    first = out.read_text()
    assert first.startswith("# Who carries it?\n")
    assert "2023-11-14 22:13 UTC" in first
    assert "Note: asked about twice" in first
    assert "## Along alpha-fraction" in first
    command = first.split("```sh\n")[1].split("\n```")[0]
    out.unlink()
    again = run(*shlex.split(command)[1:])
    assert again.exit_code == 0, again.stderr
    assert out.read_text() == first
    for word in ("--no-store", "--threads 1", "'Who carries it?'"):
        assert word in command


def test_html_is_told_by_the_name_and_answers_the_question(tmp_path: Path) -> None:
    out = tmp_path / "report.html"
    done = run("report", *HARBOUR, "--out", out, "--shortlist", "identity", "--within", "tier",
               "--along", "none", "--measures", "surfer,degree")  # fmt: skip
    assert done.exit_code == 0, done.stderr
    text = out.read_text()
    assert text.startswith("<!DOCTYPE html>")
    assert "stands first of 399" in text
    assert "Among peers" in text
    assert "Along" not in text


def test_an_acyclic_graph_gets_a_report_without_what_it_has_no_answer_to(tmp_path: Path) -> None:
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": ["a", "b"], "target": ["b", "c"]}), path)
    for measures in ("katz,eigenvector", "surfer"):
        done = run("report", path, "--measures", measures)
        assert done.exit_code == 0, done.stderr
        assert done.stdout.startswith("# Which nodes carry edges.parquet")
    done = run("report", path, "--measures", "eigenvector,katz")
    assert done.exit_code == 3
    assert done.stdout == ""


def test_what_was_marked_on_the_screen(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from kingpost.core.ingest import load
    from kingpost.tui.models import marks

    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table({"source": ["a", "b"], "target": ["b", "a"]}), path)
    done = run("report", path, "--marked")
    assert (done.exit_code, done.stdout) == (2, "")
    assert "nothing is marked" in done.stderr
    kept = marks.Marks()
    graph = load(path)
    kept.add(graph, 1).note = "the other one"
    marks.save(kept.as_json(), [str(path)], graph, None)
    done = run("report", path, "--marked")
    assert done.exit_code == 0, done.stderr
    assert "Note: the other one" in done.stdout


def test_bad_input_is_one_sentence_and_writes_nothing(tmp_path: Path) -> None:
    out = tmp_path / "report.html"
    listed = tmp_path / "list.csv"
    listed.write_text("name\nx\n")
    for words, said in [
        (("--out", tmp_path / "report.pdf"), "no *.html or *.md"),
        (("--out", out, "--shortlist", "identitty"), "no node is called"),
        (("--out", out, "--shortlist", listed), "no column node"),
        (("--out", listed, "--format", "html", "--shortlist", listed), "being read"),
        (("--out", out, "--measures", "fame"), "no measure is called"),
        (("--out", out, "--measures", ""), "names no measure"),
        (("--out", out, "--window", "5"), "--within"),
        (("--out", out, "--along", "damping=0.5:2:4"), "at most 1"),
        (("--out", out, "--along", "dangling=leak,uniform"), "takes numbers"),
        (("--out", out, "--marked", "--shortlist", "identity"), "exclude each other"),
    ]:
        done = run("report", *HARBOUR, *words)
        assert done.exit_code == 2, (words, done.stdout)
        assert said in done.stderr.splitlines()[-1]
        assert not out.exists()
