"""Where tables come from: files, folders, globs and hive partitions, opened as parts.

Every way in which a file can be missing ends in one sentence here; every way in which it can be
broken, in the file about its format.
"""

from __future__ import annotations

import glob
import os
from collections.abc import Iterator, Sequence
from pathlib import Path
from urllib.parse import unquote

import pyarrow as pa

from kingpost.core.errors import InputError
from kingpost.core.ingest.formats import ENDINGS, ending_format, look
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, partitioned
from kingpost.core.text import listed
from kingpost.core.watch import Watch

_NULL_PARTITION = "__HIVE_DEFAULT_PARTITION__"
STANDARD_INPUT = "-"

Paths = str | os.PathLike[str] | Sequence[str | os.PathLike[str]]


def open_parts(
    paths: Paths, options: LoadOptions | None = None, watch: Watch | None = None
) -> list[Part]:
    """Open every file that ``paths`` names, in a fixed order: as given, then by name.

    Text formats are read through once, to learn their types and to count their rows; ``-`` is
    standard input.

    Raises:
        InputError: for a path that names nothing, or a file that cannot be read as a table.
        Interrupted: if the watch is cancelled.
    """
    options, watch = options or LoadOptions(), watch or Watch()
    files = find_files(paths)
    keys = [_partition_keys(file) for file in files]
    # A partition column exists where every file's path has it.
    shared = [name for name in keys[0] if all(name in key for key in keys)]
    columns = {name: _partition_column([key[name] for key in keys]) for name in shared}
    return [
        partitioned(
            _open(file, options, watch), {name: columns[name].slice(at, 1) for name in shared}
        )
        for at, file in enumerate(files)
    ]


def _open(file: str, options: LoadOptions, watch: Watch) -> Part:
    name = file
    if file == STANDARD_INPUT:
        from kingpost.core.ingest.stdin import spooled

        name, file = "standard input", spooled(watch)
    source = look(file, name, options.read_as)
    if source.format == "parquet":
        from kingpost.core.ingest.parquet_file import open_parquet

        return open_parquet(file, name)
    if source.format == "arrow":
        from kingpost.core.ingest.arrow_file import open_arrow

        return open_arrow(source, watch)
    if source.format == "matrix-market":
        from kingpost.core.ingest.matrix_market import open_matrix

        return open_matrix(source, options, watch)
    if source.format == "graphml":
        from kingpost.core.ingest.graphml import open_graphml

        return open_graphml(source, options, watch)
    from kingpost.core.ingest.delimited import open_delimited

    return open_delimited(source, options, watch)


def find_files(paths: Paths) -> list[str]:
    """The files that paths, folders and globs name; never empty."""
    given = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    if not given:
        raise InputError("no edge table was named; name a file, a folder or a glob")
    found: list[str] = []
    for path in given:
        found.extend(_expand(os.fspath(path)))
    return list(dict.fromkeys(found))


def _expand(path: str) -> list[str]:
    if path == STANDARD_INPUT:
        return [path]
    if os.path.isdir(path):
        return _of_folder(path)
    if os.path.lexists(path):
        return [path]
    if glob.has_magic(path):
        hits = sorted(glob.glob(path, recursive=True))
        if not hits:
            raise InputError(f"no file matches {path}")
        return [file for hit in hits for file in _expand(hit)]
    raise InputError(f"there is no file {path}")


def _of_folder(path: str) -> list[str]:
    """The tables in a folder: its Parquet files, or else those of the one other format."""
    files = sorted(_walk(path))
    formats: dict[str, list[str]] = {}
    for file in files:
        formats.setdefault(str(ending_format(file)), []).append(file)
    if "parquet" in formats:
        return formats["parquet"]
    if len(formats) > 1:
        examples = [os.path.basename(found[0]) for found in formats.values()]
        raise InputError(
            f"folder {path} holds tables of several formats ({listed(examples)}); name the files "
            "by a pattern, such as folder/*.csv"
        )
    if not files:
        raise InputError(
            f"folder {path} holds no Parquet file (names ending in .parquet) and no other table"
        )
    return files


def _walk(folder: str) -> Iterator[str]:
    def refuse(error: OSError) -> None:
        raise InputError(f"folder {error.filename} cannot be read: {error.strerror}")

    for root, folders, files in os.walk(folder, onerror=refuse, followlinks=True):
        # Names with a leading dot or underscore are other programs' temporary files and markers.
        folders[:] = sorted(name for name in folders if not name.startswith((".", "_")))
        for name in files:
            if ending_format(name) in ENDINGS and not name.startswith((".", "_")):
                yield os.path.join(root, name)


def _partition_keys(file: str) -> dict[str, str]:
    pairs = [step.split("=", 1) for step in Path(file).parts[:-1] if "=" in step]
    return {unquote(name): unquote(value) for name, value in pairs if name}


def _partition_column(values: list[str]) -> pa.Array:
    """Whole numbers where every value is one in its plainest spelling ("007" is text)."""
    known = [None if value == _NULL_PARTITION else value for value in values]
    if all(value is None or _whole(value) for value in known):
        return pa.array([None if value is None else int(value) for value in known], pa.int64())
    return pa.array(known, pa.string())


def _whole(text: str) -> bool:
    digits = text.removeprefix("-")
    return digits.isascii() and digits.isdigit() and len(digits) <= 18 and str(int(text)) == text
