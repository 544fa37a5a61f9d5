"""What a spreadsheet would run becomes text, and nothing else changes."""

from __future__ import annotations

import pyarrow as pa
import pytest

from kingpost.core.export.formulas import Plain


@pytest.mark.parametrize("kind", [pa.string(), pa.large_string()])
def test_formulas_begin_with_an_apostrophe(kind: pa.DataType) -> None:
    runs = ["=1+1", "+1", "-1", "@x", "\tx", "\rx", "＝1", "＋1", "－1", "＠x"]
    stays = ["a=1", "'=1", " =1", "", "1", None, "n-1", "\nx"]
    change = Plain()
    column = change(pa.array([*runs, *stays], kind))
    assert column.type == kind
    assert column.to_pylist() == ["'" + text for text in runs] + stays
    assert change.changed == len(runs)
    assert "10 cells begin" in change.sentence


def test_numbers_are_left_alone_and_names_are_not() -> None:
    change = Plain()
    numbers = pa.array([-1.5, 2.0])
    assert change(numbers) is numbers
    assert change.names(["rank", "=evil()"]) == ["rank", "'=evil()"]
    assert "1 cell begins" in change.sentence
