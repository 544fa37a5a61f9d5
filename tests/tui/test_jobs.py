"""The runner of background work.  The posts of its threads are carried out here, by hand."""

from __future__ import annotations

import queue
import threading

import pytest

from kingpost.core.errors import InputError
from kingpost.tui.jobs import Runner, solve_work
from kingpost.tui.models.sitting import Sitting


class Desk:
    """Stands for the screen's thread: runs what is posted until a condition holds."""

    def __init__(self):
        self.posts = queue.Queue()
        self.runner = Runner(self.posts.put)

    def until(self, condition):
        while not condition():
            self.posts.get(timeout=20)()


@pytest.fixture
def desk():
    made = Desk()
    yield made
    assert made.runner.shutdown(10)


def test_a_value_is_delivered(desk):
    got = []
    desk.runner.start("lane", lambda job: 6 * 7, got.append)
    desk.until(lambda: got)
    assert got == [42]


def test_an_older_result_never_overwrites_a_newer(desk):
    release, got = threading.Event(), []

    def slow(job):
        release.wait(20)
        return "old"

    old = desk.runner.start("lane", slow, got.append, topic="answer")
    new = desk.runner.start("lane", lambda job: "new", got.append, topic="answer")
    assert old.watch.cancelled
    release.set()
    desk.until(lambda: not new.live)
    assert got == ["new"]
    assert old.state == "stale"


def test_jobs_of_a_lane_run_one_after_the_other(desk):
    running, most, got = [], [], []

    def work(job):
        running.append(job.id)
        most.append(len(running))
        running.pop()
        return job.id

    jobs = [desk.runner.start("lane", work, got.append, topic=str(i)) for i in range(5)]
    desk.until(lambda: len(got) == 5)
    assert got == [job.id for job in jobs]
    assert max(most) == 1


def test_a_waiting_job_can_be_taken_out(desk):
    release, got = threading.Event(), []
    desk.runner.start("lane", lambda job: release.wait(20), got.append, topic="a")
    waiting = desk.runner.start("lane", lambda job: "never", got.append, topic="b")
    desk.runner.cancel(waiting)
    release.set()
    desk.until(lambda: got)
    assert got == [True]
    assert waiting.state == "stale"


def test_errors_become_sentences(desk):
    said = []

    def bad(job):
        raise InputError("the file is broken; mend it")

    def worse(job):
        raise ZeroDivisionError("\x1b[31m")

    desk.runner.start("a", bad, said.append, failed=said.append)
    desk.until(lambda: said)
    job = desk.runner.start("b", worse, said.append, failed=said.append, words="counting")
    desk.until(lambda: len(said) == 2)
    assert said[0] == "the file is broken; mend it"
    assert said[1].startswith("counting failed: ZeroDivisionError: \\e[31m; details are in ")
    with open(said[1].rpartition(" ")[2]) as log:
        assert "ZeroDivisionError" in log.read()
    assert "ZeroDivisionError" in job.trace


def test_a_cancelled_solve_returns_its_best_iterate(desk, graph, bench):
    got = []
    sitting = Sitting(graph, "held", names=bench.names, find=bench.find)
    job = desk.runner.start("solve", solve_work(sitting, "held", None), got.append)
    assert bench.sweeping.wait(20)
    desk.runner.cancel(job)
    desk.until(lambda: got)
    assert str(got[0].stop) == "cancelled"
    assert len(got[0].scores) == graph.n
    assert job.log


def test_news_come_while_it_runs(desk, graph, bench):
    seen, got = [], []
    sitting = Sitting(graph, "held", names=bench.names, find=bench.find)
    desk.runner.start(
        "solve",
        solve_work(sitting, "held", None),
        got.append,
        news=lambda job: seen.append(len(job.log)),
    )
    desk.until(lambda: seen)
    bench.release.set()
    desk.until(lambda: got)
    assert seen[0] >= 1


def test_progress_of_the_watch_is_news(desk):
    seen, got = [], []

    def work(job):
        job.watch.report("reading", 5, 5, "rows")
        return True

    desk.runner.start("lane", work, got.append, news=lambda job: seen.append(job.progress))
    desk.until(lambda: got)
    assert [(p.stage, p.done) for p in seen] == [("reading", 5)]
