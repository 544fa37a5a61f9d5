"""Written tables hold exactly the rows of the recipe; plain Python spells the expected values."""

from __future__ import annotations

import io

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import Interrupted, SettingsError
from kingpost.core.gallery import KINDS, recipe
from kingpost.core.gallery import tables as made
from kingpost.core.ingest import describe
from kingpost.core.watch import Progress, Watch


def table(kind: str, edges: int = 3_000, threads: int = 1, **form: object) -> pa.Table:
    sink = io.BytesIO()
    graph = recipe(kind, edges, seed=4)
    made.write_parquet(graph, made.TableForm(kind=kind, **form), sink, Watch(threads=threads))
    return pq.read_table(io.BytesIO(sink.getvalue()))


@pytest.mark.parametrize("kind", KINDS)
def test_rows_are_those_of_the_recipe(kind, monkeypatch):
    monkeypatch.setattr(made, "_BATCH", 700)  # several batches, the last one short
    whole = recipe(kind, 3_000, seed=4).whole()
    found = table(kind)
    assert found.schema.names[:2] == list(made.COLUMNS[kind][:2])
    assert found.column(0).to_pylist() == whole.source.tolist()
    assert found.column(1).to_pylist() == whole.target.tolist()
    if whole.weight is None:
        assert found.num_columns == 2
    else:
        assert found.column(made.COLUMNS[kind][2]).to_pylist() == whole.weight.tolist()
    assert found.equals(table(kind, threads=3))


def test_text_names_are_the_scattered_numbers_spelt_out():
    nodes = np.array([0, 1, 2, 9_999, 10_000, 2**31, 2**40 + 7])
    spelt = [f"node-{node * 0x9E3779B97F4A7C15 % 2**64:020d}" for node in nodes.tolist()]
    assert made.text_ids(nodes).to_pylist() == spelt
    assert {len(name) for name in spelt} == {25}
    many = made.text_ids(np.arange(50_000))
    assert len(many.unique()) == 50_000
    numbers = table("rmat")
    names = table("rmat", names="text")
    for at in range(2):
        expected = made.text_ids(numbers.column(at).to_numpy())
        assert names.column(at).combine_chunks().equals(expected)


def test_weights_can_be_left_out_or_drawn():
    assert table("layered", weights="none").schema.names == ["caller", "callee"]
    assert table("rmat", weights="own").schema.names == ["source", "target"]
    drawn = table("rmat", 40_000, weights="pareto", seed=9).column("weight").to_numpy()
    assert drawn.min() >= 1.0
    # P(W > w) = w^-1.2, whose median is 2^(1/1.2) and whose upper quartile is 4^(1/1.2).
    for share, power in ((0.5, 2.0), (0.75, 4.0)):
        assert np.quantile(drawn, share) == pytest.approx(power ** (1 / 1.2), rel=0.03)
    again = table("rmat", 40_000, weights="pareto", seed=10).column("weight").to_numpy()
    assert not np.array_equal(drawn, again)


@pytest.mark.parametrize("kind", ["citation", "layered", "pairwise"])
def test_times_ascend_within_their_span(kind):
    times = table(kind, time=True).column("time")
    assert times.type == pa.timestamp("ms")
    moments = times.to_numpy()
    assert (np.diff(moments) >= np.timedelta64(0)).all()
    first, last = {
        "citation": ("1950-01-01", "2020-01-02"),
        "layered": ("2020-01-01", "2020-01-02"),
        "pairwise": ("2020-01-01", "2021-01-01"),
    }[kind]
    assert np.datetime64(first) <= moments[0] < moments[-1] < np.datetime64(last)
    assert moments[-1] - moments[0] > 0.98 * (np.datetime64(last) - np.datetime64(first))


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("names", made.NAMES)
def test_a_load_finds_the_columns_by_their_names(kind, names, tmp_path):
    path = tmp_path / "made.parquet"
    timed = kind in ("citation", "layered", "pairwise")
    pq.write_table(table(kind, names=names, weights="pareto", time=timed), path)
    found = describe(path)
    assert (found.source, found.target, found.weight) == made.COLUMNS[kind]


def test_what_a_kind_does_not_have_is_refused():
    with pytest.raises(SettingsError, match="citation, layered, pairwise"):
        made.TableForm(kind="rmat", time=True)
    with pytest.raises(SettingsError, match="--names is 'words'; it takes number, text"):
        made.TableForm(kind="rmat", names="words")


def test_writing_reports_and_stops(monkeypatch):
    monkeypatch.setattr(made, "_BATCH", 500)
    seen: list[Progress] = []

    def stop(report: Progress) -> None:
        seen.append(report)
        if report.done >= 1_000:
            watch.cancel()

    watch = Watch(stop, threads=2, period=0.0)
    sink = io.BytesIO()
    with pytest.raises(Interrupted):
        made.write_parquet(recipe("rmat", 100_000), made.TableForm(kind="rmat"), sink, watch)
    assert [report.done for report in seen] == [500, 1_000]
    assert {report.total for report in seen} == {100_000}
