"""Another table after the one that the command line named."""

from __future__ import annotations


def test_another_table_is_chosen_after_one_from_the_command_line(terminal, calls, tmp_path):
    other = tmp_path / "tide_calls.csv"
    other.write_text("source,target\nmoon,tide\nsun,tide\n")
    run = terminal(calls)
    run.shows("? all keys", "order proven to")
    run.press("S")
    run.shows("choose a table of edges", "this sitting is kept", "opened lately", "60 nodes")
    run.press("/", str(other), "enter")
    run.shows("tide_calls.csv", "3 nodes", "? all keys")
    run.press("S")
    run.shows("choose a table of edges", "3 nodes", "60 nodes")
    run.press("/", "/no/such/table.parquet", "enter")
    run.shows("nothing was opened", "/no/such/table.parquet")
    run.press("enter")
    run.shows("choose a table of edges")
    run.press("q")
    assert run.ends() == 0
    assert all(run.left_clean().values())
