"""Writing a file so that a reader never meets half of it."""

from __future__ import annotations

import contextlib
import os
import secrets
import shutil
import stat
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import BinaryIO

from kingpost.core.errors import OutputError


def check_target(path: str, inputs: Iterable[str] = ()) -> None:
    """Refuse early, before hours of solving, what could not be written at the end.

    Raises:
        OutputError: if the folder is missing or closed to us, the path is a folder, or the file
            is one of ``inputs``.
    """
    target = Path(path)
    if target.is_dir():
        raise OutputError(f"{path} is a folder; name a file in it")
    if not target.parent.is_dir():
        raise OutputError(f"{path} cannot be written: there is no folder {target.parent}")
    if _is_special(target):
        return
    place = target.resolve().parent
    if not os.access(place, os.W_OK):
        raise OutputError(f"{path} cannot be written: {place} is not open for writing")
    for source in inputs:
        with contextlib.suppress(OSError):
            if os.path.samefile(source, target):
                raise OutputError(f"{path} is one of the tables being read; write elsewhere")


@contextlib.contextmanager
def replacing(path: str) -> Iterator[BinaryIO]:
    """A binary file that takes the name ``path`` only once it is complete.

    The bytes go to a hidden name in the same folder, which is renamed over ``path`` when the
    block ends and removed when it raises.  A link is followed; a device or pipe is written
    directly.

    Raises:
        OutputError: if the system refuses (no space, no permission, ...).
    """
    target = Path(path)
    if _is_special(target):
        with _explained(path), target.open("wb") as sink:
            yield sink
        return
    target = target.resolve()
    part = target.with_name(f".kingpost-{secrets.token_hex(6)}.part")
    try:
        with _explained(path):
            with part.open("xb") as sink:
                yield sink
                sink.flush()
                os.fsync(sink.fileno())
            if target.exists():
                shutil.copymode(target, part)
            os.replace(part, target)
    except BaseException:
        part.unlink(missing_ok=True)
        raise


@contextlib.contextmanager
def _explained(path: str) -> Iterator[None]:
    try:
        yield
    except OSError as trouble:
        why = trouble.strerror or str(trouble)
        raise OutputError(f"{path} cannot be written: {why}") from trouble


def _is_special(target: Path) -> bool:
    """A device, pipe or socket: must never be renamed over."""
    try:
        mode = target.stat().st_mode
    except OSError:
        return False
    return not (stat.S_ISREG(mode) or stat.S_ISDIR(mode))
