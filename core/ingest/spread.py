"""Independent pieces of work on several threads, with progress and cancelling between them."""

from __future__ import annotations

from collections import deque
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from typing import TypeVar

from kingpost.core.watch import Watch

T = TypeVar("T")
Span = tuple[int, int]
PIECE = 1 << 21  # rows or entries a piece of work goes through: some 20 ms


def spans(rows: int) -> list[Span]:
    """Ranges of at most PIECE rows that cover ``rows``; at least one."""
    return [(a, min(a + PIECE, rows)) for a in range(0, max(rows, 1), PIECE)]


def each(pieces: list[Span], work: Callable[[int, int], T], watch: Watch, stage: str) -> list[T]:
    """The results of ``work`` over the pieces, in their order.

    ``work`` should spend its time in loops that release the interpreter lock, and must write
    where no other piece does.

    Raises:
        Interrupted: if the watch is cancelled; no piece is at work any more by then.
    """
    results: list[T] = []
    total = len(pieces)
    watch.report(stage, 0, total, "parts")
    if watch.threads == 1 or total == 1:
        for a, b in pieces:
            watch.check()
            results.append(work(a, b))
            watch.report(stage, len(results), total, "parts")
        return results
    waiting: deque[Future[T]] = deque()
    ahead = iter(pieces)
    with ThreadPoolExecutor(watch.threads) as pool:
        for _ in range(total):
            watch.check()
            while len(waiting) < 2 * watch.threads and (piece := next(ahead, None)) is not None:
                waiting.append(pool.submit(work, *piece))
            results.append(waiting.popleft().result())
            watch.report(stage, len(results), total, "parts")
    return results
