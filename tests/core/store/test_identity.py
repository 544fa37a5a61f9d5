"""The same key only for the same inputs, read the same way."""

import contextlib
import dataclasses
import os

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from keeping import graph_facts, result_facts

from kingpost.core.errors import InputError, SettingsError
from kingpost.core.ingest import LoadOptions, load
from kingpost.core.ingest.options import CHOICES
from kingpost.core.store.identity import identify

OTHER = {
    "source": "target",
    "target": "source",
    "weight": "weight",
    "nodes": "NODES",
    "node_id": "id",
    "directed": False,
    "parallel": "mean",
    "loops": "drop",
    "bad_rows": "skip",
    "weight_as": "none",
    "where": "weight > 1",
    "node_where": "team = 'pier'",
}


def acceptable(item):
    """Another value for an option that came later than these tests."""
    for value in (*CHOICES.get(item.name, ()), "another value", ";", "latin-1", 7, True, False):
        with contextlib.suppress(SettingsError):
            LoadOptions(**{item.name: value})
            if value != item.default:
                return value
    raise AssertionError(f"say in OTHER what {item.name} takes")


def key(*paths, **options):
    found = identify([str(path) for path in paths], LoadOptions(**options))
    return found and found.key


def written(path, **columns):
    pq.write_table(pa.table(columns), path)
    return path


def test_every_option_enters_the_key(edges, nodes):
    keys = {key(edges)}
    for item in dataclasses.fields(LoadOptions):
        value = OTHER.get(item.name)
        given = {item.name: str(nodes) if value == "NODES" else value}
        if item.name in ("node_id", "node_where"):
            given["nodes"] = str(nodes)
        if value is None:
            given = {item.name: acceptable(item)}
        keys.add(key(edges, **given))
    assert len(keys) == 1 + len(dataclasses.fields(LoadOptions))


def test_an_option_that_does_not_exist_yet_enters_it_too(edges):
    @dataclasses.dataclass(frozen=True, kw_only=True)
    class Later(LoadOptions):
        fancy: str = "no"

    plain, fancy = (identify([str(edges)], Later(fancy=word)).key for word in ("no", "yes"))
    assert plain != fancy
    assert plain != key(edges)  # another class may read its fields otherwise


def test_options_that_are_no_plain_values_have_no_key(edges):
    @dataclasses.dataclass(frozen=True, kw_only=True)
    class Later(LoadOptions):
        judge: object = print

    assert identify([str(edges)], Later()) is None


def test_touching_moving_and_rewriting_change_the_key(edges, tmp_path):
    first = key(edges)
    assert key(edges) == first
    about = edges.stat()
    os.utime(edges, ns=(about.st_atime_ns, about.st_mtime_ns + 1))
    touched = key(edges)
    assert touched != first  # the same size, another time
    data = edges.read_bytes()
    edges.write_bytes(data)
    os.utime(edges, ns=(about.st_atime_ns, about.st_mtime_ns))
    assert key(edges) not in (first, touched)  # the time was put back, the system knows better
    edges.rename(tmp_path / "moved.parquet")
    assert key(tmp_path / "moved.parquet") != first


def test_a_file_that_changed_is_read_anew(desk, tmp_path):
    path, sizes = tmp_path / "x.parquet", set()
    plain = {"use_dictionary": False, "write_statistics": False, "compression": "none"}
    for target in ([2, 3, 1], [2, 3, 2], [1, 1, 1], [3, 3, 2]):  # in quick succession
        pq.write_table(pa.table({"source": [1, 2, 3], "target": target}), path, **plain)
        sizes.add(path.stat().st_size)
        graph, fresh = desk.open(path), load(path)
        assert graph_facts(graph) == graph_facts(fresh)
        assert result_facts(desk.rank(graph)) == result_facts(fresh.rank())
    assert len(sizes) == 1


def test_a_table_that_changes_while_it_is_read_is_not_kept(desk, edges, monkeypatch):
    from kingpost.core import ingest

    honest = ingest.load

    def load(paths, options, watch):
        graph = honest(paths, options, watch)
        written(edges, source=["x"], target=["y"])
        return graph

    monkeypatch.setattr(ingest, "load", load)
    assert desk.open(edges).n == 7
    assert desk.graphs == []
    monkeypatch.undo()
    assert desk.open(edges).n == 2


def test_a_node_table_that_changed_is_joined_anew(desk, edges, nodes):
    first = desk.open(edges, nodes=str(nodes))
    written(nodes, id=["a", "b", "d"], team=["pier", "x", "boats"])
    again = desk.open(edges, nodes=str(nodes))
    assert (
        first.attributes.column("team").to_pylist() != again.attributes.column("team").to_pylist()
    )


def test_a_folder_that_gains_a_file_is_read_anew(desk, tmp_path):
    folder = tmp_path / "tables"
    folder.mkdir()
    written(folder / "a.parquet", source=[1], target=[2])
    assert desk.open(folder).n == 2
    written(folder / "b.parquet", source=[2], target=[3])
    assert desk.open(folder).n == 3
    assert desk.open(f"{folder}/*.parquet").n == 3
    assert desk.open(folder / "a.parquet").n == 2


def test_the_order_of_files_counts(tmp_path):
    """``--parallel first`` takes the row that comes first."""
    one = written(tmp_path / "1.parquet", source=[1], target=[2], weight=[1.0])
    two = written(tmp_path / "2.parquet", source=[1], target=[2], weight=[2.0])
    assert key(one, two) != key(two, one)


def test_the_spelling_of_a_path_counts(tmp_path, monkeypatch, desk):
    """Partition columns are read off the path as it was given."""
    folder = tmp_path / "from=7"
    folder.mkdir()
    written(folder / "x.parquet", source=[1, 2], target=[2, 3])
    monkeypatch.chdir(folder)
    near, far = desk.open("x.parquet"), desk.open(str(folder / "x.parquet"))
    assert near.origin.files == ("x.parquet",)
    assert far.origin.files == (str(folder / "x.parquet"),)
    assert len(desk.graphs) == 2


@pytest.mark.parametrize(
    "condition",
    ["random() < 0.5", "weight > 1 AND now() > TIMESTAMP '2020-01-01'", "Current_Date > day"],
)
def test_conditions_that_pass_with_time_have_no_key(edges, condition):
    assert key(edges, where=condition) is None
    assert key(edges, where="weight > 1") is not None


def test_the_time_zone_counts_where_a_condition_may_ask_for_it(edges, monkeypatch):
    plain, where = key(edges), key(edges, where="weight > 1")
    monkeypatch.setenv("TZ", "Asia/Tokyo")
    assert key(edges) == plain
    assert key(edges, where="weight > 1") != where


def test_pipes_and_standard_input_have_no_key(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    assert key(tmp_path / "pipe") is None
    assert key("-") is None


def test_what_names_nothing_is_said_as_loading_says_it(desk, tmp_path):
    with pytest.raises(InputError) as plain:
        load(tmp_path / "none.parquet")
    with pytest.raises(InputError) as through:
        desk.open(tmp_path / "none.parquet")
    assert str(through.value) == str(plain.value)
    with pytest.raises(InputError):
        desk.open()


def test_large_footers_are_taken_whole(tmp_path):
    """Many row groups: the footer is longer than the last bytes looked at first."""

    def table(middle):
        return pa.table({"source": list(range(900)), "target": [*range(450), middle, *range(449)]})

    path = tmp_path / "x.parquet"
    pq.write_table(table(5), path, row_group_size=1)
    about, size = path.stat(), path.stat().st_size
    assert size > 2 * 65_536
    from kingpost.core.store.identity import _of_file

    ends = _of_file(str(path))["ends"]
    pq.write_table(table(6), path, row_group_size=1)
    os.utime(path, ns=(about.st_atime_ns, about.st_mtime_ns))
    assert path.stat().st_size == size
    assert _of_file(str(path))["ends"] != ends
