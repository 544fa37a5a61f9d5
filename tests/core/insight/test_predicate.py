"""Rows kept by an SQL condition, against plain Python over the same rows."""

from __future__ import annotations

import threading

import numpy as np
import pyarrow as pa
import pytest

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.insight.predicate import matching
from kingpost.core.watch import Watch

RANK = [1, 2, 3, 4, 5, 6]
SCORE = [0.5, 0.25, 0.125, 0.0625, float("nan"), 0.0]
TEAM = ["red", None, "blue", "red", "it's", "amber"]
COLUMNS = {
    "rank": lambda: pa.array(RANK),
    "score": lambda: pa.array(SCORE),
    "team": lambda: pa.array(TEAM),
    "Home Port": lambda: pa.array(["a", "b", "a", "b", "a", "b"]),
    "seen": lambda: pa.array([True, False, True, None, True, False]),
}


def kept(text):
    return matching(COLUMNS, 6, text).tolist()


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("rank < 3", [i for i, r in enumerate(RANK) if r < 3]),
        ("RANK between 2 and 4 and team = 'red'", [3]),
        ("team is null", [1]),
        ("team <> 'red'", [2, 4, 5]),  # null is neither red nor something else
        ("team = 'it''s'", [4]),
        ("\"Home Port\" = 'a' and rank > 1", [2, 4]),
        ("seen", [0, 2, 4]),
        ("not seen", [1, 5]),
        ("null", []),
        ("true", [0, 1, 2, 3, 4, 5]),
        ("rank < 4 -- and more", [0, 1, 2]),
        ("team like '%e%'", [0, 2, 3, 5]),
    ],
)
def test_keeps_what_the_condition_says(text, expected):
    assert kept(text) == expected


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("rnk < 3", "names column 'rnk', which this table lacks; did you mean rank?"),
        ("rank < 3 and xyzzy = 2", "names column 'xyzzy', which this table lacks"),
        ("rank <", "does not read as one SQL expression"),
        ("rank < 3 4", "does not read as one SQL expression at position 10"),
        ("rank", "a value of type BIGINT for each row"),
        ("team", "a value of type VARCHAR for each row"),
        ("rank < 3; drop table nodes", "one SQL expression"),
        ("rank < 3, true", "one SQL expression"),
        ("rank < 3 order by rank", "one SQL expression"),
        ("true) union select (1", "does not read as one SQL expression"),
        ("count(*) > 1", "a value of many rows"),
        ("row_number() over () < 2", "a window function"),
        ("zap(rank) = 1", "uses zap, which is no function"),
        ("", "is empty"),
        ("team like '%a", "does not read as one SQL expression"),
        ("score < 'x'", "cannot be evaluated on this table"),
    ],
)
def test_says_in_one_sentence_what_is_wrong(text, said):
    with pytest.raises(SettingsError) as caught:
        kept(text)
    assert said in caught.value.sentence
    assert "\n" not in caught.value.sentence


@pytest.mark.parametrize(
    "text",
    [
        "rank < (select count(*) from read_csv('/etc/passwd'))",
        "team in (select * from '/etc/passwd')",
        "rank < (select count(*) from glob('/*'))",
        "(select content from read_text('/etc/hostname')) is not null",
    ],
)
def test_reads_no_file(text):
    with pytest.raises(SettingsError, match="a query within the expression"):
        kept(text)


def test_python_variables_are_out_of_reach():
    secret = pa.table({"x": [1]})
    with pytest.raises(SettingsError):
        kept("rank in (select x from secret)")
    assert secret.num_rows == 1


def test_only_the_columns_named_are_made():
    made = []
    columns = {
        "rank": lambda: made.append("rank") or pa.array(RANK),
        "other": lambda: made.append("other") or pa.array(RANK),
    }
    assert matching(columns, 6, "rank = 1").tolist() == [0]
    assert made == ["rank"]


def test_a_long_question_ends_when_asked():
    watch = Watch(threads=1)
    n = 2_000_000
    columns = {"rank": lambda: pa.array(np.arange(n))}
    threading.Timer(0.05, watch.cancel).start()
    long = " + ".join(f"sin(rank + {k})" for k in range(60))
    with pytest.raises(Interrupted):
        matching(columns, n, f"{long} > 0", watch)
