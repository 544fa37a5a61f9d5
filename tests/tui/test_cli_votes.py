"""``kingpost rank --measure votes`` and ``--measure subgraph``, through click's runner."""

from __future__ import annotations

import json
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner, Result

from kingpost.tui.cli import cli

TASTINGS = Path(__file__).parents[2] / "sample_graphs" / "cheese_tastings.parquet"


def run(*words: object) -> Result:
    return CliRunner().invoke(cli, [str(word) for word in words])


def test_tastings_counted_by_wins() -> None:
    done = run(
        *("rank", TASTINGS, "--measure", "votes", "--weight-as", "none", "--top", "3"),
        *("--format", "json"),
    )
    assert done.exit_code == 0, done.stderr
    found = json.loads(done.stdout)
    assert [row["node"] for row in found["rows"]][:2] == ["Nine Acre", "Parson's Doorstop"]
    words = json.dumps(found)
    assert "rho = 1" in words
    assert "local review" in words  # it may be people that are rated


def test_every_option_of_it_is_a_word_of_the_command_line() -> None:
    done = run(
        *("rank", TASTINGS, "--measure", "votes", "--link", "logistic", "--unit", "2"),
        *("--division", "games", "--diagonal", "0.5", "--component", "Nine Acre", "--top", "1"),
    )
    assert done.exit_code == 0, done.stderr
    assert "2 (as given)" in " ".join(done.stdout.split())


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--link", "raw"], "laplace, skew, logistic"),
        (["--unit", "0"], "more than 0"),
        (["--division", "half"], "vote, games"),
        (["--component", "Gouda"], "no node is called"),
        (["--damping", "0.5"], "takes no --damping"),
    ],
)
def test_it_refuses_in_a_sentence(words: list[str], told: str) -> None:
    done = run("rank", TASTINGS, "--measure", "votes", *words)
    assert done.exit_code == 2
    assert told in done.stderr
    assert "Traceback" not in done.output


def test_groups_that_never_met_and_graphs_too_large_end_with_status_three(tmp_path: Path) -> None:
    path = tmp_path / "two.parquet"
    pq.write_table(pa.table({"loser": ["a", "c"], "winner": ["b", "d"]}), path)
    apart = run("rank", path, "--measure", "votes")
    assert apart.exit_code == 3
    assert "never met" in apart.stderr
    dear = run("rank", TASTINGS, "--measure", "subgraph", "--budget", "10")
    assert dear.exit_code == 3
    assert "beyond the budget of 10" in dear.stderr
    quadrature = run("rank", TASTINGS, "--measure", "subgraph", "--set", "method=quadrature")
    assert quadrature.exit_code == 3
    assert "directed" in quadrature.stderr
    both = ("--undirected", "--set", "method=quadrature", "--top", "1")
    assert run("rank", TASTINGS, "--measure", "subgraph", *both).exit_code == 0
