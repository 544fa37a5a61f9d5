"""The shelf's limits, and everything that can keep it from being written."""

import errno
import os
import subprocess
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from keeping import graph_facts

from kingpost.core.errors import Interrupted
from kingpost.core.ingest import load
from kingpost.core.open import open_graph
from kingpost.core.store import sealed
from kingpost.core.store import shelf as shelves
from kingpost.core.store.sealed import StoreTrouble
from kingpost.core.store.shelf import Shelf, default_folder, in_bytes
from kingpost.core.watch import Watch


def tables(folder, number):
    for i in range(number):
        path = folder / f"t{i}.parquet"
        pq.write_table(pa.table({"source": [1, 2, 3, 4], "target": [2, 3, 1, i]}), path)
        yield path


def aged(place, seconds):
    os.utime(place, (seconds, seconds))


def test_what_was_used_longest_ago_goes_first(desk, tmp_path, monkeypatch):
    paths = list(tables(tmp_path, 5))
    for path in paths[:4]:
        desk.rank(desk.open(path))
    shelf = Shelf(desk.folder)
    by_name = {entry.name: entry for entry in shelf.entries() if entry.kind == "graph"}
    for age, entry in enumerate(shelf.entries()):
        aged(entry.place, 10_000 + age)
    aged(by_name["t1.parquet"].place, 1)
    aged(by_name["t3.parquet"].place, 2)
    desk.open(paths[3])  # of use again
    kept = sum(entry.bytes for entry in shelf.entries())
    one = by_name["t1.parquet"].bytes
    monkeypatch.setattr(shelves, "estimate", lambda graph: one)
    with monkeypatch.context() as patch:
        patch.setattr(Shelf, "__init__", limited(kept + one // 2))
        desk.open(paths[4])
    names = {entry.name for entry in shelf.entries() if entry.kind == "graph"}
    assert names == {"t0.parquet", "t2.parquet", "t3.parquet", "t4.parquet"}
    assert desk.told == []


def limited(limit):
    honest = Shelf.__init__

    def make(self, folder=None, _limit=0):
        honest(self, folder, limit)

    return make


def test_a_graph_beyond_the_limit_is_not_kept_and_drives_nothing_out(desk, tmp_path, monkeypatch):
    first, second = tables(tmp_path, 2)
    desk.open(first)
    monkeypatch.setattr(Shelf, "__init__", limited(1_000))
    graph = desk.open(second)
    assert graph_facts(graph) == graph_facts(load(second))
    (note,) = desk.told
    assert note.startswith("the graph is not kept for next time: it would take")
    assert "the shelf holds 1.0 kB" in note
    assert len(desk.graphs) == 1


def test_a_disk_with_little_left_is_left_alone(desk, edges, monkeypatch):
    monkeypatch.setattr(Shelf, "_free", lambda self: shelves.SPARE)
    assert graph_facts(desk.open(edges)) == graph_facts(load(edges))
    assert "the disk has 250.0 MB left" in desk.told[0]
    assert desk.graphs == []


@pytest.mark.parametrize("at", range(0, 14, 2))
def test_a_disk_that_fills_up_in_the_middle(desk, edges, monkeypatch, at):
    """ENOSPC from the operating system at any of the writes and at bringing them to the disk."""
    countdown = [at]
    honest_write, honest_sync = sealed._Sink.write, os.fsync

    def spend():
        countdown[0] -= 1
        if countdown[0] < 0:
            raise OSError(errno.ENOSPC, "No space left on device")

    def write(self, data):
        spend()
        return honest_write(self, data)

    def sync(handle):
        spend()
        return honest_sync(handle)

    monkeypatch.setattr(sealed._Sink, "write", write)
    monkeypatch.setattr(os, "fsync", sync)
    graph = desk.open(edges)
    monkeypatch.undo()
    assert desk.told == [f"the graph is not kept for next time: the disk of {desk.folder} is full"]
    assert os.listdir(desk.folder / "graphs") == []
    assert graph_facts(graph) == graph_facts(load(edges))
    assert desk.rank(graph).solved_on is None
    assert desk.open(edges).drawer is not None


def test_a_disk_that_is_full_for_a_result(desk, edges, monkeypatch):
    graph = desk.open(edges)

    def write(self, data):
        raise OSError(errno.EDQUOT, "Disk quota exceeded")

    monkeypatch.setattr(sealed._Sink, "write", write)
    assert desk.rank(graph).proven_order == 7
    assert desk.told == [f"the result is not kept: the disk of {desk.folder} is full"]
    assert desk.results == []


@pytest.fixture
def small_disk(tmp_path):
    """A file system of 256 kB in memory."""
    place = tmp_path / "small"
    place.mkdir()
    command = ["mount", "-t", "tmpfs", "-o", "size=256k,mode=0700", "tmpfs", str(place)]
    try:
        done = subprocess.run(command, capture_output=True, text=True)
    except FileNotFoundError:
        pytest.skip("there is no mount command here")
    if done.returncode:
        pytest.skip(f"a file system cannot be mounted here: {done.stderr.strip()}")
    yield place
    subprocess.run(["umount", str(place)], check=True)


def test_a_real_disk_that_is_full(small_disk, tmp_path, monkeypatch):
    monkeypatch.setattr(shelves, "SPARE", -(10**12))  # let it run into the end of the disk
    path = tmp_path / "x.parquet"
    ids = list(range(20_000))
    pq.write_table(pa.table({"source": ids, "target": ids[1:] + ids[:1]}), path)
    told = []
    graph = open_graph(path, store=small_disk / "shelf", tell=told.append)
    assert graph.n == 20_000
    assert told == [
        f"the graph is not kept for next time: the disk of {small_disk / 'shelf'} is full"
    ]
    assert list((small_disk / "shelf" / "graphs").iterdir()) == []
    small = tmp_path / "y.parquet"
    pq.write_table(pa.table({"source": [1, 2], "target": [2, 1]}), small)
    told.clear()
    assert open_graph(small, store=small_disk / "shelf", tell=told.append).drawer is not None
    assert told == []


def test_a_real_disk_that_is_read_only(small_disk, edges, monkeypatch):
    told = []
    monkeypatch.setattr(shelves, "SPARE", 0)
    subprocess.run(["mount", "-o", "remount,ro", str(small_disk)], check=True)
    graph = open_graph(edges, store=small_disk / "shelf", tell=told.append)
    assert graph_facts(graph) == graph_facts(load(edges))
    (note,) = told
    assert note.startswith("the graph is not kept for next time:")
    assert "Read-only file system" in note


def test_a_shelf_kept_on_a_disk_that_became_read_only_still_opens(small_disk, edges, monkeypatch):
    told = []
    monkeypatch.setattr(shelves, "SPARE", 0)
    open_graph(edges, store=small_disk / "shelf", tell=told.append)
    subprocess.run(["mount", "-o", "remount,ro", str(small_disk)], check=True)
    graph = open_graph(edges, store=small_disk / "shelf", tell=told.append)
    assert graph.drawer is not None
    assert told == []


@pytest.mark.skipif(os.geteuid() == 0, reason="root writes everywhere")
def test_a_folder_one_may_not_write_to(desk, edges):
    desk.folder.mkdir(mode=0o500)
    assert graph_facts(desk.open(edges)) == graph_facts(load(edges))
    assert "cannot be written to (Permission denied)" in desk.told[0]
    desk.folder.chmod(0o700)


def test_a_file_in_the_place_of_the_folder(desk, edges):
    desk.folder.write_text("not a folder")
    assert desk.open(edges).n == 7
    assert len(desk.told) == 1
    assert "cannot be written to" in desk.told[0]


def test_a_shelf_others_can_write_to_is_not_believed(desk, edges):
    desk.open(edges)
    desk.folder.chmod(0o777)
    graph = desk.open(edges)
    assert graph.drawer is None
    assert desk.told == [f"the store is not used: {desk.folder} is open for writing to others"]


def test_a_shelf_of_another_user_is_not_believed(desk, edges, monkeypatch):
    desk.open(edges)
    me = os.geteuid()
    monkeypatch.setattr(os, "geteuid", lambda: me + 1)
    assert desk.open(edges).drawer is None
    assert desk.told == [f"the store is not used: {desk.folder} belongs to another user"]


def test_cancelling_while_it_is_written_leaves_nothing(desk, edges):
    class Stopped(Watch):
        def report(self, stage, done=0, total=None, unit=""):
            if stage == "keeping the graph" and done == 3:
                self.cancel()

    with pytest.raises(Interrupted):
        desk.open(edges, watch=Stopped())
    assert os.listdir(desk.folder / "graphs") == []


def test_without_a_store_nothing_is_written_or_read(desk, edges, tmp_path):
    cache = Path(os.environ["KINGPOST_CACHE_DIR"])
    assert open_graph(edges, store=False).drawer is None
    assert not cache.exists()
    assert open_graph(edges).drawer is not None
    assert (cache / "shelf" / "graphs").is_dir()
    assert open_graph(edges, store=False).drawer is None


def test_where_the_shelf_stands(monkeypatch, tmp_path):
    monkeypatch.setenv("KINGPOST_CACHE_DIR", str(tmp_path))
    assert default_folder() == tmp_path / "shelf"
    monkeypatch.delenv("KINGPOST_CACHE_DIR")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "xdg"))
    monkeypatch.setattr("sys.platform", "linux")
    assert default_folder() == tmp_path / "xdg" / "kingpost" / "shelf"


def test_clearing_by_name_takes_the_results_along(desk, tmp_path):
    one, two = tables(tmp_path, 2)
    for path in (one, two):
        desk.rank(desk.open(path))
        desk.rank(desk.open(path), "degree")
    shelf = Shelf(desk.folder)
    gone = shelf.clear(["t0.parquet"])
    assert sorted(entry.kind for entry in gone) == ["graph", "result", "result"]
    assert {entry.name for entry in shelf.entries()} == {"t1.parquet"}
    with pytest.raises(StoreTrouble, match="nothing on the shelf is called t0"):
        shelf.clear(["t1.parquet", "t0.parquet"])
    assert len(shelf.entries()) == 3
    shelf.clear()
    assert shelf.entries() == []
    assert [path for path in desk.folder.rglob("*") if path.is_file()] == []


def test_a_copy_of_a_table_as_it_was_goes_when_the_new_one_is_kept(desk, edges, tmp_path):
    (other,) = tables(tmp_path, 1)
    for path, options in ((other, {}), (edges, {}), (edges, {"directed": False})):
        desk.open(path, **options)
    kept = set(desk.graphs)
    pq.write_table(pa.table({"source": ["p"], "target": ["q"]}), edges)
    assert desk.open(edges).n == 2
    assert len(desk.graphs) == 3  # in place of the one of the same options
    assert len(kept & set(desk.graphs)) == 2
    assert desk.open(edges, directed=False).n == 2
    assert len(desk.graphs) == 3
    assert len(kept & set(desk.graphs)) == 1


def test_sizes_in_words():
    sizes = [0, 999, 1_000, 12_345_678, 2 * 10**9, 10**15]
    words = ["0 bytes", "999 bytes", "1.0 kB", "12.3 MB", "2.0 GB", "1,000.0 TB"]
    assert [in_bytes(size) for size in sizes] == words
