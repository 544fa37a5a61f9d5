"""Running kernels on several threads without letting the number of threads change a bit.

Work is cut into pieces that depend on the data alone; threads only share the pieces out.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from concurrent.futures import ThreadPoolExecutor
from functools import lru_cache
from itertools import count
from typing import TypeVar

P = TypeVar("P")
R = TypeVar("R")


@lru_cache(maxsize=4)
def _pool(threads: int) -> ThreadPoolExecutor:
    return ThreadPoolExecutor(threads, thread_name_prefix="kingpost")


def each(function: Callable[[P], R], pieces: Iterable[P], threads: int) -> list[R]:
    """``[function(piece) for piece in pieces]``, on up to ``threads`` threads.

    The caller's thread is one of them: waking another costs as much as a short kernel takes.  If
    a piece raises, no further ones are begun, and what it raised is raised here once all that were
    begun have ended.

    Worth it only for functions that release the interpreter lock.  Must not be called from
    inside itself: the inner call would wait for threads that the outer one holds.
    """
    work = list(pieces)
    if threads <= 1 or len(work) <= 1:
        return [function(piece) for piece in work]
    found: dict[int, R] = {}
    numbers = count()
    failed: list[BaseException] = []

    def drain() -> None:
        while not failed and (number := next(numbers)) < len(work):
            try:
                found[number] = function(work[number])
            except BaseException as problem:
                failed.append(problem)

    others = [_pool(threads).submit(drain) for _ in range(min(threads, len(work)) - 1)]
    drain()
    for other in others:
        other.result()
    if failed:
        raise failed[0]
    return [found[number] for number in range(len(work))]
