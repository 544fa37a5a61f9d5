"""Sittings that were kept: what comes back, what is left out, and what is wrong with a file."""

from __future__ import annotations

import datetime
import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core.measures import NAMES, measure
from kingpost.tui import places
from kingpost.tui.models import resumption
from kingpost.tui.models.resumption import Kept

PATHS = ["ferry.parquet"]
KEPT = Kept(
    when="2031-05-04T14:02:00+02:00",
    measure="katz",
    settings={"katz": {"alpha_fraction": 0.5}, "surfer": {}},
    wanted={"sort": "rank:surfer", "turned": True, "where": "rank <= 50"},
    order=["in", "out"],
    hidden=["out"],
    cursor="gate\x1b",
    view="node",
    trail=["quay", "gate\x1b"],
    trail_at=1,
    find="ga",
    marks=2,
    tables=[[12, 34]],
    options={"source": "caller"},
)


def test_what_was_kept_comes_back():
    assert resumption.read(PATHS) is None
    resumption.write(PATHS, KEPT)
    assert resumption.read(PATHS) == KEPT
    assert resumption.file_of(PATHS).stat().st_mode & 0o777 == 0o600
    resumption.forget(PATHS)
    assert resumption.read(PATHS) is None


@pytest.mark.parametrize(
    "content",
    [
        "",
        "nonsense",
        "[]",
        '{"format": 0}',
        json.dumps({"format": 1, "when": 5}),
        json.dumps({"format": 1, "settings": []}),
        json.dumps({"format": 1, "settings": {"katz": 1}}),
        json.dumps({"format": 1, "trail": [1]}),
        json.dumps({"format": 1, "trail": "quay"}),
        json.dumps({"format": 1, "trail_at": "x"}),
    ],
)
def test_a_damaged_file_is_one_sentence(content):
    file = resumption.file_of(PATHS)
    file.parent.mkdir(parents=True)
    file.write_text(content)
    with pytest.raises(places.StateError) as caught:
        resumption.read(PATHS)
    assert str(file) in caught.value.sentence


@given(st.binary(max_size=200))
def test_any_bytes_are_a_sitting_or_a_sentence(data):
    file = resumption.file_of(PATHS)
    file.parent.mkdir(parents=True, exist_ok=True)
    file.write_bytes(data)
    with pytest.raises(places.StateError):
        resumption.read(PATHS)


def test_the_offer_says_what_it_is_about_and_nothing_that_acts():
    words = resumption.words(KEPT)
    assert words == (
        "katz and 1 other measure, rows where rank <= 50, sorted by rank surfer, at gate\\e, "
        "2 marks"
    )


@pytest.mark.parametrize("name", NAMES)
def test_settings_of_every_measure_come_back(name):
    kind = measure(name).settings
    default = kind()
    plain, lost = resumption.plain_settings(default)
    assert (plain, lost) == ({}, [])
    other = kind(flow="against", tol=1e-6, max_sweeps=7)
    plain, lost = resumption.plain_settings(other)
    assert lost == []
    assert resumption.settings_of(kind, json.loads(json.dumps(plain))) == other


def test_vectors_come_back_up_to_a_size():
    kind = measure("surfer").settings
    some = kind(teleport={"identity": 1.0, "gate": 0.5})
    plain, _ = resumption.plain_settings(some)
    assert resumption.settings_of(kind, json.loads(json.dumps(plain))) == some
    many = kind(teleport={f"node-{i}": 1.0 for i in range(6_000)})
    plain, lost = resumption.plain_settings(many)
    assert "teleport" not in plain
    assert lost == ["teleport"]


def test_settings_that_no_longer_exist_or_are_out_of_range_are_none():
    kind = measure("surfer").settings
    assert resumption.settings_of(kind, {"damping": 7.0}) is None
    assert resumption.settings_of(kind, {"speed": 1}) is None
    assert resumption.settings_of(kind, {"damping": "x"}) is None
    assert resumption.settings_of(kind, {"teleport": {"pairs": [[1]]}}) is not None


@pytest.mark.parametrize(
    ("when", "said"),
    [
        ("2031-05-04T09:05:00+00:00", "today 09:05"),
        ("2031-05-03T23:59:00+00:00", "yesterday 23:59"),
        ("2031-04-01T10:00:00+00:00", "2031-04-01"),
        ("soon", "-"),
        ("", "-"),
    ],
)
def test_times_as_people_say_them(when, said):
    now = datetime.datetime(2031, 5, 4, 12, 0, tzinfo=datetime.UTC)
    assert resumption.clock(when, now) == said
