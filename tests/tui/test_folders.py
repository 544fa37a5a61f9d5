"""Listing folders and the tables opened lately."""

from __future__ import annotations

import os

import pytest

from kingpost.core.errors import InputError, Interrupted
from kingpost.core.watch import Watch
from kingpost.tui import places
from kingpost.tui.models import folders, recent
from kingpost.tui.models.starting import FolderRows, RecentRows


@pytest.fixture
def harbour(tmp_path):
    folder = tmp_path / "harbour"
    folder.mkdir()
    for name in ("b.parquet", "A.PARQUET", "notes.md", ".hidden.parquet", "z\x1b[31m.pq"):
        (folder / name).write_bytes(b"x" * 1234)
    for name in ("quays", ".git", "Old"):
        (folder / name).mkdir()
    os.symlink(folder / "nowhere.parquet", folder / "dangling.parquet")
    return folder


def names(entries):
    return [entry.name for entry in entries]


def test_folders_then_tables_and_nothing_else(harbour):
    listing = folders.listed(str(harbour))
    shown = folders.narrowed(listing, "")
    assert names(shown) == ["..", ".", "Old", "quays", "A.PARQUET", "b.parquet", "z\x1b[31m.pq"]
    assert listing.words == "3 tables, 2 folders"
    rows = FolderRows(shown)
    assert [column.text(6) for column in rows.head][:2] == ["z\\e[31m.pq", "1.2 kB"]
    assert rows.head[2].text(0) == "the folder above"


def test_narrowing_puts_what_begins_so_first(harbour):
    (harbour / "tab.parquet").write_bytes(b"")
    listing = folders.listed(str(harbour))
    assert names(folders.narrowed(listing, "B")) == ["b.parquet", "tab.parquet"]
    assert names(folders.narrowed(listing, ".")) == [
        ".git", ".hidden.parquet", "A.PARQUET", "b.parquet", "tab.parquet", "z\x1b[31m.pq",
    ]  # fmt: skip


def test_paths_of_rows(harbour):
    listing = folders.listed(str(harbour))
    by_name = {entry.name: listing.path(entry) for entry in listing.entries}
    assert by_name[".."] == str(harbour.parent)
    assert by_name["."] == str(harbour)
    assert by_name["b.parquet"] == str(harbour / "b.parquet")


def test_a_folder_of_parts_can_be_read_whole(tmp_path):
    for part in ("day=1", "day=2"):
        (tmp_path / part).mkdir()
    assert "." in names(folders.listed(str(tmp_path)).entries)
    assert "." not in names(folders.listed(str(tmp_path / "day=1")).entries)
    assert ".." not in names(folders.listed("/").entries)


def test_a_folder_that_cannot_be_listed_is_a_sentence(tmp_path):
    with pytest.raises(InputError, match="cannot be listed: No such file"):
        folders.listed(str(tmp_path / "gone"))
    assert folders.nearest(str(tmp_path / "gone" / "further")) == str(tmp_path)


def test_listing_stops_when_asked(harbour):
    watch = Watch()
    watch.cancel()
    with pytest.raises(Interrupted):
        folders.listed(str(harbour), watch)


@pytest.mark.parametrize(
    ("size", "said"),
    [(-1, ""), (0, "0 B"), (999, "999 B"), (1234, "1.2 kB"), (52_000_000, "52 MB"),
     (3_000_000_000_000_000, "3,000 TB")],
)  # fmt: skip
def test_sizes(size, said):
    assert folders.size_words(size) == said


def test_tables_opened_lately_newest_first_and_the_missing_say_so(harbour):
    gone, there = str(harbour / "gone.parquet"), str(harbour / "b.parquet")
    recent.note([gone], 10, 20, {})
    recent.note([there], 1_500, 20_000, {"source": "a"})
    recent.note([there, gone], 1, 1, {})
    recent.note([there], 1_500, 20_000, {"source": "a"})
    entries = recent.read()
    assert [entry.paths for entry in entries] == [(there,), (there, gone), (gone,)]
    assert [entry.missing for entry in entries] == [False, True, True]
    assert entries[0].size == 1234
    rows = RecentRows(entries)
    assert rows.head[2].text(0) == "1.50k nodes 20.0k edges"
    assert rows.head[2].text(1) == "no longer there"
    assert rows.name(1) == "b.parquet +1"


def test_a_damaged_list_is_a_sentence_and_begun_anew():
    file = places.state_folder() / "recent.json"
    file.parent.mkdir(parents=True)
    for content in ("{", "[]", '{"format": 1, "tables": [{"paths": ["x"]}]}', '{"format": 7}'):
        file.write_text(content)
        with pytest.raises(places.StateError):
            recent.read()
    recent.note(["x.parquet"], 1, 1, {})
    assert len(recent.read()) == 1


def test_the_list_is_bounded():
    for at in range(recent.MOST + 5):
        recent.note([f"{at}.parquet"], 1, 1, {})
    assert len(recent.read()) == recent.MOST
