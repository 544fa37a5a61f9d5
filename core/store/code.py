"""Which code an answer came from: what is kept by one version is no answer of another."""

from __future__ import annotations

import hashlib
from functools import lru_cache
from importlib import metadata
from pathlib import Path

_CORE = Path(__file__).resolve().parents[1]


@lru_cache(maxsize=8)
def code_of(*parts: str) -> str:
    """40 hexadecimal digits of the sources of some files and folders of the core.

    The text of the sources rather than a version number, which stays the same while the
    program is being worked on.
    """
    digest = hashlib.blake2b(version_of("kingpost").encode(), digest_size=20)
    for part in parts:
        place = _CORE / part
        for file in sorted(place.glob("*.py")) if place.is_dir() else [place]:
            data = file.read_bytes()
            digest.update(f"{part} {file.name} {len(data)}\n".encode() + data)
    return digest.hexdigest()


@lru_cache(maxsize=16)
def version_of(package: str) -> str:
    """The version of an installed package, without importing it."""
    try:
        return metadata.version(package)
    except metadata.PackageNotFoundError:
        return "unknown"


def libraries() -> dict[str, str]:
    """Versions of what the bits of an answer may depend on."""
    return {name: version_of(name) for name in ("numpy", "numba", "llvmlite", "scipy", "pyarrow")}
