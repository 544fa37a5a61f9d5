"""Published values and closed forms, entry by entry, to the tolerance each entry states.

The source of every value stands in its entry of check_values.json.
"""

from __future__ import annotations

from collections import Counter

import pytest
from runners import ENTRIES, FACTS, RUNNERS, WITHOUT, WITHOUT_ENTRY, Entry


def about(item: Entry) -> str:
    """The id of an entry, for names of tests."""
    return item["id"]


@pytest.mark.parametrize("item", ENTRIES, ids=about)
def test_the_value_is_reproduced(item: Entry) -> None:
    kind = item["measure"]
    if kind in WITHOUT:
        pytest.skip(WITHOUT[kind])
    if item["id"] in WITHOUT_ENTRY:
        pytest.skip(WITHOUT_ENTRY[item["id"]])
    found = [float(value) for value in RUNNERS[kind](item)]
    assert found == pytest.approx(item["expected"], rel=0, abs=item["tolerance"]), item["source"]


def test_no_kind_and_no_entry_is_left_out_in_silence() -> None:
    kinds = {item["measure"] for item in ENTRIES}
    assert kinds == set(RUNNERS) | set(WITHOUT)
    assert not set(RUNNERS) & set(WITHOUT)
    ids = Counter(item["id"] for item in ENTRIES)
    assert max(ids.values()) == 1
    assert set(WITHOUT_ENTRY) <= set(ids)
    facts = {item["id"] for item in ENTRIES if item["measure"] == "spectral_fact"}
    assert facts == set(FACTS) | {name for name in WITHOUT_ENTRY if name.startswith("fact-")}


def test_the_table_is_whole() -> None:
    # Counted once by hand; a table that shrinks would pass all the other tests.
    count = Counter(item["measure"] for item in ENTRIES)
    assert len(ENTRIES) == 95
    assert (count["pagerank"], count["eigenvector"], count["katz"]) == (18, 10, 14)
