"""Names that differ only by white space or Unicode normal form are reported and kept apart."""

import re

import pyarrow as pa
import pytest

from kingpost.core.ingest import from_table
from kingpost.core.ingest.names import alike


@pytest.mark.parametrize("sort", [pa.string(), pa.large_string()])
@pytest.mark.parametrize(
    ("names", "words"),
    [
        (["a", "a "], '1 name differs from another only by white space .* "a " and "a"; they'),
        (["\ta", "a ", "b"], r'2 names differ .* "\\ta" and "a "'),
        (["\ta", "a ", "a"], r'2 names differ .* "\\ta" and "a"'),
        (["caf\u00e9", "cafe\u0301"], r"1 name differs .* \(cafe\\u0301\) and .* \(caf\\xe9\)"),
    ],
)
def test_names_that_look_alike(names, words, sort):
    sentence = alike(pa.array(names, sort))
    assert re.search(words, sentence), sentence


@pytest.mark.parametrize(
    "labels",
    [
        pa.array(["a", "b", ""]),
        pa.array([" a", "b "]),
        pa.array(["a b", "ab"]),
        pa.array(["A", "a"]),
        pa.array([1, 2]),
        pa.array([b"a", b"a "]),
        pa.array([], pa.string()),
    ],
)
def test_names_that_do_not(labels):
    assert alike(labels) is None


def test_the_note_travels_with_the_graph():
    graph = from_table(pa.table({"source": ["a", "a "], "target": ["b", "b"]}))
    assert graph.n == 3
    assert "only by white space" in graph.account.notes[-1]
