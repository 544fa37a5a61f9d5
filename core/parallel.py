"""Running kernels on several threads without letting the number of threads change a bit.

Work is cut into pieces that depend on the data alone; threads only share the pieces out.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from concurrent.futures import ThreadPoolExecutor
from functools import lru_cache
from typing import TypeVar

P = TypeVar("P")
R = TypeVar("R")


@lru_cache(maxsize=4)
def _pool(threads: int) -> ThreadPoolExecutor:
    return ThreadPoolExecutor(threads, thread_name_prefix="kingpost")


def each(function: Callable[[P], R], pieces: Iterable[P], threads: int) -> list[R]:
    """``[function(piece) for piece in pieces]``, on up to ``threads`` threads.

    Worth it only for functions that release the interpreter lock.  Must not be called from
    inside itself: the inner call would wait for threads that the outer one holds.
    """
    work = list(pieces)
    if threads <= 1 or len(work) <= 1:
        return [function(piece) for piece in work]
    return list(_pool(threads).map(function, work))
