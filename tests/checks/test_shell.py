"""The same values through ``kingpost rank --format json``, on Parquet written here."""

from __future__ import annotations

import json
from itertools import pairwise
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner
from runners import ENTRIES, Entry, scaled, table

from kingpost.tui.cli import cli

KINDS = ("pagerank", "eigenvector", "eigenvector_right", "katz", "katz_bonacich")
# Kinds that a few fixed words ask for.
WORDS = {
    "hits_authority": ["--measure", "hits", "--role", "authority"],
    "hits_hub": ["--measure", "hits", "--role", "hub"],
    "keener": [
        *("--measure", "votes", "--link", "skew", "--division", "games"),
        *("--diagonal", "0.5", "--flow", "against"),
    ],
    "subgraph_centrality": ["--measure", "subgraph", "--scale", "none"],
    "total_communicability": ["--measure", "communicability", "--scale", "none"],
    "total_communicability_out": [
        *("--measure", "communicability", "--scale", "none", "--flow", "against"),
    ],
    "tournament_eigenvector": ["--measure", "eigenvector", "--flow", "against"],
}


def words(item: Entry, folder: Path) -> list[str]:
    """The command line that asks for the entry, files beside it included."""
    said, kind = item["parameters"], item["measure"]
    edges = folder / "edges.parquet"
    pq.write_table(table(item), edges)
    line = ["rank", str(edges), "--format", "json", "--tol", "1e-12"]
    if not item["directed"]:
        line.append("--undirected")
    if kind == "pagerank":
        line += ["--measure", "surfer", "--damping", repr(said["alpha"])]
        if said.get("dangling") == "uniform":
            line += ["--dangling", "uniform"]
        if isinstance(said.get("teleport"), list):
            line += ["--teleport", vector(item, said["teleport"], folder)]
    elif kind in WORDS:
        line += WORDS[kind]
    elif kind.startswith("eigenvector"):
        line += ["--measure", "eigenvector"]
    elif kind == "katz":
        line += ["--measure", "katz", "--alpha", repr(said["alpha"]), "--beta", "1"]
    else:  # (I - b A)^-1 A 1: A 1 of an undirected graph without weights is counted here
        ends = [end for u, v, _ in item["edges"] for end in (u, v)]
        counts = [ends.count(node) * said["a"] for node in item["nodes"]]
        line += ["--measure", "katz", "--alpha", repr(said["b"])]
        line += ["--beta", vector(item, counts, folder)]
    if kind == "eigenvector_right":
        line += ["--flow", "against"]
    return line


def vector(item: Entry, values: list[float], folder: Path) -> str:
    """A two-column file of nodes and numbers."""
    place = folder / "values.parquet"
    columns = {"node": [str(n) for n in item["nodes"]], "value": [float(v) for v in values]}
    pq.write_table(pa.table(columns), place)
    return str(place)


def chosen() -> list[Entry]:
    # A dangling distribution of its own has no word on the command line; test_values has it.
    return [
        item
        for item in ENTRIES
        if item["measure"] in (*KINDS, *WORDS)
        and not isinstance(item["parameters"].get("dangling"), list)
    ]


@pytest.mark.parametrize("item", chosen(), ids=lambda item: item["id"])
def test_the_shell_prints_the_published_value(item: Entry, tmp_path: Path) -> None:
    done = CliRunner().invoke(cli, words(item, tmp_path))
    assert done.exit_code == 0, done.stderr
    answer = json.loads(done.stdout)
    scores = {str(row["node"]): row["score"] for row in answer["rows"]}
    assert set(scores) == {str(node) for node in item["nodes"]}
    found = scaled(
        np.array([scores[str(node)] for node in item["nodes"]]),
        item["parameters"].get("normalise"),
    )
    assert found == pytest.approx(item["expected"], rel=0, abs=item["tolerance"]), item["source"]
    # What it says of itself agrees with the published values too.
    solve = answer["solve"]
    assert solve["stop"] == "converged"
    assert 0 <= solve["error_bound"] <= 1e-12
    apart = 2 * solve["error_bound"] * sum(abs(score) for score in scores.values())
    ranked = sorted(answer["rows"], key=lambda row: row["rank"])
    for above, below in pairwise(ranked):  # members of a tie may differ in their last bits
        assert above["score"] >= below["score"] - apart
    for row in answer["rows"]:
        assert row["rank_low"] <= row["rank"] <= row["rank_high"]
        clear = sum(score > row["score"] + apart for score in scores.values())
        under = sum(score < row["score"] - apart for score in scores.values())
        assert clear < row["rank"] <= len(scores) - under


def test_most_entries_of_these_kinds_go_through_the_shell() -> None:
    assert len(chosen()) == 68
