"""Background work: one runner with lanes, progress, cancelling, and stale results dropped.

All bookkeeping happens on the thread of the screen; a worker thread only runs the work and
posts callables back.  Jobs in one lane run one after the other.  Of several jobs about one
topic only the newest may deliver: an older result that comes late is dropped.
"""

from __future__ import annotations

import contextlib
import threading
import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import count
from typing import TYPE_CHECKING, Any

from kingpost.core import warm
from kingpost.core.errors import Interrupted, KingpostError
from kingpost.core.text import visible
from kingpost.core.watch import Progress, Watch
from kingpost.tui.terminal import keep_fault

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings
    from kingpost.core.result import Iteration, Result
    from kingpost.tui.models.sitting import Sitting

NEWS_PERIOD = 0.25  # seconds between two reports of one job to the screen


@dataclass
class Job:
    """One piece of background work; ``state`` is waiting, running, done, failed or stale."""

    id: int
    lane: str
    topic: str
    words: str
    watch: Watch
    work: Callable[[Job], Any]
    done: Callable[[Any], None]
    failed: Callable[[str], None]
    news: Callable[[Job], None]
    state: str = "waiting"
    progress: Progress | None = None
    log: list[Iteration] = field(default_factory=list)
    started: float = 0.0
    trace: str = ""
    facts: dict[str, Any] = field(default_factory=dict)
    _tell: Callable[[], None] = lambda: None
    _next_news: float = 0.0

    @property
    def live(self) -> bool:
        """Whether it still waits or runs."""
        return self.state in ("waiting", "running")

    def tell(self) -> None:
        """Called by the work when there is news; passed on about four times a second."""
        now = time.monotonic()
        if now >= self._next_news:
            self._next_news = now + NEWS_PERIOD
            self._tell()


class Runner:
    """Starts jobs and hands their outcome to the screen.

    ``post`` must run a callable on the screen's thread soon, and may be called from any thread.
    """

    def __init__(
        self, post: Callable[[Callable[[], None]], Any], threads: int | None = None
    ) -> None:
        self._post = post
        self._threads = threads
        self._ids = count(1)
        self._newest: dict[str, int] = {}
        self._lanes: dict[str, list[Job]] = {}
        self._alive: list[threading.Thread] = []

    def start(
        self,
        lane: str,
        work: Callable[[Job], Any],
        done: Callable[[Any], None],
        *,
        topic: str | None = None,
        words: str = "",
        failed: Callable[[str], None] | None = None,
        news: Callable[[Job], None] | None = None,
        replace: bool = False,
    ) -> Job:
        """Queue ``work(job)`` in ``lane``; its value goes to ``done``, an error's sentence to
        ``failed``.  With ``replace`` whatever the lane holds is cancelled first.
        """
        job = Job(
            id=next(self._ids),
            lane=lane,
            topic=topic or lane,
            words=words,
            watch=Watch(threads=self._threads),
            work=work,
            done=done,
            failed=failed or (lambda sentence: None),
            news=news or (lambda job: None),
        )
        job.watch = Watch(lambda progress: self._progressed(job, progress), threads=self._threads)
        job._tell = lambda: self._post(lambda: self._report(job))
        queue = self._lanes.setdefault(lane, [])
        for other in list(queue):
            if replace or other.topic == job.topic:
                self.cancel(other)
        self._newest[job.topic] = job.id
        queue.append(job)
        self._advance(lane)
        return job

    def cancel(self, job: Job) -> None:
        """Ask a running job to stop, or take a waiting one out of its queue."""
        job.watch.cancel()
        if job.state == "waiting":
            job.state = "stale"
            self._lanes[job.lane].remove(job)

    def current(self, lane: str) -> Job | None:
        """The running job of a lane that may still deliver."""
        for job in self._lanes.get(lane, ()):
            if job.state == "running" and self._newest[job.topic] == job.id:
                return job
        return None

    def jobs(self, lane: str) -> list[Job]:
        """Running and waiting jobs of a lane, in order."""
        return list(self._lanes.get(lane, ()))

    def shutdown(self, timeout: float) -> bool:
        """Cancel everything and wait; True if every thread has ended."""
        for queue in self._lanes.values():
            for job in list(queue):
                self.cancel(job)
        deadline = time.monotonic() + timeout
        for thread in self._alive:
            thread.join(max(0.0, deadline - time.monotonic()))
        return not any(thread.is_alive() for thread in self._alive)

    def _advance(self, lane: str) -> None:
        queue = self._lanes[lane]
        if not queue or queue[0].state != "waiting":
            return
        job = queue[0]
        job.state, job.started = "running", time.monotonic()
        thread = threading.Thread(
            target=self._run, args=(job,), name=f"kingpost-{job.lane}-{job.id}", daemon=True
        )
        self._alive = [t for t in self._alive if t.is_alive()]
        self._alive.append(thread)
        thread.start()

    def _run(self, job: Job) -> None:
        value, sentence = None, None
        try:
            value = job.work(job)
        except Interrupted as error:
            sentence = error.sentence
        except KingpostError as error:
            sentence = error.sentence
        except MemoryError:
            sentence = f"{job.words or job.lane} needs more memory than there is"
        except Exception as error:  # the screen must outlive any fault of the work
            job.trace = traceback.format_exc()
            place = keep_fault(job.trace)
            sentence = visible(
                f"{job.words or job.lane} failed: {type(error).__name__}: {error}", 300
            )
            sentence += f"; details are in {visible(place)}" if place else ""
        self._post(lambda: self._settle(job, value, sentence))

    def _settle(self, job: Job, value: Any, sentence: str | None) -> None:
        queue = self._lanes[job.lane]
        if job in queue:
            queue.remove(job)
        if self._newest[job.topic] != job.id:
            job.state = "stale"
        elif sentence is None:
            job.state = "done"
        else:
            job.state = "failed"
        self._advance(job.lane)
        if job.state == "done":
            job.done(value)
        elif job.state == "failed":
            job.failed(sentence or "")

    def _progressed(self, job: Job, progress: Progress) -> None:
        warm.heed(progress)
        job.progress = progress
        self._post(lambda: self._report(job))

    def _report(self, job: Job) -> None:
        if job.state == "running" and self._newest[job.topic] == job.id:
            job.news(job)


def solve_work(
    sitting: Sitting, measure: str, settings: Settings | None
) -> Callable[[Job], Result]:
    """The work of a solve: drives the generator, keeps its log on the job, returns the Result.

    Ranks are worked out here too, so that the screen never sorts.  A cancelled solve returns
    its best iterate like any other.
    """

    def work(job: Job) -> Result:
        from kingpost.core.store.results import keep_result, solve

        chosen = sitting.measure(measure)
        job.facts["settings"] = used = settings or sitting.settings_of(measure)
        lines = solve(chosen, sitting.graph, used, job.watch)
        while True:
            try:
                job.log.append(next(lines))
            except StopIteration as end:
                result: Result = end.value
                break
            job.tell()
        sitting.prepare(result)
        with contextlib.suppress(Interrupted):  # the answer is there, kept or not
            keep_result(chosen, sitting.graph, result, job.watch)
        return result

    return work
