"""Which old paper do Katz and surfer disagree on, and which citations point forward in time?

The samples' README names them: ``rk-1985-0007``, seventh by surfer because the best-known paper
cites only two; 60 citations that point to a later year, the worst of them from ``rk-1984-0008`` to
``rk-1987-0144``.  Its figures are checked with networkx and scipy.
"""

from __future__ import annotations

import re
from pathlib import Path

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
CITATIONS = SAMPLES / "reef_citations.parquet"
PAPERS = SAMPLES / "reef_papers.parquet"
# Ids carry the year: rk-1984-0008.
FORWARD = "substr(citing, 4, 4) < substr(cited, 4, 4)"


def test_an_old_paper_katz_and_surfer_disagree_on_and_citations_forward_in_time(terminal, tmp_path):
    run = terminal(CITATIONS, "--nodes", PAPERS, size=(120, 40))
    run.shows("reef_citations.parquet", "19,797 nodes", "? all keys", " katz", " eigen")
    run.press("f", "surfer_rank <= 10 and katz_rank > 100 and year < 1990", "enter")
    run.shows("1 of 19,797 nodes")
    run.until(lambda: re.search(r"▸ +7 +rk-1985-0007", run.text), "the only such paper")
    run.press("enter")
    run.shows("▼ rk-1985-0007", "year 1985", "S surfer 7", "K katz 125")
    # Who gives it so much, and why Katz does not follow: one famous paper that cites only two.
    run.until(lambda: "▸rk-1989-0012" in run.text, "its feeders")
    assert run.line_with("▸rk-1989-0012").split()[2] == "99%"
    run.press("i", "half the share of rk-1989-0012", "enter")
    run.shows("★")
    run.press("enter")
    run.shows("▼ rk-1989-0012", "came by: rk-1985-0007")
    run.until(lambda: receivers(run) == {"rk-1985-0007", "rk-1986-0003"}, "the two it cites")
    run.press("escape")
    run.shows("Enter node")

    # Why is there an eigenvector at all?  No paper can cite a later one, and yet:
    run.press("M")
    run.shows("makeup of reef_citations.parquet", "with a cycle", "4, holding 0.9% of the edges")
    run.press("q")
    assert run.ends() == 0

    # The citations that point forward, alone; the worst is in them.
    run = terminal(CITATIONS, "--nodes", PAPERS, "--where", FORWARD, "--fresh", size=(120, 40))
    run.shows("119 nodes", "60 edges", "? all keys", " katz")
    run.press("/", "rk-1984-0008", "enter")
    run.shows("1 of 1 names with 'rk-1984-0008'")
    run.press("enter")
    run.shows("▼ rk-1984-0008", "year 1984", "nothing")
    run.until(lambda: receivers(run) == {"rk-1987-0144"}, "its only citation, to a later paper")
    run.press("q")
    assert run.ends() == 0

    # For a colleague: what that one row does, and the paper in question.
    worst = ("--without-edge", "rk-1984-0008", "rk-1987-0144")
    run = terminal("trial", CITATIONS, *worst, size=(120, 60))
    assert run.ends() == 0, run.text
    fallen = [line.split() for line in run.lines if line.startswith("rk-1987-0144")]
    assert fallen[0][1] == "6", run.text
    assert int(fallen[0][2].partition("-")[0].replace(",", "")) > 1000, run.text
    said = tmp_path / "reef.md"
    asked = ("--nodes", PAPERS, "--marked", "--measures", "surfer,katz", "--along", "none")
    run = terminal("report", CITATIONS, *asked, "--out", said)
    assert run.ends() == 0, run.text
    report = said.read_text(encoding="utf-8")
    listed = report.partition("## Shortlist")[2].partition("\n## ")[0]
    assert "### rk-1985-0007\n" in listed
    assert "Note: half the share of rk-1989-0012" in listed
    assert "surfer (S) 7, katz (K) 125" in listed
    assert "| rk-1989-0012 | 98.6% | 1 |" in listed


def receivers(run):
    """The names under the centre of Node, whom it gives score to."""
    lines = run.lines
    heads = [at for at, line in enumerate(lines) if line.startswith(" it gives to")]
    found = set()
    for line in lines[heads[0] + 1 :] if heads else []:
        if not line.strip() or line[0] == "─":
            break
        found.add(line.lstrip(" ▸").split()[0].rstrip("★"))
    return found
