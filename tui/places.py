"""Where this user's files are: state, settings; written whole or not at all, for their eyes only.

Follows the conventions of the system (on Linux the XDG variables).  Imports nothing heavy.
"""

from __future__ import annotations

import contextlib
import datetime
import hashlib
import json
import os
import secrets
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from kingpost.core.errors import KingpostError
from kingpost.core.text import visible

# No file of ours is larger; one that is was not written by us and is not read into memory.
MOST_BYTES = 8_000_000


class StateError(KingpostError):
    """A file of the user's state or configuration that cannot be read or written."""


def state_folder() -> Path:
    """Folder for what is kept from sitting to sitting."""
    from platformdirs import user_state_dir

    return Path(user_state_dir("kingpost", appauthor=False))


def config_file() -> Path:
    """The file of the user's own settings."""
    from platformdirs import user_config_dir

    return Path(user_config_dir("kingpost", appauthor=False)) / "config.toml"


def write_private(path: Path, data: bytes) -> None:
    """Write a file that appears complete or not at all, readable by its owner only.

    Raises:
        StateError: if the system refuses (no space, no permission, a file where a folder is due).
    """
    part = path.with_name(f".{path.name}.{secrets.token_hex(4)}.part")
    try:
        path.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
        handle = os.open(part, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600)
        try:
            with open(handle, "wb") as sink:
                sink.write(data)
                sink.flush()
                os.fsync(sink.fileno())
            os.replace(part, path)
        except BaseException:
            with contextlib.suppress(OSError):
                part.unlink()
            raise
    except OSError as trouble:
        why = trouble.strerror or str(trouble)
        # The reason first: on a narrow screen the end of a sentence is cut.
        raise StateError(f"nothing can be kept ({why}): {path}") from None


def write_json(path: Path, value: Any) -> None:
    """Write a value as JSON, privately and whole.

    Raises:
        StateError: if the system refuses.
    """
    write_private(path, json.dumps(value, indent=1).encode("ascii"))


def read_json(path: Path) -> Any:
    """The value in a JSON file; None where there is no file.

    Raises:
        StateError: if it cannot be read, or is no JSON.
    """
    try:
        with open(path, "rb") as source:
            data = source.read(MOST_BYTES + 1)
    except FileNotFoundError:
        return None
    except OSError as trouble:
        raise StateError(f"{path} cannot be read: {trouble.strerror or trouble}") from None
    if len(data) > MOST_BYTES:
        raise StateError(f"{path} is too large to be a file of kingpost; it is left alone")
    try:
        return json.loads(data)
    except (ValueError, RecursionError):
        raise StateError(
            f"{path} is damaged and is left out of account; remove it to be rid of this line"
        ) from None


def key_of(paths: Sequence[str]) -> str:
    """A file name for what is kept about tables: the same wherever one stands."""
    full = sorted(os.path.realpath(path) for path in paths)
    return hashlib.sha256(json.dumps(full).encode()).hexdigest()[:24]


def now() -> str:
    """The time by this machine's clock, to the second, with its offset."""
    return datetime.datetime.now().astimezone().isoformat(timespec="seconds")


def home_short(path: str) -> str:
    """A path as people write it: below the home folder with a tilde; safe to show."""
    home = os.path.expanduser("~")
    if home not in ("/", "") and (path == home or path.startswith(home + os.sep)):
        path = "~" + path[len(home) :]
    return visible(path)
