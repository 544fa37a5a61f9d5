"""Arrow IPC, as a file or as a stream of batches, opened as parts."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator, Sequence
from typing import Any

import pyarrow as pa
from pyarrow import ipc

from kingpost.core.errors import InputError
from kingpost.core.ingest.formats import Source
from kingpost.core.ingest.idtypes import first_line
from kingpost.core.ingest.parts import BATCH_ROWS, Part
from kingpost.core.watch import Watch

_END = b"\xff\xff\xff\xff\x00\x00\x00\x00"


def open_arrow(source: Source, watch: Watch) -> Part:
    """Open an IPC file or stream.

    Raises:
        InputError: if it is truncated or damaged.
        Interrupted: if the watch is cancelled.
    """
    schema = _opened(source, None)[0]
    rows = 0
    for batch in _batches(source, []):
        watch.check()
        rows += batch.num_rows
        watch.report("counting rows", rows, unit="rows")

    def read(
        columns: list[str], encoded: bool, groups: Sequence[int] | None = None
    ) -> Iterator[pa.RecordBatch]:
        for batch in _batches(source, columns):
            yield from _cut(batch.select(columns))

    return Part(source.name, schema, rows, read, notes=_cut_off(source))


def _batches(source: Source, columns: list[str]) -> Iterator[pa.RecordBatch]:
    """Batches with some of the columns, each found sound before it is handed on."""
    try:
        _, batches = _opened(source, columns)
        for batch in batches:
            # Offsets that point elsewhere would be followed by everything that comes after.
            batch.validate(full=True)
            yield batch
    except pa.ArrowMemoryError:
        raise  # no fault of the file's
    except (pa.ArrowException, OSError) as error:
        raise InputError(
            f"{source.name} is damaged: its rows cannot be read ({first_line(error)})"
        ) from None


def _opened(source: Source, columns: list[str] | None) -> tuple[pa.Schema, Iterator[Any]]:
    try:
        stream = source.stream() if source.packer else pa.memory_map(source.path)
        head = bytes(stream.read(6))
        stream.seek(0) if not source.packer else None
        if source.packer:
            stream = source.stream()
        file = head == b"ARROW1"
        if file and source.packer:
            stream = pa.BufferReader(stream.read_buffer())
        opener = ipc.open_file if file else ipc.open_stream
        whole = opener(stream)
        schema = whole.schema
        if columns is not None:
            fields = [at for at, name in enumerate(schema.names) if name in columns]
            options = ipc.IpcReadOptions(included_fields=fields)
            if not file:
                stream = source.stream() if source.packer else pa.memory_map(source.path)
            whole = opener(stream, options=options)
        if file:
            return schema, (whole.get_batch(at) for at in range(whole.num_record_batches))
        return schema, iter(whole)
    except (pa.ArrowException, OSError, ValueError) as error:
        raise InputError(
            f"{source.name} is a truncated or damaged Arrow file ({first_line(error)})"
        ) from None


def _cut(batch: pa.RecordBatch) -> Iterator[pa.RecordBatch]:
    if batch.num_rows <= BATCH_ROWS:
        yield batch
        return
    for start in range(0, batch.num_rows, BATCH_ROWS):
        yield batch.slice(start, BATCH_ROWS)


def _cut_off(source: Source) -> tuple[str, ...]:
    """A remark on a stream without an end mark: nothing tells whether it is whole."""
    if source.packer:
        return ()
    with contextlib.suppress(OSError), open(source.path, "rb") as file:
        if file.read(6) == b"ARROW1":
            return ()
        file.seek(-len(_END), 2)
        if file.read() != _END:
            return (
                f"{source.name}: the Arrow stream has no end mark, so nothing tells whether it "
                "is whole",
            )
    return ()
