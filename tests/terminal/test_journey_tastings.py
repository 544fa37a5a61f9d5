"""Which cheeses are sold?  Measures compared, a connection lost, the sitting taken up again.

The samples' README tells what is odd: Lantern Fell was tasted nine times and never lost; Parson's
Doorstop has the most strength, having met weak cheeses; Nine Acre is on nearly every plate and
loses more than it wins.
"""

from __future__ import annotations

import re
import signal
from pathlib import Path

from tests.terminal.test_screen import choose

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
TASTINGS = SAMPLES / "cheese_tastings.parquet"
CHEESES = SAMPLES / "cheese_list.parquet"


def test_a_shortlist_of_cheeses_outlives_the_connection(terminal, tmp_path):
    run = terminal(TASTINGS, "--nodes", CHEESES, size=(120, 40))
    run.shows("cheese_tastings.parquet", "? all keys", " katz", " eigen", " degree")
    # The votes beside the rest, and the rows on which strength and votes do not agree.
    run.press("m")
    run.shows("V votes")
    choose(run, "V votes")
    run.until(lambda: run.lines[1].startswith(" votes"), "votes in the second line")
    run.press("f", "degree_rank <= 10 or votes_rank <= 2", "enter")
    run.shows("of 60 nodes", "where degree_rank <= 10 or votes_rank <= 2")
    run.shows("▸    1  Lantern Fell", "V 1  D 10")
    # As fast as one types: each key is about the row that the key before it came to.
    run.press("i", "nine tastings, all won", "enter", "down", "x")
    run.shows("marked Nine Acre; 2 on the shortlist")
    run.press("/", "Parson", "enter")
    run.shows("1 of 1 names with 'Parson'")
    run.until(lambda: re.search(r"▸ +12 +Parson's Doorstop", run.text), "its row")
    run.press("i", "drawn against weak cheeses", "enter")
    run.shows("noted on Parson's Doorstop", "D 1")

    assert run.hang_up() == 128 + signal.SIGHUP

    run = terminal(TASTINGS, "--nodes", CHEESES, size=(120, 40))
    run.shows("take up the sitting", "votes and 4 other measures", "at Parson's Doorstop, 3 marks")
    run.press("enter")
    run.shows("where degree_rank <= 10 or votes_rank <= 2", " katz", "1 of 1 names with 'Parson'")
    run.until(lambda: run.lines[1].startswith(" votes"), "votes in the second line")
    run.until(lambda: re.search(r"▸ +12 +Parson's Doorstop *★", run.text), "the row left, marked")
    run.press("o")
    run.shows("3 nodes marked", "nine tastings, all won", "drawn against weak cheeses")
    run.until(lambda: "votes" in run.lines[2] and "degree" in run.lines[2], "ranks of them all")
    columns = run.lines[2].split()
    lantern = run.line_with("Lantern Fell").replace("★", " ").lstrip(" ▸").split()[2:]
    assert lantern[columns.index("votes") - 1] == "1"
    assert lantern[columns.index("degree") - 1] == "10"
    run.press("q")
    assert run.ends() == 0

    said = tmp_path / "stall.md"
    measures = "votes,surfer,katz,eigenvector,degree"
    asked = ("--nodes", CHEESES, "--marked", "--measures", measures, "--along", "none")
    run = terminal("report", TASTINGS, *asked, "--question", "What is sold?", "--out", said)
    assert run.ends() == 0, run.text
    report = said.read_text(encoding="utf-8")
    assert report.startswith("# What is sold?\n")
    assert "By votes, Lantern Fell stands first of 60, which is proven" in report
    assert "They differ most about Parson's Doorstop: degree 1, eigenvector 16." in report
    listed = report.partition("## Shortlist")[2].partition("\n## ")[0]
    assert re.findall("^### (.*)$", listed, re.M) == [
        "Lantern Fell",
        "Nine Acre",
        "Parson's Doorstop",
    ]
    assert "Note: nine tastings, all won" in listed
    assert "votes (V) 1, surfer (S) 1, katz (K) 1, eigenvector (E) 1, degree (D) 10" in listed
    assert "Note: drawn against weak cheeses" in listed
