"""The settings form, made from a Settings type."""

from __future__ import annotations

import pytest

from kingpost.tui.models.forms import fields_of, validated


def test_fields_come_from_the_type(plain_settings):
    fields = {found.name: found for found in fields_of(plain_settings())}
    assert list(fields)[-3:] == ["tol", "stop", "max_sweeps"]
    assert fields["pull"].kind == "number"
    assert fields["pull"].reach == "from 0 below 1"
    assert fields["side"].choices == ("near", "far")
    assert fields["steps"].kind == "whole"
    assert fields["pull"].words == "how strongly it pulls"


def test_valid_texts_become_settings(plain_settings):
    settings, wrong = validated(plain_settings(), {"pull": "0.25", "side": "far", "steps": "1,000"})
    assert wrong == ""
    assert (settings.pull, settings.side, settings.steps) == (0.25, "far", 1000)


@pytest.mark.parametrize(
    ("texts", "words"),
    [
        ({"pull": "1"}, "pull is 1; it takes a number at least 0 and less than 1"),
        ({"pull": "x"}, "pull is 'x'; it takes a number from 0 below 1"),
        ({"steps": "1.5"}, "steps is '1.5'; it takes a whole number from 1"),
        ({"stop": "order:0"}, "order:K"),
        ({"pull": "\x1b[31m"}, "\\e[31m"),
        ({"pull": "nan"}, "pull"),
    ],
)
def test_what_is_wrong_is_said(plain_settings, texts, words):
    settings, wrong = validated(plain_settings(), texts)
    assert settings is None
    assert words in wrong


def test_untouched_fields_keep_their_exact_values(plain_settings):
    start = plain_settings(pull=1 / 3)
    assert validated(start, {"side": "far"})[0].pull == 1 / 3
