"""What format a file is in: by its first bytes, its name, or as told; and its plain bytes."""

from __future__ import annotations

import codecs
import os
from dataclasses import dataclass
from typing import Any

import pyarrow as pa

from kingpost.core.errors import InputError
from kingpost.core.ingest.idtypes import first_line

# Endings by format; a packed text file may carry the packer's ending behind.
ENDINGS = {
    "parquet": (".parquet", ".parq", ".pq"),
    "csv": (".csv",),
    "tsv": (".tsv", ".tab"),
    "arrow": (".arrow", ".arrows", ".feather", ".ipc"),
    "matrix-market": (".mtx", ".mm"),
    "graphml": (".graphml",),
}
PACKERS = {"gzip": (".gz",), "bz2": (".bz2",), "zstd": (".zst", ".zstd")}
_MAGIC = {b"\x1f\x8b": "gzip", b"BZh": "bz2", b"\x28\xb5\x2f\xfd": "zstd"}
_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_HEAD = 1 << 16


@dataclass(frozen=True)
class Source:
    """A file and what it seems to be.

    Attributes:
        path: where its bytes are; name: what messages call it.
        format: one of ``parquet, csv, tsv, arrow, matrix-market, graphml``, or ``text`` for
            delimited text of which nothing more is known.
        packer: what the bytes are compressed by, or None.
        encoding: of a text by its byte order mark; None where it has none.
    """

    path: str
    name: str
    format: str
    packer: str | None
    encoding: str | None

    @property
    def size(self) -> int:
        """Bytes of the file, as stored."""
        return os.path.getsize(self.path)

    def stream(self) -> Any:
        """The bytes, unpacked, as an Arrow input stream."""
        try:
            return pa.input_stream(self.path, compression=self.packer)
        except (pa.ArrowException, OSError) as error:
            raise InputError(f"{self.name} cannot be read: {first_line(error)}") from None

    def text(self, encoding: str | None) -> Any:
        """Like :meth:`stream`, as UTF-8 without a byte order mark."""
        stream = self.stream()
        known = encoding or self.encoding
        if known is None or _same(known, "utf-8"):
            return stream
        if _same(known, "utf-8-sig"):
            stream.read(len(codecs.BOM_UTF8))
            return stream
        return pa.transcoding_input_stream(stream, known, "utf-8")


def ending_format(path: str) -> str | None:
    """The format that the name of a file tells."""
    stem = path.lower()
    for endings in PACKERS.values():
        for ending in endings:
            stem = stem.removesuffix(ending)
    last = os.path.splitext(stem)[1]
    found = next((name for name, endings in ENDINGS.items() if last in endings), None)
    return None if found == "parquet" and stem != path.lower() else found


def look(path: str, name: str, told: str = "guess") -> Source:
    """Find out what a file is.

    Raises:
        InputError: if it cannot be opened, is empty, or is no table of any kind.
    """
    named = ending_format(name) if told == "guess" else told
    if named == "parquet":
        return Source(path, name, "parquet", None, None)
    try:
        with open(path, "rb") as file:
            head = file.read(_HEAD)
    except OSError as error:
        raise InputError(f"{name} cannot be read: {error.strerror or error}") from None
    if not head:
        raise InputError(f"{name} is empty (0 bytes); an edge table needs at least one row")
    if told == "guess" and (binary := _binary(head, name)) is not None:
        return Source(path, name, binary, None, None)
    packer = next((way for magic, way in _MAGIC.items() if head.startswith(magic)), None)
    if packer is not None:
        head = _unpacked(path, name, packer)
        if told == "guess" and (binary := _binary(head, name)) is not None:
            if binary == "parquet":
                raise InputError(f"{name} is a packed Parquet file; unpack it first")
            return Source(path, name, binary, packer, None)
    encoding = next((word for mark, word in _MARKS if head.startswith(mark)), None)
    format_ = named or _text_format(head, encoding)
    if format_ != "arrow" and encoding is None and b"\0" in head:
        raise InputError(
            f"{name} is no table of a known format (it holds null bytes); name Parquet, CSV, TSV, "
            "Arrow IPC, Matrix Market or GraphML files"
        )
    return Source(path, name, format_, packer, encoding)


def _binary(head: bytes, name: str) -> str | None:
    if head.startswith((b"PAR1", b"PARE")):
        return "parquet"
    # A stream of Arrow batches begins with a mark and the length of its schema.
    if head.startswith((b"ARROW1", b"\xff\xff\xff\xff")):
        return "arrow"
    if head.startswith(b"FEA1"):
        raise InputError(
            f"{name} is a Feather file of version 1; write it again as Arrow IPC (version 2)"
        )
    return None


def _unpacked(path: str, name: str, packer: str) -> bytes:
    try:
        with pa.input_stream(path, compression=packer) as stream:
            head = bytes(stream.read(_HEAD))
    except (pa.ArrowException, OSError) as error:
        raise InputError(
            f"{name} is damaged: it cannot be unpacked ({first_line(error)})"
        ) from None
    if not head:
        raise InputError(f"{name} is empty once unpacked; an edge table needs at least one row")
    return head


def _text_format(head: bytes, encoding: str | None) -> str:
    text = head.decode(encoding or "utf-8", "replace").lstrip()
    if text.lower().startswith("%%matrixmarket"):
        return "matrix-market"
    if text.startswith("<") and "<graphml" in text:
        return "graphml"
    return "text"


def _same(left: str, right: str) -> bool:
    try:
        return codecs.lookup(left).name == codecs.lookup(right).name
    except LookupError:
        return False
