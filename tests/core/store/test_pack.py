"""A pack opens anywhere as the graph it was made from; a damaged or forged one is refused."""

import json
import os
import shutil

import numpy as np
import pyarrow as pa
import pytest
from keeping import graph_facts, result_facts

from kingpost.core.errors import InputError, OutputError, SettingsError
from kingpost.core.ingest import LoadOptions, load
from kingpost.core.open import describe, open_graph
from kingpost.core.store.pack import write_pack
from kingpost.core.store.sealed import Digest, seal_of


def packed(graph, edges, folder, **options):
    return write_pack(graph, str(folder), LoadOptions(**options), describe(edges))


@pytest.fixture
def pack(desk, edges, nodes, tmp_path):
    given = {"nodes": str(nodes), "directed": True}
    graph = desk.open(edges, **given)
    desk.rank(graph)
    desk.rank(graph, "katz")
    assert packed(graph, edges, tmp_path / "pack", **given) == 2
    return tmp_path / "pack"


def test_a_pack_is_the_graph_with_its_results(desk, pack, edges, nodes, tmp_path):
    # Each measure on a graph of its own: one that has found the spectral radius keeps it.
    plain, other = (load(edges, nodes=str(nodes)) for _ in range(2))
    solved = {"surfer": plain.rank(), "katz": other.rank("katz")}
    described = describe(edges)
    moved = tmp_path / "elsewhere"
    shutil.move(pack, moved)
    edges.unlink()
    for store in (False, tmp_path / "other shelf"):
        graph = open_graph(moved, store=store)
        assert graph_facts(graph) == graph_facts(plain)
        for name in ("surfer", "katz"):
            kept = graph.rank(name)
            assert kept.solved_on is not None
            assert result_facts(kept) == result_facts(solved[name])
        assert graph.rank("degree").solved_on is None
    assert describe(moved) == described


def test_what_is_solved_on_a_pack_is_kept_on_the_shelf_and_not_in_it(pack, tmp_path):
    def everything():
        return {path: path.read_bytes() for path in pack.rglob("*") if path.is_file()}

    before = everything()
    graph = open_graph(pack, store=tmp_path / "another")
    assert graph.rank("degree").solved_on is None
    assert open_graph(pack, store=tmp_path / "another").rank("degree").solved_on is not None
    assert open_graph(pack, store=False).rank("degree").solved_on is None
    assert everything() == before


def test_a_pack_can_be_packed_again(pack, edges, tmp_path):
    graph = open_graph(pack, store=False)
    again = tmp_path / "again"
    write_pack(graph, str(again), LoadOptions(), describe(pack))
    assert graph_facts(open_graph(again, store=False)) == graph_facts(graph)
    assert open_graph(again, store=False).rank().solved_on is not None


@pytest.mark.parametrize("damage", ["flip", "cut", "gone"])
def test_a_damaged_pack_is_one_sentence(pack, damage):
    for path in sorted(pack.glob("*.arrow")):
        data = path.read_bytes()
        if damage == "gone":
            path.unlink()
        else:
            changed = bytearray(data)
            changed[len(data) // 2] ^= 4
            path.write_bytes(data[:-9] if damage == "cut" else changed)
        with pytest.raises(InputError) as said:
            open_graph(pack)
        assert path.name in said.value.sentence
        assert "make it again with kingpost pack" in said.value.sentence
        path.write_bytes(data)
    assert open_graph(pack).n == 7


def test_a_damaged_result_in_a_pack_is_solved_anew_and_left_alone(pack, edges, nodes):
    for path in pack.glob("results/*/nodes.arrow"):
        data = bytearray(path.read_bytes())
        data[len(data) // 2] ^= 1
        path.write_bytes(data)
    result = open_graph(pack, store=False).rank()
    assert result.solved_on is None
    assert result_facts(result) == result_facts(load(edges, nodes=str(nodes)).rank())
    assert len(list(pack.glob("results/*/nodes.arrow"))) == 2


def forged(pack, name, column, change):
    """Other numbers under right checksums: what somebody else could send."""
    path = pack / name
    with pa.ipc.open_file(path) as file:
        table = file.read_all()
    at = table.column_names.index(column)
    values = np.array(table.column(column).to_numpy())
    change(values)
    table = table.set_column(at, column, pa.array(values)).combine_chunks()
    with pa.OSFile(str(path), "wb") as sink, pa.ipc.new_file(sink, table.schema) as writer:
        writer.write(table.to_batches()[0])
    digest = Digest()
    digest.add(memoryview(path.read_bytes()))
    manifest = json.loads((pack / "manifest.json").read_bytes())
    manifest["files"][name] = {"bytes": digest.size, "blake2b": digest.hex()}
    manifest["seal"] = seal_of(manifest)
    (pack / "manifest.json").write_text(json.dumps(manifest))


def put(at, value):
    def change(values):
        values[at] = value

    return change


FORGERIES = [
    ("outward_edges.arrow", "neighbour", put(0, 7)),
    ("inward_edges.arrow", "neighbour", put(-1, 2**32 - 1)),
    ("outward_edges.arrow", "weight", put(0, -1.0)),
    ("outward_edges.arrow", "weight", put(0, np.nan)),
    ("inward_edges.arrow", "weight", put(3, np.inf)),
    ("outward_offsets.arrow", "offset", put(0, 1)),
    ("outward_offsets.arrow", "offset", put(-1, 2**40)),
    ("outward_offsets.arrow", "offset", put(2, -5)),
    ("inward_offsets.arrow", "offset", put(1, 2**62)),
    ("structure_nodes.arrow", "component", put(0, 1_000)),
    ("structure_nodes.arrow", "order", put(0, 1_000)),
    ("structure_nodes.arrow", "order", lambda values: put(0, values[1])(values)),
    ("structure_starts.arrow", "start", put(1, 2**40)),
    ("structure_cyclic.arrow", "component", put(0, 2**40)),
    ("structure_cyclic.arrow", "component", put(0, -1)),
    ("structure_cyclic.arrow", "inner", put(0, -4)),
]


@pytest.mark.parametrize(("name", "column", "change"), FORGERIES)
def test_a_forged_pack_leads_no_loop_astray(pack, name, column, change):
    forged(pack, name, column, change)
    with pytest.raises(InputError, match="outside their range"):
        open_graph(pack, store=False)


def test_forging_is_what_the_tests_above_do(pack):
    forged(pack, "outward_edges.arrow", "weight", lambda values: None)
    assert open_graph(pack, store=False).n == 7


def test_a_pack_stands_alone(pack, edges):
    for paths in ([pack, edges], [edges, pack]):
        with pytest.raises(InputError, match="name it alone"):
            open_graph(paths)


def test_loading_options_are_those_it_was_made_with(pack, edges, tmp_path, nodes):
    for given in ({"directed": False}, {"parallel": "max"}, {"weight": "other"}):
        with pytest.raises(SettingsError, match="is a pack, made with"):
            open_graph(pack, **given)
    assert open_graph(pack, nodes=str(nodes)).n == 7  # as it was made
    other = tmp_path / "other"
    packed(load(edges, directed=False), edges, other, directed=False)
    assert not open_graph(other).directed
    assert not open_graph(other, directed=False).directed


def test_a_folder_of_tables_is_no_pack_whatever_else_is_in_it(edges, tmp_path):
    folder = tmp_path / "tables"
    folder.mkdir()
    shutil.copy(edges, folder / "a.parquet")
    for text in ("", "{}", '{"name": "something else"}'):
        (folder / "manifest.json").write_text(text)
        assert open_graph(folder).n == 7


def test_where_a_pack_may_go(pack, edges, tmp_path):
    graph = load(edges)
    full = tmp_path / "full"
    full.mkdir()
    (full / "letter.txt").write_text("dear")
    file = tmp_path / "file"
    file.write_text("x")
    for place, words in (
        (full, "holds other things"),
        (file, "is a file"),
        (tmp_path / "no" / "pack", "there is no folder"),
    ):
        with pytest.raises(OutputError, match=words):
            packed(graph, edges, place)
    assert os.listdir(full) == ["letter.txt"]
    empty = tmp_path / "empty"
    empty.mkdir()
    packed(graph, edges, empty)
    assert graph_facts(open_graph(empty)) == graph_facts(graph)
    other = load(edges, directed=False)
    packed(other, edges, pack)  # in place of the pack that was there
    assert graph_facts(open_graph(pack)) == graph_facts(other)


def test_a_pack_that_cannot_be_finished_leaves_the_old_one(pack, edges, monkeypatch):
    from kingpost.core.store import sealed

    def write(self, data):
        raise OSError(28, "No space left on device")

    before = graph_facts(open_graph(pack))
    monkeypatch.setattr(sealed._Sink, "write", write)
    with pytest.raises(OutputError, match="No space left on device"):
        packed(load(edges, directed=False), edges, pack)
    monkeypatch.undo()
    assert graph_facts(open_graph(pack)) == before
    assert not [name for name in os.listdir(pack.parent) if name.startswith(".")]
