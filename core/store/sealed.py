"""Sealed folders: Arrow IPC files and a manifest with a checksum of each, written whole or not.

A folder is filled under a hidden name beside its place, every file brought to the disk, the
manifest last, and then renamed.  A reader believes nothing before the manifest's own seal, the
size of every file and the checksum of every byte have been found right.  Checksums are BLAKE2b
over blocks of 4 MiB, and over those blocks' digests: without special instructions it is among
the fastest that cannot miss a change by chance, and blocks let several threads share one file.
"""

from __future__ import annotations

import contextlib
import errno
import hashlib
import json
import os
import secrets
import shutil
import time
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Any

from kingpost.core.store.plain import NotPlain, pack, text_of, unpack
from kingpost.core.watch import Watch

FORMAT = 1  # of manifests and of everything beside them; a change makes all that is kept void
MANIFEST = "manifest.json"
BLOCK = 1 << 22
_MANIFEST_LIMIT = 1 << 26
_UNDER_WAY, _GOING = ".making-", ".going-"


class StoreTrouble(Exception):
    """Something kept that cannot be used, or cannot be kept; ``str()`` is the reason in words."""


class Missing(StoreTrouble):
    """There is nothing kept here."""


# ---- checksums -----------------------------------------------------------------------------


class Digest:
    """The checksum of bytes that come in pieces of any size."""

    def __init__(self) -> None:
        self._blocks: list[bytes] = []
        self._block = hashlib.blake2b(digest_size=32)
        self._room = BLOCK
        self.size = 0

    def add(self, data: memoryview) -> None:
        """Take in more bytes."""
        while len(data):
            part = data[: self._room]
            self._block.update(part)
            self._room -= len(part)
            self.size += len(part)
            data = data[len(part) :]
            if self._room == 0:
                self._blocks.append(self._block.digest())
                self._block, self._room = hashlib.blake2b(digest_size=32), BLOCK

    def hex(self) -> str:
        """64 hexadecimal digits."""
        last = [self._block.digest()] if self._room < BLOCK else []
        return joined([*self._blocks, *last])


def joined(blocks: list[bytes]) -> str:
    """The checksum of a file from the digests of its blocks."""
    return hashlib.blake2b(b"".join(blocks), digest_size=32).hexdigest()


def seal_of(manifest: Mapping[str, Any]) -> str:
    """The checksum of a manifest, its own entry ``seal`` apart."""
    rest = {key: value for key, value in manifest.items() if key != "seal"}
    text = json.dumps(rest, sort_keys=True, ensure_ascii=True, allow_nan=False)
    return hashlib.blake2b(text.encode(), digest_size=32).hexdigest()


def hash_text(value: Any) -> str:
    """40 hexadecimal digits that depend on a plain value."""
    return hashlib.blake2b(text_of(value).encode(), digest_size=20).hexdigest()


# ---- writing -------------------------------------------------------------------------------


class _Sink:
    """What Arrow writes to: counts, checks and lets go of the work within a few megabytes."""

    closed = False

    def __init__(self, file: Any, watch: Watch) -> None:
        self._file, self._watch = file, watch
        self.digest = Digest()

    def write(self, data: Any) -> int:
        view = memoryview(data).cast("B")
        for start in range(0, len(view), BLOCK):
            self._watch.check()
            part = view[start : start + BLOCK]
            self._file.write(part)
            self.digest.add(part)
        return len(view)

    def flush(self) -> None:
        self._file.flush()

    def close(self) -> None:
        """The file is closed by whoever opened it."""


class Draft:
    """A sealed folder under way."""

    def __init__(self, folder: Path, private: bool, watch: Watch) -> None:
        self.folder = folder
        self._mode = 0o600 if private else 0o666
        self._watch = watch
        self._files: dict[str, dict[str, Any]] = {}

    def table(self, name: str, table: Any) -> None:
        """Write an Arrow table or record batch as ``name``."""
        import pyarrow as pa

        with self._opened(name) as file:
            sink = _Sink(file, self._watch)
            self._watch.report("keeping the graph", len(self._files), None, "files")
            with pa.ipc.new_file(pa.PythonFile(sink, mode="w"), table.schema) as writer:
                writer.write(table)
        self._files[name] = {"bytes": sink.digest.size, "blake2b": sink.digest.hex()}

    def arrays(self, name: str, columns: Mapping[str, Any]) -> None:
        """Write numpy arrays (or Arrow arrays) of one length as the columns of ``name``."""
        import pyarrow as pa

        held = [
            value if isinstance(value, pa.Array) else pa.array(value) for value in columns.values()
        ]
        self.table(name, pa.RecordBatch.from_arrays(held, list(columns)))

    @property
    def digests(self) -> dict[str, str]:
        """The checksum of every file so far."""
        return {name: str(about["blake2b"]) for name, about in self._files.items()}

    def seal(self, kind: str, about: Mapping[str, Any]) -> None:
        """Write the manifest: from here on the folder is whole.

        Raises:
            StoreTrouble: if ``about`` holds what cannot be written exactly.
        """
        try:
            body = pack(about)
        except NotPlain as error:
            raise StoreTrouble(f"it cannot be written down: {error}") from None
        manifest = {"kingpost": kind, "format": FORMAT, "about": body, "files": self._files}
        manifest["seal"] = seal_of(manifest)
        with self._opened(MANIFEST) as file:
            file.write(json.dumps(manifest, indent=1, ensure_ascii=True).encode() + b"\n")
        sync_folder(self.folder)

    @contextlib.contextmanager
    def _opened(self, name: str) -> Iterator[Any]:
        flags = os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0)
        with os.fdopen(os.open(self.folder / name, flags, self._mode), "wb") as file:
            yield file
            file.flush()
            os.fsync(file.fileno())


@contextlib.contextmanager
def making(
    place: Path,
    watch: Watch,
    *,
    private: bool = True,
    over: Callable[[Path], bool] = lambda place: True,
) -> Iterator[Draft]:
    """A draft that takes the name ``place`` once the block ends, and is gone if it raises.

    What stands at ``place`` is put aside only when its successor is complete, and only if
    ``over(place)`` allows.  ``private`` folders and files are for their owner alone; others get
    what the user's mask allows.

    Raises:
        OSError: if the system refuses.
    """
    folder = place.parent / f"{_UNDER_WAY}{secrets.token_hex(8)}"
    folder.mkdir(mode=0o700 if private else 0o777)
    lock = _hold(folder)
    try:
        yield Draft(folder, private, watch)
        _settle(folder, place, over)
        sync_folder(place.parent)
    except BaseException:
        shutil.rmtree(folder, ignore_errors=True)
        raise
    finally:
        if lock is not None:
            os.close(lock)


def _settle(folder: Path, place: Path, over: Callable[[Path], bool]) -> None:
    for _ in range(10):
        try:
            os.rename(folder, place)
            return
        except OSError as error:
            if error.errno not in (errno.ENOTEMPTY, errno.EEXIST, errno.EACCES):
                raise
            if not place.is_dir() or not over(place):
                raise
            # Somebody else was first, or what stands here was found wanting: both are complete
            # answers to the same question, and the newer one was checked by us.
            remove(place)
    raise OSError(errno.EEXIST, "others keep writing it at the same time")


def remove(place: Path) -> None:
    """Take a folder away: in one step for every reader, file by file afterwards."""
    going = place.parent / f"{_GOING}{secrets.token_hex(8)}"
    with contextlib.suppress(FileNotFoundError):
        os.rename(place, going)
    shutil.rmtree(going, ignore_errors=True)


def sweep(parent: Path) -> None:
    """Take away what processes that were killed left half-written or half-removed in a folder."""
    with contextlib.suppress(OSError):
        for item in list(os.scandir(parent)):
            if item.name.startswith(_GOING) or (
                item.name.startswith(_UNDER_WAY) and _abandoned(Path(item.path))
            ):
                shutil.rmtree(item.path, ignore_errors=True)


def sync_folder(folder: Path) -> None:
    """Bring the names in a folder to the disk, where the system can."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _hold(folder: Path) -> int | None:
    """Lock a folder for as long as this process lives: the lock ends with it, however it ends."""
    try:
        import fcntl

        handle = os.open(folder, os.O_RDONLY)
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError:
            os.close(handle)
            return None
        return handle
    except (ImportError, OSError):
        return None


def _abandoned(folder: Path) -> bool:
    age = time.time() - folder.stat().st_mtime
    if age > 86_400:
        return True
    try:
        import fcntl
    except ImportError:
        return False
    if age < 2:
        return False  # it may not have been locked yet
    handle = os.open(folder, os.O_RDONLY)
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        return True
    except OSError:
        return False
    finally:
        os.close(handle)


# ---- reading -------------------------------------------------------------------------------


def is_pack(path: str | os.PathLike[str]) -> bool:
    """Whether a folder says of itself that it holds a compiled graph; not whether it is whole."""
    try:
        with open(os.path.join(path, MANIFEST), "rb") as file:
            return b'"kingpost": "graph"' in file.read(4096)
    except OSError:
        return False


def read_manifest(place: Path, kind: str) -> dict[str, Any]:
    """A manifest whose seal is right, its entry ``about`` unpacked.

    Raises:
        Missing: if there is none.
        StoreTrouble: if it is damaged, of another version, or of another kind.
    """
    try:
        with open(place / MANIFEST, "rb") as file:
            data = file.read(_MANIFEST_LIMIT)
    except (FileNotFoundError, NotADirectoryError):
        raise Missing(f"{place} holds no {MANIFEST}") from None
    except OSError as error:
        raise StoreTrouble(f"{MANIFEST} cannot be read ({error.strerror or error})") from None
    try:
        manifest = json.loads(data)
        if manifest["format"] != FORMAT:
            raise StoreTrouble(
                f"it is of format {manifest['format']}, this version reads format {FORMAT}"
            )
        if manifest["seal"] != seal_of(manifest):
            raise StoreTrouble(f"{MANIFEST} does not match its checksum")
        if manifest["kingpost"] != kind:
            raise StoreTrouble(f"it holds a {manifest['kingpost']}, not a {kind}")
        manifest["about"] = unpack(manifest["about"])
        for name, about in manifest["files"].items():
            if os.path.basename(name) != name or not isinstance(about["bytes"], int):
                raise ValueError(name)
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError):
        raise StoreTrouble(f"{MANIFEST} is damaged") from None
    return dict(manifest)


def read_files(
    place: Path, manifest: Mapping[str, Any], watch: Watch
) -> dict[str, Callable[[], Any]]:
    """For every file a function that opens it as an Arrow table over the memory map.

    Every byte has been checked by then.

    Raises:
        StoreTrouble: naming the file that is missing, of the wrong size or changed.
        Interrupted: if the watch was cancelled.
    """
    import pyarrow as pa

    from kingpost.core.parallel import each

    maps: dict[str, Any] = {}
    pieces: list[tuple[str, int]] = []
    for name, about in manifest["files"].items():
        path = place / name
        try:
            if path.stat().st_size != about["bytes"]:
                raise StoreTrouble(f"{name} is {path.stat().st_size:,} bytes long, not "
                                   f"{about['bytes']:,}")  # fmt: skip
            maps[name] = pa.memory_map(str(path)).read_buffer()
        except FileNotFoundError:
            raise StoreTrouble(f"{name} is missing") from None
        except (OSError, pa.ArrowException) as error:
            raise StoreTrouble(f"{name} cannot be read ({error})") from None
        pieces.extend((name, start) for start in range(0, about["bytes"], BLOCK))
    views = {name: memoryview(held) for name, held in maps.items()}

    def check(piece: tuple[str, int]) -> bytes:
        if watch.cancelled:
            return b""
        name, start = piece
        return hashlib.blake2b(views[name][start : start + BLOCK], digest_size=32).digest()

    watch.report("checking what is kept", 0, len(pieces), "blocks")
    blocks: dict[str, list[bytes]] = {name: [] for name in maps}
    for (name, _), found in zip(pieces, each(check, pieces, watch.threads), strict=True):
        blocks[name].append(found)
    watch.check()
    for name, about in manifest["files"].items():
        if joined(blocks[name]) != about["blake2b"]:
            raise StoreTrouble(f"{name} does not match its checksum")

    def opener(name: str) -> Callable[[], Any]:
        return lambda: pa.ipc.open_file(pa.BufferReader(maps[name])).read_all()

    return {name: opener(name) for name in maps}
