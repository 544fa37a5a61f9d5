"""What a graph was made from, as a key: the same key, the same graph.

Files are told apart by their paths (as given, for hive partitions and notes are read off them,
and absolute), sizes, times of change and their last bytes, which in Parquet are the footer with
the place and statistics of every column chunk.  Every field of the loading options enters the
key, whatever fields there will be.
"""

from __future__ import annotations

import dataclasses
import hashlib
import os
import re
import struct
import time
from collections.abc import Sequence
from typing import Any

from kingpost.core.store.plain import NotPlain
from kingpost.core.store.sealed import FORMAT, hash_text

_HEAD, _TAIL = 4_096, 65_536
_FOOTER_LIMIT = 1 << 28
_TICK = 20_000_000  # ns; coarser than the clock by which the usual file systems stamp files

# Conditions that may be true for other rows tomorrow, or by chance; a column of such a name only
# costs the store.
_PASSING = re.compile(
    r"\b(random|setseed|\w*uuid\w*|now|today|age|\w*current\w*|localtime\w*|"
    r"transaction_timestamp|nextval|sleep_ms)\b",
    re.IGNORECASE,
)


@dataclasses.dataclass(frozen=True)
class Identity:
    """The key of a graph, and what it was made from: (path, bytes) of every file."""

    key: str
    files: tuple[tuple[str, int], ...]


def identify(paths: Sequence[str], options: Any) -> Identity | None:
    """The identity of a load, or None.

    There is none for a pipe, for options that are no plain values, and for conditions that ask
    for the time or for chance.

    Raises:
        InputError: for paths that name nothing.
        OSError: for files that cannot be read.
    """
    from kingpost.core.ingest.files import find_files

    if any(not _lasting(path) for path in paths):
        return None
    files = find_files(list(paths))
    chosen = {item.name: getattr(options, item.name) for item in dataclasses.fields(options)}
    nodes = chosen.get("nodes")
    more = find_files(nodes) if isinstance(nodes, str) and _lasting(nodes) else []
    # Any other option that happens to name a file may read it.
    named = {value for value in chosen.values() if isinstance(value, str) and os.path.isfile(value)}
    found = [_of_file(file) for file in [*files, *more, *sorted(named - {nodes})]]
    conditions = [str(value) for name, value in chosen.items() if "where" in name and value]
    if None in found or any(_PASSING.search(text) for text in conditions):
        return None
    about = {
        "format": FORMAT,
        "program": _program(),
        "given": list(paths),
        "files": files,
        "facts": found,
        "options": {"kind": type(options).__name__, **chosen},
        # What hour it is at an instant is a question of where one is.
        "zone": [os.environ.get("TZ"), *time.tzname] if conditions else None,
    }
    try:
        key = hash_text(about)
    except NotPlain:
        return None
    return Identity(key, tuple((fact["path"], fact["bytes"]) for fact in found if fact))


def _lasting(path: str) -> bool:
    """Not a pipe, a device or standard input, which give their bytes once."""
    return path != "-" and (not os.path.exists(path) or os.path.isfile(path) or os.path.isdir(path))


def _of_file(path: str) -> dict[str, Any] | None:
    with open(path, "rb") as file:
        about = os.fstat(file.fileno())
        # A file written again within the same tick of the clock could look unchanged: wait
        # until any later change is bound to show.
        age = time.time_ns() - max(about.st_mtime_ns, about.st_ctime_ns)
        if 0 <= age < _TICK:
            time.sleep((_TICK - age) / 1e9)
            about = os.fstat(file.fileno())
        if not os.path.isfile(path):
            return None
        head = file.read(_HEAD)
        file.seek(max(0, about.st_size - _TAIL))
        tail = file.read(_TAIL)
        if head[:4] == b"PAR1" and tail[-4:] == b"PAR1":
            length = struct.unpack("<I", tail[-8:-4])[0] + 8
            if len(tail) < length <= min(about.st_size, _FOOTER_LIMIT):
                file.seek(about.st_size - length)
                tail = file.read(length)
    return {
        "path": os.path.realpath(path),
        "bytes": about.st_size,
        "modified": about.st_mtime_ns,
        # Set by the system alone: tells a change whose time was put back.
        "changed": about.st_ctime_ns,
        "inode": about.st_ino,
        "ends": hashlib.blake2b(head + tail, digest_size=20).hexdigest(),
    }


def _program() -> list[str]:
    """The code that turns tables into graphs: another version may read a table otherwise."""
    from kingpost.core.store.code import code_of, version_of

    packages = ("pyarrow", "duckdb", "numpy", "scipy", "networkx")
    return [code_of("ingest", "kernels", "graph.py"), *map(version_of, packages)]
