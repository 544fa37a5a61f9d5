"""Which columns are taken: by name, by guess, from hive partitions; and what is said about it."""

import itertools
import threading

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from reference import edges_of

from kingpost.core.errors import InputError, Interrupted
from kingpost.core.ingest import LoadOptions, describe, from_table, load
from kingpost.core.watch import Watch


def table(**types):
    made = {"s": ["a"], "i": [1], "f": [1.5], "d": [True], "t": [0]}
    return pa.table(
        {
            name: pa.array(made[sort], pa.timestamp("s") if sort == "t" else None)
            for name, sort in types.items()
        }
    )


@pytest.mark.parametrize(
    ("types", "want"),
    [
        ({"source": "s", "target": "s"}, ("source", "target", None)),
        ({"target": "i", "source": "i", "weight": "f"}, ("source", "target", "weight")),
        ({"region": "s", "caller": "s", "callee": "s"}, ("caller", "callee", None)),
        ({"Caller_ID": "i", "CalleeId": "i", "error_rate": "f"}, ("Caller_ID", "CalleeId", None)),
        ({"loser": "s", "winner": "s", "margin": "f"}, ("loser", "winner", "margin")),
        ({"citing": "i", "cited": "i", "year": "i"}, ("citing", "cited", None)),
        ({"src": "i", "dst": "i", "n": "i"}, ("src", "dst", "n")),
        ({"from_node": "s", "to_node": "s", "bytes": "i"}, ("from_node", "to_node", "bytes")),
        ({"source": "i", "target": "i", "start": "t", "end": "t"}, ("source", "target", None)),
        ({"x": "s", "y": "s", "z": "i"}, ("x", "y", None)),
        ({"x": "i", "y": "i", "weight": "i"}, ("x", "y", "weight")),
        ({"x": "i", "y": "i", "z": "s"}, ("x", "y", None)),
        (
            {"source": "i", "target": "i", "calls_per_min": "f", "n": "i"},
            ("source", "target", "calls_per_min"),
        ),
        (
            {"source": "i", "target": "i", "count": "i", "weight": "f"},
            ("source", "target", "weight"),
        ),
        (
            {"source": "i", "target": "i", "calls_per_min": "f", "calls_per_hour": "f"},
            ("source", "target", None),
        ),
        ({"x": "s", "y": "s", "z": "s"}, None),
        ({"x": "s", "y": "s", "p": "i", "q": "s"}, None),
        ({"x": "s", "y": "s", "p": "i", "q": "i"}, None),
        ({"x": "s", "y": "i"}, None),
    ],
)
def test_guesses(types, want):
    made = table(**types)
    if want is None:
        with pytest.raises(InputError, match="name them with --source and --target"):
            from_table(made)
        return
    origin = from_table(made).origin
    assert (origin.source, origin.target, origin.weight) == want


def test_every_guess_is_said():
    graph = from_table(table(caller="s", callee="s", calls_per_min="f"))
    assert graph.account.notes == (
        "took caller -> callee as the edge, calls_per_min as its weight "
        "(name them with --source, --target, --weight)",
    )
    graph = from_table(table(caller="s", callee="s"))
    assert graph.account.notes == (
        "took caller -> callee as the edge (name them with --source, --target)",
    )
    named = LoadOptions(source="caller", target="callee")
    graph = from_table(table(caller="s", callee="s", weight="f"), named)
    assert graph.account.notes == (
        "took weight as the weight (name it with --weight, or ignore it with --weight-as none)",
    )
    graph = from_table(table(caller="s", callee="s", weight="f"), named, weight="weight")
    assert graph.account.notes == ()


def test_one_end_named_and_the_other_guessed():
    made = table(caller="s", callee="s", via="s")
    assert from_table(made, source="caller").origin.target == "callee"
    assert from_table(made, target="callee").origin.source == "caller"
    with pytest.raises(InputError, match="name them with --target;"):
        from_table(made, source="via")
    assert from_table(table(one="s", two="s", n="i"), target="one").origin.source == "two"


def test_named_columns_win_over_likely_ones():
    made = pa.table({"source": ["a"], "target": ["b"], "x.y": ["p"], "z": ["q"], "weight": [3.0]})
    graph = from_table(made, source="x.y", target="z", weight_as="none")
    assert edges_of(graph) == {("p", "q"): 1.0}
    assert graph.origin.weight is None


def test_a_name_with_a_dot_is_a_name_in_files_too(tmp_path):
    made = pa.table({"x": [{"y": "wrong"}], "x.y": ["p"], "z": ["q"]})
    pq.write_table(made, tmp_path / "x.parquet")
    assert edges_of(load(tmp_path / "x.parquet", source="x.y", target="z")) == {("p", "q"): 1.0}


def test_ignored_weights_may_be_bad():
    made = pa.table({"source": ["a", "a"], "target": ["b", "b"], "weight": [None, -1.0]})
    assert from_table(made, weight_as="none").outward.weights.tolist() == [2.0]
    assert from_table(made, parallel="count").outward.weights.tolist() == [2.0]


def hive(folder, layout):
    for keys, columns in layout.items():
        place = folder / keys
        place.mkdir(parents=True)
        pq.write_table(pa.table(columns), place / "part-0.parquet")
    return folder


def test_hive_partitions_become_columns(tmp_path):
    edges = {"source": ["a"], "target": ["b"]}
    hive(tmp_path, {"year=2020/calls=2": edges, "year=2021/calls=5": edges})
    graph = load(tmp_path)
    assert graph.origin.weight == "calls"
    assert edges_of(graph) == {("a", "b"): 7.0}
    assert [item.name for item in describe(tmp_path).columns] == [
        "source",
        "target",
        "year",
        "calls",
    ]


@pytest.mark.parametrize("how", ["{0}", "{0}/who=*", "{0}/who=*/*.parquet", "{0}/**/*.parquet"])
def test_a_partition_as_an_end_of_the_edge(tmp_path, how):
    hive(
        tmp_path,
        {
            "who=a%2Fb": {"target": ["x", "y"]},
            "who=007": {"target": ["x", "x"]},
            "who=__HIVE_DEFAULT_PARTITION__": {"target": ["x"]},
        },
    )
    graph = load(how.format(tmp_path), source="who", target="target", bad_rows="skip")
    assert edges_of(graph) == {("a/b", "x"): 1.0, ("a/b", "y"): 1.0, ("007", "x"): 2.0}
    assert graph.account.skipped == {"null source": 1}


def test_both_ends_from_partitions(tmp_path):
    hive(tmp_path, {"source=1/target=2": {"x": ["p", "q"]}, "source=2/target=1": {"x": ["p"]}})
    assert edges_of(load(tmp_path, source="source", target="target")) == {(1, 2): 2.0, (2, 1): 1.0}


def test_a_file_named_twice_counts_once(tmp_path):
    path = tmp_path / "x.parquet"
    pq.write_table(table(source="s", target="s"), path)
    assert load([path, tmp_path, str(path)]).account.rows_read == 1


def test_a_name_with_glob_characters_that_exists_is_taken_as_it_stands(tmp_path):
    for name in ("x[1].parquet", "x1.parquet"):
        pq.write_table(table(source="s", target="s"), tmp_path / name)
    assert load(tmp_path / "x[1].parquet").origin.name == "x[1].parquet"


def test_the_order_of_files_and_chunks_leaves_no_trace(tmp_path):
    paths = []
    for at, (u, v) in enumerate([("b", "a"), ("c", "a"), ("a", "c")]):
        paths.append(tmp_path / f"{at}.parquet")
        pq.write_table(pa.table({"source": [u], "target": [v]}), paths[-1])
    prints = {load(list(order)).fingerprint for order in itertools.permutations(paths)}
    assert len(prints) == 1


def test_describing_a_table(tmp_path):
    path = tmp_path / "x.parquet"
    made = pa.table(
        {"caller": ["a", None], "callee": ["b", "c"], "calls": [1.0, 2.0], "up": [True, False]}
    )
    pq.write_table(made, path)
    about = describe([path])
    assert (about.files, about.rows) == ((str(path),), 2)
    assert (about.source, about.target, about.weight) == ("caller", "callee", "calls")
    assert "caller -> callee" in about.why
    assert [(c.name, c.type, c.nulls, c.can_be_id, c.can_be_weight) for c in about.columns] == [
        ("caller", "string", 1, True, False),
        ("callee", "string", 0, True, False),
        ("calls", "double", 0, False, True),
        ("up", "bool", 0, True, False),
    ]


def test_describing_what_cannot_be_guessed(tmp_path):
    path = tmp_path / "x.parquet"
    pq.write_table(table(x="s", y="s", z="s", weight="f"), path)
    about = describe(path)
    assert (about.source, about.target, about.weight) == (None, None, "weight")
    assert "no two columns" in about.why


def test_progress_tells_rows_and_ends_full():
    seen = []
    watch = Watch(seen.append, period=0.0)
    from_table(pa.table({"source": list(range(300_000)), "target": [0] * 300_000}), watch=watch)
    rows = [item for item in seen if item.stage == "reading rows"]
    assert [item.done for item in rows] == sorted(item.done for item in rows)
    assert len(rows) >= 3
    assert (rows[-1].done, rows[-1].total, rows[-1].unit) == (300_000, 300_000, "rows")
    assert len({item.stage for item in seen}) > 3
    assert all(0 <= item.done <= item.total for item in seen)


STAGES = ("reading rows", "numbering ids", "sorting edges by target", "turning edges round")


@pytest.mark.parametrize("stage", STAGES)
@pytest.mark.parametrize("spread", [1, 10**12])
def test_cancelling_at_any_stage(stage, spread):
    def look(progress):
        if progress.stage == stage:
            watch.cancel()

    watch = Watch(look)
    ids = [at * spread for at in range(5_000)]
    with pytest.raises(Interrupted):
        from_table(pa.table({"source": ids, "target": ids[::-1]}), watch=watch)


def test_loading_from_several_threads_at_once():
    made = pa.table({"source": list(range(20_000)), "target": [3] * 20_000})
    prints = []
    threads = [
        threading.Thread(target=lambda: prints.append(from_table(made).fingerprint))
        for _ in range(3)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(prints) == 3
    assert len(set(prints)) == 1
