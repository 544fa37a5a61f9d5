"""What manifests hold comes back exactly as it was, and reading can make nothing else."""

import json
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core.store.plain import NotPlain, pack, text_of, unpack

LEAVES = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(),
    st.just("\ud800"),  # half a character, as in names of files that are no UTF-8
)
VALUES = st.recursive(
    LEAVES,
    lambda inner: st.one_of(
        st.lists(inner, max_size=4),
        st.lists(inner, max_size=4).map(tuple),
        st.dictionaries(st.one_of(st.text(max_size=3), st.sampled_from(["$", "is"])), inner),
    ),
    max_leaves=12,
)


def same(one, other):
    """Equal in type and bits; NaN equals NaN."""
    if type(one) is not type(other):
        return False
    if isinstance(one, float):
        return one.hex() == other.hex()
    if isinstance(one, (list, tuple)):
        return len(one) == len(other) and all(map(same, one, other))
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(same(one[key], other[key]) for key in one)
    return one == other


@given(VALUES)
def test_any_plain_value_survives_the_way_through_json(value):
    assert same(unpack(json.loads(json.dumps(pack(value), allow_nan=False))), value)
    assert text_of(value) == text_of(unpack(pack(value)))


@given(VALUES, VALUES)
def test_texts_are_equal_for_equal_values_only(one, other):
    assert (text_of(one) == text_of(other)) == same(one, other)


def test_numpy_numbers_become_plain_and_nothing_else_is_taken():
    assert pack(np.float64(0.1)) == 0.1
    assert type(pack(np.int64(3))) is int
    assert math.isnan(unpack(pack(float("nan"))))
    for value in (object(), {1: 2}, {3.5}, b"x", np.zeros(2), print):
        with pytest.raises(NotPlain):
            pack(value)


def test_a_wrapping_of_an_unknown_kind_is_refused():
    for text in ('{"$": "call", "is": ["os.system"]}', '{"$": "float", "is": "1e400"}', '{"$": 1}'):
        with pytest.raises(ValueError, match="unknown kind"):
            unpack(json.loads(text))
