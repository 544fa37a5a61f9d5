"""What is decided about a terminal from its environment."""

from __future__ import annotations

import pytest
from rich.style import Style

from kingpost.tui.terminal import ASCII, UNICODE, decide, keep_fault


@pytest.mark.parametrize(
    ("environ", "ascii_only"),
    [
        ({"LANG": "C.UTF-8"}, False),
        ({"LANG": "de_DE.UTF-8"}, False),
        ({"LANG": "C.utf8"}, False),
        ({"LANG": "de_DE.ISO-8859-1"}, True),
        ({"LANG": "C"}, True),
        ({"LC_ALL": "C", "LANG": "de_DE.UTF-8"}, True),
        ({"LANG": "POSIX", "LC_CTYPE": "C.UTF-8"}, True),  # coerced by Python
        ({}, True),
        ({"LANG": "C.UTF-8", "KINGPOST_ASCII": "1"}, True),
    ],
)
def test_line_drawing_follows_the_locale(environ, ascii_only):
    assert decide(environ).glyphs is (ASCII if ascii_only else UNICODE)


def test_ascii_glyphs_are_ascii():
    assert all(str(getattr(ASCII, name)).isascii() for name in ASCII.__slots__ if name != "ascii")


@pytest.mark.parametrize("environ", [{"NO_COLOR": "1"}, {"TERM": "dumb"}])
def test_no_colour_leaves_no_colour_in_any_style(environ):
    looks = decide({"LANG": "C.UTF-8"} | environ)
    assert not looks.colour
    for style in looks.styles.values():
        parsed = Style.parse(style)
        assert parsed.color is None
        assert parsed.bgcolor is None


def test_an_empty_no_color_is_not_set():
    # no-color.org: the variable counts when it is not an empty string.
    assert decide({"LANG": "C.UTF-8", "NO_COLOR": ""}).colour


def test_only_the_terminals_sixteen_colours_are_used():
    for style in decide({"LANG": "C.UTF-8"}).styles.values():
        colour = Style.parse(style).color
        assert colour is None or colour.number < 16


def test_states_are_told_apart_without_colour():
    for glyphs in (UNICODE, ASCII):
        assert len(set(glyphs.rail)) == 4
        assert len({glyphs.residual, glyphs.bound, glyphs.both, glyphs.tolerance, glyphs.step}) == 5


def test_a_fault_is_written_down(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    place = keep_fault("a trace")
    assert place.startswith(str(tmp_path))
    with open(place) as log:
        assert log.read() == "a trace\n"
