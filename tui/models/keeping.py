"""Writing what a view shows to a file somebody named: never over another, never half of it."""

from __future__ import annotations

import contextlib
import io
import os
from typing import TYPE_CHECKING

from kingpost.core.errors import OutputError
from kingpost.core.export.files import check_target
from kingpost.core.export.log import kind_of, write_log

if TYPE_CHECKING:
    from kingpost.core.result import Result


def keep_log(result: Result, name: str) -> str:
    """Write the sweeps of a solve to a new file, CSV, JSON or Parquet by its ending.

    Returns the path written; ``~`` is the home folder.

    Raises:
        OutputError: if there is a file of that name already, the ending is another, or the
            system refuses; nothing is left behind then.
    """
    path = os.path.expanduser(name.strip())
    if not path:
        raise OutputError("no file is named; write a name that ends in .csv, .json or .parquet")
    kind = kind_of(path)
    check_target(path)
    buffer = io.BytesIO()
    write_log(result, buffer, kind)
    keep_new(path, buffer.getbuffer())
    return path


def keep_new(path: str, data: bytes | memoryview) -> None:
    """Write a file that does not exist yet.

    Raises:
        OutputError: if it does, or the system refuses; what was begun is removed.
    """
    try:
        with open(path, "xb") as sink:
            try:
                sink.write(data)
                sink.flush()
                os.fsync(sink.fileno())
            except BaseException:
                with contextlib.suppress(OSError):
                    os.unlink(path)
                raise
    except FileExistsError:
        raise OutputError(f"there is a file {path} already; choose another name") from None
    except OSError as trouble:
        why = trouble.strerror or str(trouble)
        raise OutputError(f"{path} cannot be written: {why}") from trouble
