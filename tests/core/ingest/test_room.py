"""Memory is predicted and compared with what there is before anything is read."""

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from kingpost.core.errors import InputError
from kingpost.core.ingest import LoadOptions, load, parquet_file, predict, room
from kingpost.core.ingest.columns import choose
from kingpost.core.ingest.files import open_parts
from kingpost.core.ingest.room import Available, available, estimate, size
from kingpost.core.watch import Watch

MB = 1024 * 1024


def machine(root, free=8000):
    (root / "proc/self").mkdir(parents=True)
    text = f"MemTotal: 16384 kB\nMemAvailable:   {free * 1024} kB\n"
    (root / "proc/meminfo").write_text(text)
    return root


def group(root, line, folder, names, limit, used, cached):
    (root / "proc/self/cgroup").write_text(line)
    place = root / "sys/fs/cgroup" / folder
    place.mkdir(parents=True)
    (place / names[0]).write_text(f"{limit}\n")
    (place / names[1]).write_text(f"{used}\n")
    (place / "memory.stat").write_text(
        f"anon 5\ninactive_file {cached}\ntotal_{'inactive_file'} 7\n"
    )


V2 = ("memory.max", "memory.current")
V1 = ("memory.limit_in_bytes", "memory.usage_in_bytes")


def test_the_machine_alone(tmp_path):
    assert available(machine(tmp_path)) == Available(8000 * MB, "free on this machine")


def test_nothing_is_known_elsewhere(tmp_path):
    assert available(tmp_path) is None


def test_second_version_control_groups_and_those_around_them(tmp_path):
    machine(tmp_path)
    group(tmp_path, "0::/a/b\n", "a/b", V2, "max", 5, 0)
    group(tmp_path, "0::/a/b\n", "a/x", V2, 1, 5, 0)  # not around this one
    for name, text in (("memory.max", 600 * MB), ("memory.current", 200 * MB)):
        (tmp_path / "sys/fs/cgroup/a" / name).write_text(str(text))
    (tmp_path / "sys/fs/cgroup/a/memory.stat").write_text(f"inactive_file {50 * MB}\n")
    found = available(tmp_path)
    assert found == Available(450 * MB, "left by the limit of its control group")


def test_first_version_control_groups(tmp_path):
    machine(tmp_path)
    line = "5:cpu,cpuacct:/q\n4:memory:/box\n"
    group(tmp_path, line, "memory/box", V1, 300 * MB, 100 * MB, 0)
    assert available(tmp_path).bytes == 200 * MB + 7


def test_within_a_container_the_mount_is_the_group(tmp_path):
    machine(tmp_path)
    group(tmp_path, "0::/of/the/host\n", ".", V2, 100 * MB, 40 * MB, 0)
    assert available(tmp_path).bytes == 60 * MB


def test_no_limit_that_counts(tmp_path):
    machine(tmp_path)
    group(tmp_path, "4:memory:/\n", "memory", V1, 9223372036854771712, 0, 0)
    assert available(tmp_path).limit == "free on this machine"


@pytest.mark.parametrize(
    ("number", "words"),
    [(999, "1 kB"), (1_230_000, "1.23 MB"), (45.6e9, "45.6 GB"), (3e12, "3 TB")],
)
def test_sizes_in_words(number, words):
    assert size(number) == words


def test_estimates_of_different_ids():
    # Once each: nothing says that there will be no more. Twice or more: there is nothing unseen.
    assert estimate(pa.chunked_array([list(range(100))]), 10_000) == 10_000
    assert estimate(pa.chunked_array([list(range(100)) * 3]), 10_000) == 100
    some = [0, 0, 1, 1, 2, 3, 4]  # twice: 2, once: 3; Chao adds 3 * 2 / (2 * 3) = 1
    assert estimate(pa.chunked_array([some]), 1_000) == 5 + 3
    assert estimate(pa.chunked_array([some]), 6) == 6


@pytest.fixture
def table(tmp_path):
    path = tmp_path / "x.parquet"
    rows = 4000
    columns = {"source": range(rows), "target": [0] * rows, "weight": [1.0] * rows}
    pq.write_table(pa.table(columns), path, row_group_size=1000)
    return str(path)


def test_a_table_that_does_not_fit_is_refused_unread(table, monkeypatch):
    monkeypatch.setattr(room, "available", lambda: Available(50_000, "left by ulimit -v"))
    parts = open_parts(table)
    roles = choose(parts, LoadOptions())
    with pytest.raises(InputError) as caught:
        room.require_room(parts, roles, Watch())
    text = caught.value.sentence
    for words in (
        "x.parquet is predicted to need", "4,000 rows, some 4,000 nodes", "50 kB is available",
        "ulimit -v", "--weight-as none", "--where", "--memory ignore",
    ):  # fmt: skip
        assert words in text
    with pytest.raises(InputError, match="is predicted to need"):
        load(table)
    assert load(table, memory="ignore").m == 4000
    with pytest.raises(InputError) as caught:
        load(table, weight_as="none")
    assert "--weight-as" not in caught.value.sentence


def test_memory_that_runs_out_is_no_fault_of_the_file(table, monkeypatch):
    def refuse(*_):
        raise pa.ArrowMemoryError("malloc of size 5 failed")
        yield

    monkeypatch.setattr(parquet_file, "_scan", refuse)
    with pytest.raises(MemoryError):
        load(table)


def test_what_is_left_out_is_not_counted(table, monkeypatch):
    monkeypatch.setattr(room, "_SMALL", 100)
    monkeypatch.setattr(room, "_READING", 0)
    monkeypatch.setattr(room, "_ENGINE", 0)
    whole = predict(table)
    assert (whole.rows, whole.nodes, whole.weighted) == (4000, 4000, True)
    assert predict(table, LoadOptions(weight_as="none")).peak < whole.peak
    some = predict(table, LoadOptions(where="source % 2 = 0"))
    assert some.rows == 2000
    assert some.peak < whole.peak
    assert predict(table, LoadOptions(directed=False)).peak > whole.peak


def test_a_prediction_that_fits_samples_nothing(table, monkeypatch):
    monkeypatch.setattr(room, "_SMALL", 100)
    monkeypatch.setattr(room, "_sampled", lambda *_: pytest.fail("sampled"))
    assert load(table).m == 4000


def test_text_counts_by_its_letters(tmp_path, monkeypatch):
    monkeypatch.setattr(room, "_SMALL", 100)
    monkeypatch.setattr(room, "_READING", 0)
    peaks = []
    for letters in (30, 300):
        names = [f"n{i:0{letters}}" for i in range(3000)]
        path = tmp_path / f"{letters}.parquet"
        pq.write_table(pa.table({"source": names, "target": names}), path, use_dictionary=False)
        peaks.append(predict(path).peak)
        text = tmp_path / f"{letters}.csv"
        text.write_text("source,target\n" + "".join(f"{n},{n}\n" for n in names))
        assert predict(text).peak == pytest.approx(peaks[-1], rel=0.1)
    assert peaks[1] > 1.8 * peaks[0]
