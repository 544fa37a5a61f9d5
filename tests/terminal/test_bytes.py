"""What a key costs on the wire over a million rows: bytes, unlike seconds, do not vary."""

from __future__ import annotations

import re

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq


def test_bytes_of_a_key_over_a_million_rows(terminal, tmp_path):
    """At 120x40: at most 500 bytes a key without scrolling, 1,500 on average over 200 downs."""
    n = 1_000_000
    # Everyone points at a lower number, most at the lowest: no cycle, so solving is one pass.
    heads = np.arange(1, n)
    tails = (heads * np.random.default_rng(1).random(n - 1) ** 3).astype(np.int64)
    path = tmp_path / "harbour_calls_by_ship.parquet"
    pq.write_table(pa.table({"source": heads, "target": tails}), path)
    run = terminal(path, "--no-store", size=(120, 40))
    run.shows("? all keys", "1,000,000 nodes", "held up by", " katz", " degree")  # all are solved
    run.settle(1.0)

    def row():
        found = re.search(r"▸ *([\d,]+)", run.text)
        return int(found[1].replace(",", "")) if found else 0

    def down():
        before = row()
        run.press("down")
        run.until(lambda: row() > before, "the next row")

    run.press("down")
    run.settle()
    start = len(run.raw)
    for _ in range(15):
        down()
        run.settle(0.15)  # the lines about the row follow once the cursor rests
    assert (len(run.raw) - start) / 15 <= 500
    start = len(run.raw)
    for _ in range(200):
        down()
    run.settle()
    assert row() >= 217
    assert (len(run.raw) - start) / 200 <= 1_500
