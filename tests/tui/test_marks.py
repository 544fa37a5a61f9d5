"""Marks: kept by name from sitting to sitting, found again when the table has moved or changed."""

from __future__ import annotations

import base64
import csv
import json
import os
import stat
import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.tui import clipboard, places
from kingpost.tui.models import marks as model
from kingpost.tui.models.marks import Mark, Marks
from kingpost.tui.models.sitting import Sitting


def keep(graph, paths, *nodes, fingerprint=None):
    marks = Marks()
    for node in nodes:
        marks.add(graph, node).note = f"note on {node}"
    model.save(marks.as_json(), paths, graph, fingerprint)
    return marks


def fetch(paths, graph):
    return model.locate(graph, model.read(paths) or model.read_moved(graph))


def test_marks_come_back_in_their_order_with_their_notes(graph, tmp_path):
    paths = [str(tmp_path / "calls.parquet")]
    keep(graph, paths, 3, 1)
    found = fetch(paths, graph)
    assert [(mark.node, mark.name, mark.note) for mark in found] == [
        (3, "kiosk", "note on 3"),
        (1, "fare", "note on 1"),
    ]
    assert 3 in found
    assert 2 not in found


def test_the_file_is_for_its_owner_only_and_whole(graph, tmp_path):
    paths = [str(tmp_path / "calls.parquet")]
    keep(graph, paths, 3)
    file = model.marks_file(paths)
    assert stat.S_IMODE(os.stat(file).st_mode) == 0o600
    assert stat.S_IMODE(os.stat(file.parent).st_mode) == 0o700
    assert os.listdir(file.parent) == [file.name]  # no part of a file is left beside it


def test_a_name_the_graph_lacks_is_kept_for_the_day_it_has_it(graph, make_graph, tmp_path):
    paths = [str(tmp_path / "calls.parquet")]
    keep(graph, paths, 3, 1)
    other = make_graph(["fare", "lamp"], [(0, 1, 1.0)])
    found = fetch(paths, other)
    assert [(mark.node, mark.name) for mark in found] == [(None, "kiosk"), (0, "fare")]
    model.save(found.as_json(), paths, other, None)
    assert {mark.node for mark in fetch(paths, graph)} == {3, 1}


def test_a_table_that_has_moved_is_known_by_its_fingerprint(graph, make_graph, tmp_path):
    keep(graph, [str(tmp_path / "old.parquet")], 2, fingerprint=graph.fingerprint)
    new = [str(tmp_path / "new.parquet")]
    assert [mark.node for mark in fetch(new, graph)] == [2]
    # As many nodes and edges, but another graph.
    turned = make_graph(
        ["berth", "fare", "gate", "kiosk", "quay", "ticket"],
        [(v, u, 1.0) for u, v in [(0, 1), (0, 2), (1, 2), (2, 3), (3, 2), (4, 2), (4, 1), (5, 0)]],
    )
    assert (turned.n, turned.m) == (graph.n, graph.m)
    assert len(fetch(new, turned)) == 0


@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"{",
        b"[1, 2]",
        b'{"format": 99, "marks": []}',
        b'{"format": 1, "marks": [{"note": "of what"}]}',
        b'{"format": 1, "marks": {"node": 1}}',
        b"\xff\xfe",
        b"[" * 100_000,
    ],
)
def test_a_damaged_file_is_one_sentence(graph, tmp_path, content):
    paths = [str(tmp_path / "calls.parquet")]
    file = model.marks_file(paths)
    file.parent.mkdir(parents=True)
    file.write_bytes(content)
    with pytest.raises(places.StateError) as caught:
        model.read(paths)
    assert str(file) in caught.value.sentence
    assert "\n" not in caught.value.sentence
    assert len(model.read_moved(graph)) == 0  # nor does it hinder the search of all files


def test_a_full_disk_is_a_sentence_and_leaves_the_old_file(graph, tmp_path, monkeypatch):
    paths = [str(tmp_path / "calls.parquet")]
    keep(graph, paths, 3)

    def full(handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(places.StateError, match="No space left on device"):
        keep(graph, paths, 1)
    monkeypatch.undo()
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path / "state"))
    assert [mark.name for mark in fetch(paths, graph)] == ["kiosk"]
    assert os.listdir(model.marks_file(paths).parent) == [model.marks_file(paths).name]


def test_a_mark_taken_off_comes_back_with_its_note(graph):
    marks = Marks()
    marks.add(graph, 2).note = "ask the pilots"
    marks.remove(marks.of(2))
    assert 2 not in marks
    assert marks.add(graph, 2).note == "ask the pilots"


def test_ids_of_any_type_are_found_again(make_graph, tmp_path):
    paths = [str(tmp_path / "x.parquet")]
    for names in ([1, 22, 333], [b"\x00", b"ab", b"\xff"], ["a\x1b[31m", "b\n", "日本"]):
        graph = make_graph(names, [(0, 1, 1.0)])
        keep(graph, paths, 0, 2)
        assert sorted(mark.node for mark in fetch(paths, graph)) == [0, 2]
        model.marks_file(paths).unlink()


def test_the_csv_holds_names_notes_and_ranks(graph, make_result, bench):
    sitting = Sitting(graph, "plain", names=("plain", "mirror"), find=bench.find)
    for name, scores in (("plain", [1, 2, 3, 4, 5, 6]), ("mirror", [1, 1, 2, 3, 4, 5])):
        sitting.record(make_result(graph, scores, measure=name))
    marks = Marks()
    marks.add(graph, 0).note = 'say "when", or not'
    marks.put(Mark("gone", "left"))
    rows = list(csv.reader(model.csv_table(list(marks), sitting).decode().splitlines()))
    assert rows == [
        ["node", "note", "rank_plain", "rank_mirror"],
        ["berth", 'say "when", or not', "6", "5-6"],
        ["gone", "left", "", ""],
    ]


@given(st.text(max_size=300))
def test_what_is_copied_cannot_act_on_a_terminal(text):
    sequence = clipboard.sequence(text)
    body = sequence.removeprefix("\x1b]52;c;").removesuffix("\x07")
    pasted = base64.b64decode(body, validate=True).decode()
    assert not [c for c in pasted if unicodedata.category(c)[0] == "C" and c != "\t"]
    if text.isprintable() and text.isascii():
        assert pasted == text


def test_what_terminals_would_cut_is_not_copied():
    assert clipboard.sequence("x" * clipboard.LIMIT) is not None
    assert clipboard.sequence("x" * (clipboard.LIMIT + 1)) is None
    assert clipboard.sequence("日" * clipboard.LIMIT) is None


def test_a_file_of_the_state_folder_is_plain_json(graph, tmp_path):
    paths = [str(tmp_path / "calls.parquet")]
    keep(graph, paths, 3)
    value = json.loads(model.marks_file(paths).read_text())
    assert value["nodes"] == 6
    assert value["marks"][0]["node"] == "kiosk"
