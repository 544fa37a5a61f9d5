"""Everything a report is made from, gathered once."""

from __future__ import annotations

import datetime as dt
import hashlib
import os
import platform
from collections.abc import Mapping
from dataclasses import dataclass, field
from importlib import metadata

from kingpost.core.export.report.shortlist import Entry
from kingpost.core.graph import Graph
from kingpost.core.insight.agree import Agreement
from kingpost.core.insight.cohorts import Cohorts
from kingpost.core.insight.sweep import Sweep
from kingpost.core.result import Result
from kingpost.core.watch import Watch

_PIECE = 1 << 22


@dataclass(frozen=True)
class Source:
    """A file that was read: its name, size and SHA-256."""

    name: str
    size: int
    digest: str


@dataclass(frozen=True)
class Material:
    """What a report tells.

    ``results`` are by measure, the leading one first; ``refused`` measures are among them.
    ``command`` repeats the report; ``made`` is when it was made; ``remarks`` are conventions that
    only the caller knows.
    """

    graph: Graph
    results: Mapping[str, Result]
    question: str = ""
    agreement: Agreement | None = None
    shortlist: tuple[Entry, ...] = ()
    within: Cohorts | None = None
    sweep: Sweep | None = None
    top: int = 20
    command: str = ""
    made: str = ""
    versions: Mapping[str, str] = field(default_factory=dict)
    sources: tuple[Source, ...] = ()
    remarks: Mapping[str, str] = field(default_factory=dict)

    @property
    def leading(self) -> Result:
        """The result that the standings are of."""
        return next(iter(self.results.values()))


def now() -> str:
    """The time of making, UTC; ``SOURCE_DATE_EPOCH`` stands for it where it is set."""
    fixed = os.environ.get("SOURCE_DATE_EPOCH", "")
    moment = (
        dt.datetime.fromtimestamp(int(fixed), dt.UTC)
        if fixed.isascii() and fixed.isdigit() and len(fixed) < 12
        else dt.datetime.now(dt.UTC)
    )
    return moment.strftime("%Y-%m-%d %H:%M UTC")


def versions() -> dict[str, str]:
    """Versions of what the numbers depend on."""
    found = {"Python": platform.python_version()}
    for name in ("kingpost", "numpy", "scipy", "numba", "pyarrow"):
        try:
            found[name] = metadata.version(name)
        except metadata.PackageNotFoundError:
            found[name] = "unknown"
    return found


def sources(names: list[str], watch: Watch) -> tuple[Source, ...]:
    """Size and SHA-256 of files; those that are gone meanwhile are left out."""
    return tuple(
        found for name in dict.fromkeys(names) if (found := _source(name, watch)) is not None
    )


def _source(name: str, watch: Watch) -> Source | None:
    digest, size = hashlib.sha256(), 0
    try:
        with open(name, "rb") as file:
            total = os.fstat(file.fileno()).st_size
            while piece := file.read(_PIECE):
                watch.check()
                digest.update(piece)
                size += len(piece)
                watch.report("taking fingerprints", size, total, "bytes")
    except OSError:
        return None
    return Source(name, size, digest.hexdigest())
