"""What was tampered with, cut short, left over or is of another version is never believed."""

import json
import os
import shutil
import stat

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from keeping import EDGES, graph_facts, result_facts

from kingpost.core.ingest import load
from kingpost.core.store import sealed
from kingpost.core.store.sealed import Digest, seal_of
from kingpost.core.watch import Watch

GRAPH_FILES = [
    "attributes.arrow",
    "inward_edges.arrow",
    "inward_offsets.arrow",
    "labels.arrow",
    "manifest.json",
    "outward_edges.arrow",
    "outward_offsets.arrow",
    "structure_cyclic.arrow",
    "structure_nodes.arrow",
    "structure_starts.arrow",
]
RESULT_FILES = ["log.arrow", "manifest.json", "nodes.arrow"]


def flipped(path, at):
    """Change one bit, keeping size and times."""
    about, data = path.stat(), bytearray(path.read_bytes())
    data[at % len(data)] ^= 1 << (at % 8)
    path.write_bytes(data)
    os.utime(path, ns=(about.st_atime_ns, about.st_mtime_ns))


def cut(path):
    os.truncate(path, path.stat().st_size // 2)


def emptied(path):
    os.truncate(path, 0)


def longer(path):
    with path.open("ab") as file:
        file.write(b"\0")


DAMAGE = {
    "first byte": lambda path: flipped(path, 0),
    "a byte in the middle": lambda path: flipped(path, path.stat().st_size // 2),
    "last byte": lambda path: flipped(path, path.stat().st_size - 1),
    "cut": cut,
    "emptied": emptied,
    "longer": longer,
    "gone": os.unlink,
}


@pytest.fixture
def plain(edges, nodes):
    graph = load(edges, nodes=str(nodes))
    return graph_facts(graph), result_facts(graph.rank())


def test_the_files_are_all_there_are(desk, edges, nodes):
    desk.rank(desk.open(edges, nodes=str(nodes)))
    assert sorted(os.listdir(desk.graphs[0])) == GRAPH_FILES
    assert sorted(os.listdir(desk.results[0])) == RESULT_FILES


@pytest.mark.parametrize("name", GRAPH_FILES)
def test_a_damaged_graph_is_read_anew(desk, edges, nodes, plain, name):
    for damage in DAMAGE.values():
        desk.open(edges, nodes=str(nodes))
        damage(desk.graphs[0] / name)
        graph = desk.open(edges, nodes=str(nodes))
        assert graph_facts(graph) == plain[0]
        # Without a manifest there was never a graph; anything else is worth a word.
        if name != "manifest.json" or desk.told:
            assert name in desk.told[0]
            assert "read anew" in desk.told[0]
        assert graph_facts(desk.open(edges, nodes=str(nodes))) == plain[0]
        assert desk.told == []


@pytest.mark.parametrize("name", RESULT_FILES)
def test_a_damaged_result_is_solved_anew(desk, edges, nodes, plain, name):
    for damage in DAMAGE.values():
        graph = desk.open(edges, nodes=str(nodes))
        desk.rank(graph)
        damage(desk.results[0] / name)
        result = desk.rank(graph)
        assert result.solved_on is None
        assert result_facts(result) == plain[1]
        assert desk.rank(graph).solved_on is not None


@given(st.integers(0, 10**9))
@settings(max_examples=60, deadline=None)
def test_no_single_bit_goes_unnoticed(kept_graph, at):
    graph, place = kept_graph
    files = sorted(place.iterdir())
    sizes = np.cumsum([path.stat().st_size for path in files])
    at %= int(sizes[-1])
    which = int(np.searchsorted(sizes, at, side="right"))
    before = files[which].read_bytes()
    flipped(files[which], at)
    try:
        with pytest.raises(sealed.StoreTrouble):
            read(place)
    finally:
        files[which].write_bytes(before)
    assert graph_facts(read(place)) == graph


def read(place):
    from kingpost.core.store.graphs import read_graph

    return read_graph(place, Watch())[0]


@pytest.fixture(scope="module")
def kept_graph(tmp_path_factory):
    import pyarrow.parquet as pq

    from kingpost.core.open import open_graph

    folder = tmp_path_factory.mktemp("kept")
    pq.write_table(pa.table(EDGES), folder / "edges.parquet")
    graph = open_graph(folder / "edges.parquet", store=folder / "shelf")
    (place,) = (folder / "shelf" / "graphs").iterdir()
    return graph_facts(graph), place


def resealed(place, **changes):
    """A manifest with other entries and a right seal."""
    path = place / "manifest.json"
    manifest = json.loads(path.read_bytes()) | changes
    path.write_text(json.dumps(manifest | {"seal": seal_of(manifest)}))


def test_another_version_is_not_read(desk, edges, plain):
    desk.open(edges)
    resealed(desk.graphs[0], format=sealed.FORMAT + 1)
    graph = desk.open(edges)
    assert "format 2, this version reads format 1" in desk.told[0]
    assert graph_facts(graph) == graph_facts(load(edges))
    desk.open(edges)
    assert desk.told == []


def test_another_key_or_kind_is_not_believed(desk, edges):
    desk.open(edges)
    first = desk.graphs[0]
    desk.open(edges, directed=False)
    (second,) = [place for place in desk.graphs if place != first]
    shutil.rmtree(first)
    shutil.copytree(second, first)
    assert graph_facts(desk.open(edges)) == graph_facts(load(edges))
    assert "made from something else" in desk.told[0]
    resealed(first, kingpost="result")
    assert graph_facts(desk.open(edges)) == graph_facts(load(edges))
    assert "holds a result" in desk.told[0]


def test_parts_that_do_not_fit_are_not_believed(desk, edges):
    """Right checksums over wrong contents: from a fault of a writer, or made by hand."""
    desk.open(edges)
    place = desk.graphs[0]
    manifest = json.loads((place / "manifest.json").read_bytes())
    shutil.copyfile(place / "outward_offsets.arrow", place / "outward_edges.arrow")
    manifest["files"]["outward_edges.arrow"] = manifest["files"]["outward_offsets.arrow"]
    resealed(place, files=manifest["files"])
    assert graph_facts(desk.open(edges)) == graph_facts(load(edges))
    assert "do not fit together" in desk.told[0]


def test_a_result_of_another_graph_is_not_believed(desk, edges):
    desk.rank(desk.open(edges))
    (one,) = desk.results
    desk.rank(desk.open(edges, directed=False))
    (other,) = [place for place in desk.results if place != one]
    shutil.rmtree(one)
    shutil.copytree(other, one)
    again = desk.rank(desk.open(edges))
    assert again.solved_on is None
    assert result_facts(again) == result_facts(load(edges).rank())


def test_manifests_of_any_shape_are_only_damaged(desk, edges):
    shapes = [b"", b"{", b"[]", b"{}", b"null", b'{"format": 1}', b"\xff\xfe", b"[" * 100_000]
    shapes.append(b'{"format": 1, "seal": 3, "files": []}')
    for shape in shapes:
        desk.open(edges)
        (desk.graphs[0] / "manifest.json").write_bytes(shape)
        assert desk.open(edges).n == 7
        assert len(desk.told) == 1
        assert "\n" not in desk.told[0]


def test_everything_is_for_the_owner_alone(desk, edges):
    old = os.umask(0)
    try:
        desk.rank(desk.open(edges))
    finally:
        os.umask(old)
    for root, folders, files in os.walk(desk.folder):
        for name in folders:
            assert stat.S_IMODE(os.stat(os.path.join(root, name)).st_mode) == 0o700
        for name in files:
            assert stat.S_IMODE(os.stat(os.path.join(root, name)).st_mode) == 0o600
    assert stat.S_IMODE(desk.folder.stat().st_mode) == 0o700


def test_nothing_kept_can_run_code(desk, edges):
    """Arrow files and JSON only; no file begins as a pickle does."""
    desk.rank(desk.open(edges))
    for path in [*desk.graphs[0].iterdir(), *desk.results[0].iterdir()]:
        head = path.read_bytes()[:6]
        assert head == (b"ARROW1" if path.suffix == ".arrow" else head)
        assert path.suffix in (".arrow", ".json")
        assert head[0] != 0x80


@given(st.lists(st.integers(0, 40)), st.integers(1, 16))
@settings(deadline=None)
def test_a_checksum_does_not_depend_on_the_pieces(sizes, block):
    import hashlib

    before, sealed.BLOCK = sealed.BLOCK, block
    try:
        data = bytes(range(256)) * 8
        whole, pieces, at = Digest(), Digest(), 0
        end = min(sum(sizes), len(data))
        whole.add(memoryview(data)[:end])
        for size in sizes:
            pieces.add(memoryview(data)[at : min(at + size, end)])
            at += size
        assert pieces.hex() == whole.hex()
        blocks = [
            hashlib.blake2b(data[i : min(i + block, end)], digest_size=32).digest()
            for i in range(0, end, block)
        ]
        assert whole.hex() == hashlib.blake2b(b"".join(blocks), digest_size=32).hexdigest()
        assert whole.size == end
    finally:
        sealed.BLOCK = before


def test_what_a_killed_process_left_is_swept_and_what_is_at_work_is_not(desk, edges):
    desk.open(edges)
    parent = desk.folder / "graphs"
    left = parent / ".making-left"
    going = parent / ".going-left"
    for folder in (left, going):
        folder.mkdir()
        (folder / "labels.arrow").write_bytes(b"half")
        os.utime(folder, (0, 0))
    with sealed.making(parent / "other", Watch()) as draft:
        os.utime(draft.folder, (draft.folder.stat().st_mtime - 60,) * 2)
        desk.open(edges, directed=False)  # keeping another graph sweeps
        assert draft.folder.is_dir()
        assert not left.exists()
        assert not going.exists()
        draft.seal("graph", {})
    assert (parent / "other").is_dir()


def test_a_draft_that_fails_leaves_what_was_there(tmp_path):
    place = tmp_path / "kept"
    with sealed.making(place, Watch()) as draft:
        draft.seal("graph", {"which": 1})

    def fails():
        with sealed.making(place, Watch()) as draft:
            draft.seal("graph", {"which": 2})
            raise RuntimeError

    with pytest.raises(RuntimeError):
        fails()
    assert sealed.read_manifest(place, "graph")["about"] == {"which": 1}
    with sealed.making(place, Watch()) as draft:
        draft.seal("graph", {"which": 3})
    assert sealed.read_manifest(place, "graph")["about"] == {"which": 3}
    assert os.listdir(tmp_path) == ["kept"]
