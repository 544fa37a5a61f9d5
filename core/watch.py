"""What long work runs under: a flag to cancel it, a sink for progress, a number of threads."""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass

from kingpost.core.errors import Interrupted


@dataclass(frozen=True, slots=True)
class Progress:
    """One report of how far a stage of work has come."""

    stage: str
    done: int = 0
    total: int | None = None
    unit: str = ""


class Watch:
    """Passed to everything that may take long.

    The work calls :meth:`check` where stopping is safe and :meth:`report` where there is news;
    whoever started it calls :meth:`cancel`, from any thread.  Reports are passed on about four
    times a second, the first and last of a stage always.
    """

    def __init__(
        self,
        on_progress: Callable[[Progress], None] | None = None,
        *,
        threads: int | None = None,
        period: float = 0.25,
    ) -> None:
        self._cancelled = threading.Event()
        self._on_progress = on_progress
        self._period = period
        self._stage = ""
        self._next = 0.0
        self.threads = max(1, threads if threads is not None else available_threads())

    def cancel(self) -> None:
        """Ask the work to stop at the next safe place."""
        self._cancelled.set()

    @property
    def cancelled(self) -> bool:
        """Whether somebody asked the work to stop."""
        return self._cancelled.is_set()

    def check(self) -> None:
        """Raise :class:`Interrupted` if the work was cancelled."""
        if self._cancelled.is_set():
            raise Interrupted("cancelled before there was an answer to keep")

    def report(self, stage: str, done: int = 0, total: int | None = None, unit: str = "") -> None:
        """Say how far a stage has come; cheap enough to call from an inner loop over batches."""
        if self._on_progress is None:
            return
        now = time.monotonic()
        if stage == self._stage and now < self._next and done != total:
            return
        self._stage, self._next = stage, now + self._period
        self._on_progress(Progress(stage, done, total, unit))


def available_threads() -> int:
    """The number of processors this process may use."""
    try:
        return max(1, len(os.sched_getaffinity(0)))
    except AttributeError:  # not every system can tell
        return max(1, os.cpu_count() or 1)
