"""Standard input as a file: copied once to an unnamed temporary file, so that it can be read again.

A table is read more than once (its types, its rows, and again for other columns), and a pipe
can be read but once.
"""

from __future__ import annotations

import os
import select
import sys
import tempfile
from typing import Any

from kingpost.core.errors import InputError
from kingpost.core.watch import Watch

_BLOCK = 1 << 20
_kept: list[tuple[Any, str]] = []


def spooled(watch: Watch) -> str:
    """The path of a file that holds everything standard input held.

    Raises:
        InputError: if standard input is a terminal, closed or empty, or there is no room.
        Interrupted: if the watch is cancelled while the other side is still writing.
    """
    if not _kept:
        _kept.append(_copied(watch))
    return _kept[0][1]


def _copied(watch: Watch) -> tuple[Any, str]:
    try:
        source = sys.stdin.fileno()
        terminal = os.isatty(source)
    except (AttributeError, OSError, ValueError):
        raise InputError("- names standard input, which is closed") from None
    if terminal:
        raise InputError(
            "- reads standard input, which is a terminal here; pipe a table into it, such as "
            "zcat calls.csv.gz | kingpost rank -"
        )
    # Where open files have paths the copy needs no name, and is gone with the process.
    unnamed = os.path.isdir("/proc/self/fd")
    try:
        make = tempfile.TemporaryFile if unnamed else tempfile.NamedTemporaryFile
        copy: Any = make()  # kept open for as long as the process runs
        size = 0
        while True:
            watch.check()
            if not select.select([source], [], [], 0.1)[0]:
                continue
            block = os.read(source, _BLOCK)
            if not block:
                break
            copy.write(block)
            size += len(block)
            watch.report("reading standard input", size, unit="bytes")
        copy.flush()
    except OSError as error:
        raise InputError(
            f"standard input cannot be copied to the temporary folder {tempfile.gettempdir()}: "
            f"{error.strerror or error}; set TMPDIR to a folder with room"
        ) from None
    if size == 0:
        raise InputError("standard input is empty; an edge table needs at least one row")
    return copy, f"/proc/self/fd/{copy.fileno()}" if unnamed else copy.name
