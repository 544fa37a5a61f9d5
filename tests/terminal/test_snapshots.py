"""Every view as it was last looked at by somebody: text and colours at two sizes.

After a change that is wanted ``python tests/terminal/tour.py`` writes them anew.
"""

from __future__ import annotations

import difflib

import pytest

from tests.terminal import tour


@pytest.mark.parametrize("size", tour.SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_every_view_looks_as_it_did(size):
    """All differences are told at once; each view gets a while to come to rest."""
    run = tour.begin(size)
    differences = []
    try:
        for name in tour.tour(run):
            kept = tour.file_of(name, size).read_text(encoding="utf-8")
            try:
                run.until(lambda kept=kept: tour.snapshot(run) == kept, name, deadline=5)
            except AssertionError:
                now = tour.snapshot(run)
                differences += difflib.unified_diff(
                    kept.splitlines(), now.splitlines(), f"{name}, kept", f"{name}, now", "", "", 0
                )
    finally:
        run.close()
    assert not differences, "\n".join(differences)


def test_no_snapshot_is_left_of_a_view_that_is_gone():
    wanted = {tour.file_of(name, size) for name, _, _ in tour.STOPS for size in tour.SIZES}
    assert set(tour.SNAPSHOTS.rglob("*.txt")) == wanted
