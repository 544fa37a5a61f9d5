"""Which service's rank jumped during the failover, and who feeds it?

The answer is in the samples' README, whose figures are checked with networkx and scipy: by surfer
``lease-umpire`` rises from 324 to 11, and 85.7 % of its score comes from the standby.
"""

from __future__ import annotations

from pathlib import Path

SAMPLES = Path(__file__).parents[2] / "sample_graphs"
BEFORE = SAMPLES / "harbour_calls.parquet"
AFTER = SAMPLES / "harbour_calls_failover.parquet"
SERVICES = SAMPLES / "harbour_services.parquet"


def test_who_jumped_in_the_failover_and_who_feeds_it(terminal, tmp_path):
    # Between the two hours: what rose, in words.
    run = terminal("drift", BEFORE, AFTER, size=(120, 60))
    assert run.ends() == 0
    rose = [line.split() for line in run.lines if line.startswith(("seat-inventory-st", "lease-"))]
    assert rose[0][:3] == ["seat-inventory-standby", "370", "10"]
    assert rose[1][:3] == ["lease-umpire", "324", "11"]
    told = " ".join(run.text.split())
    assert "seat-inventory-standby rose from rank 370 to 10; of what it gained, 100% over" in told
    assert "lease-umpire rose from rank 324 to 11; of what it gained, 92% from" in told

    # In the bad hour itself: the standby is where everyone went; who leans on the unknown one?
    run = terminal(AFTER, "--nodes", SERVICES)
    run.shows("harbour_calls_failover", "? all keys", "order proven to", " katz")
    run.press("/", "lease-umpire", "enter")
    run.shows("1 of 1 names with 'lease-umpire'", "held up by  seat-inventory-standby 86%")
    run.press("enter")
    run.shows("▼ lease-umpire", "▸seat-inventory-standby", "snapshot-replay")
    assert run.line_with("▸seat-inventory-standby").split()[2:5] == ["86%", "86%", "10"]
    run.press("i", "asked about nearly every write of the standby", "enter")
    run.shows("★")
    run.press("enter")
    run.shows("▼ seat-inventory-standby", "came by: lease-umpire", "team berths")
    run.press("i", "took over from seat-inventory", "enter")
    run.shows("★")
    run.press("escape")
    run.shows("Enter node")
    run.press("o")
    run.shows("2 nodes marked", "lease-umpire", "took over from seat-inventory")
    run.press("q")
    assert run.ends() == 0

    # What a colleague gets.
    said = tmp_path / "failover.md"
    question = "Who jumped in the failover, and who feeds it?"
    run = terminal(
        "report", AFTER, "--nodes", SERVICES, "--marked", "--question", question, "--out", said
    )
    assert run.ends() == 0, run.text
    report = said.read_text(encoding="utf-8")
    assert report.startswith(f"# {question}\n")
    listed = report.partition("## Shortlist")[2].partition("\n## ")[0]
    umpire, standby = listed.split("### ")[1:]
    assert umpire.startswith("lease-umpire\n")
    assert "Note: asked about nearly every write of the standby" in umpire
    assert "surfer (S) 11" in umpire
    assert "| seat-inventory-standby | 85.7% | 10 |" in umpire
    assert "| snapshot-replay | 7.9% |" in umpire
    assert standby.startswith("seat-inventory-standby\n")
    assert "Note: took over from seat-inventory" in standby
    assert "no assessment of safety" in report
