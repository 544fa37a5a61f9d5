"""How much memory loading a table is going to take, and how much there is.

The peak is the greater of two: while ids are read and numbered, their columns, the numbers and
the dictionary are held together; while the adjacency is built, the numbered rows and their
sorted copies are.  Bytes a row and a node are as measured by tests/bench/room.py; the number of
nodes is estimated from samples of rows, so the whole is an estimate and no bound.
"""

from __future__ import annotations

import contextlib
import math
import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from kingpost.core.errors import InputError
from kingpost.core.ingest.columns import Roles
from kingpost.core.ingest.idtypes import convert, family, integer_type, plain
from kingpost.core.ingest.parts import Part
from kingpost.core.ingest.where import Filter
from kingpost.core.text import count, visible
from kingpost.core.watch import Watch

# Measured, in bytes: see tests/bench/room.py.
_ROW_DIRECT, _ROW_HASHED, _ROW_WEIGHTED = 27, 40, 52  # numbered by their own range, or not
_NODE_BUILDING = 45
_MIRRORED = 20  # more for a row that is read both ways
_NODE_NUMBERING = 100  # and four copies of a text
_NODE_DIRECT = 20
_CODES = 8
_READING = 40e6
_ENGINE = 100e6  # of SQL, where rows are filtered
_SPARE = 1.05  # predictions fell short of the truth by up to a tenth
_SMALL = 500_000  # rows below which nothing is sampled: whatever they take is there
_SAMPLES, _SAMPLE_ROWS = 4, 65_536


@dataclass(frozen=True)
class Available:
    """Bytes of memory that can still be had, and what limits them, in words."""

    bytes: int
    limit: str


@dataclass(frozen=True)
class Prediction:
    """What loading is going to take.

    Attributes:
        peak: bytes at the peak, over what the process holds already.
        rows: rows that are going to be kept; nodes: an estimate of their number.
        available: None where the system does not tell.
        weighted: whether weights are part of it.
    """

    peak: int
    rows: int
    nodes: int
    available: Available | None
    weighted: bool = False

    @property
    def fits(self) -> bool:
        """Whether it is going to fit, as far as can be told."""
        return self.available is None or self.peak <= self.available.bytes

    @property
    def words(self) -> str:
        """The figures, in a few words."""
        words = f"{size(self.peak)} at the peak of loading, as predicted"
        if self.available is not None:
            words += f", of {size(self.available.bytes)} available ({self.available.limit})"
        return words


def size(number: float) -> str:
    """Bytes in decimal units: ``1.2 GB``."""
    for unit, name in ((1e12, "TB"), (1e9, "GB"), (1e6, "MB")):
        if number >= unit:
            return f"{number / unit:.3g} {name}"
    return f"{number / 1e3:.0f} kB"


def predict(
    parts: list[Part],
    roles: Roles,
    watch: Watch,
    chosen: Filter | None = None,
    *,
    directed: bool = True,
    sample: bool = True,
) -> Prediction:
    """Predict the peak of loading ``parts``.

    Samples of large tables are read for it; without ``sample`` nothing is read, every row is
    taken to be kept and to name two nodes of its own, so far as statistics allow that.

    Raises:
        InputError: if a file is damaged, or a filter fails on a sampled row.
        Interrupted: if the watch is cancelled.
    """
    rows = sum(part.rows for part in parts)
    nodes, share = 2 * rows, 1.0
    if sample and rows > _SMALL:
        watch.report("sampling rows", 0)
        nodes, share = _sampled(parts, roles, watch, chosen)
    between = _range(parts, roles)
    nodes = int(min(nodes, between))
    kept = round(rows * share)
    weighted = roles.weight is not None
    width = sum(_width(part, roles) for part in parts) * share  # bytes of all ids kept
    text = family(roles.id_type) in ("text", "binary")
    letters = width / max(2 * kept, 1) if text else 8.0
    direct = between <= 2 * kept
    node = _NODE_DIRECT if direct else _NODE_NUMBERING + 4 * letters
    numbering = width + kept * (_CODES + 8 * weighted) + nodes * node
    row = _ROW_DIRECT if direct else _ROW_HASHED
    building = 1.0 * kept * ((_ROW_WEIGHTED if weighted else row) + _MIRRORED * (not directed))
    building += nodes * (_NODE_BUILDING + 2 * letters * text)
    peak = max(numbering + _READING if rows > _SMALL else numbering, building)
    if chosen is not None:
        peak += _ENGINE
    return Prediction(round(_SPARE * peak), kept, nodes, available(), weighted)


def require_room(
    parts: list[Part],
    roles: Roles,
    watch: Watch,
    chosen: Filter | None = None,
    *,
    directed: bool = True,
) -> None:
    """Refuse a table that is not going to fit, before anything is read of it.

    Raises:
        InputError: with the figures and what to do.
    """
    if predict(parts, roles, watch, chosen, directed=directed, sample=False).fits:
        return
    found = predict(parts, roles, watch, chosen, directed=directed)
    if found.fits or found.available is None:
        return
    name = parts[0].name if len(parts) == 1 else f"{parts[0].name} and {len(parts) - 1:,} more"
    less = "leave the weights out with --weight-as none, " if found.weighted else ""
    raise InputError(
        f"{visible(name)} is predicted to need {size(found.peak)} of memory "
        f"({count(found.rows, 'row')}, some {found.nodes:,} nodes), and "
        f"{size(found.available.bytes)} is available ({found.available.limit}); {less}keep fewer "
        "rows with --where, free memory, or go on all the same with --memory ignore"
    )


def _width(part: Part, roles: Roles) -> float:
    """Bytes of both id columns of a part in memory."""
    total = 0.0
    for name in (roles.source, roles.target):
        kind = plain(part.schema.field(name).type)
        known = part.width(name)
        if known is not None:
            total += known * part.rows
        elif family(kind) in ("text", "binary"):
            total += 24.0 * part.rows  # nothing tells: names of middling length
        else:
            with contextlib.suppress(ValueError):
                total += kind.bit_width / 8 * part.rows
    return total


def _sampled(
    parts: list[Part], roles: Roles, watch: Watch, chosen: Filter | None
) -> tuple[int, float]:
    """Number of nodes and share of rows kept, estimated from batches here and there."""
    looked, kept = 0, 0
    found: list[pa.Array] = []
    for part in _spread(parts):
        for rows, batch in _samples(part, [roles.source, roles.target], watch, chosen):
            watch.check()
            looked += rows
            kept += batch.num_rows
            for at, name in enumerate((roles.source, roles.target)):
                ids = convert(batch.column(at), roles.id_type, name, part.name)
                found.append(ids.drop_null())
    rows = sum(part.rows for part in parts)
    share = kept / looked if looked else 1.0
    if not kept:
        return 2, share
    ids = pa.chunked_array(found, roles.id_type)
    return estimate(ids, round(2 * rows * share)), share


def estimate(ids: pa.ChunkedArray, total: int) -> int:
    """How many different ids ``total`` ends of edges hold, of which ``ids`` are some.

    What was met, and three times what Chao's estimator adds to it (Scandinavian Journal of
    Statistics 11, 1984, pp. 265-270): that is a lower bound for rows drawn at random, and rows
    taken together are more alike than that.
    """
    times = pc.value_counts(ids).field("counts").to_numpy()
    once, twice = int(np.count_nonzero(times == 1)), int(np.count_nonzero(times == 2))
    unseen = once * (once - 1) / (2 * (twice + 1))
    return int(min(total, len(times) + 3 * unseen))


def _range(parts: list[Part], roles: Roles) -> float:
    """How many whole numbers lie between the least and the greatest id, as far as files tell."""
    if integer_type(roles.id_type) is None:
        return math.inf
    low, high = math.inf, -math.inf
    for part in parts:
        for group in range(len(part.groups)):
            for name in (roles.source, roles.target):
                limits = part.limits(group, name)
                if limits is None or not all(isinstance(end, int) for end in limits):
                    return math.inf
                low, high = min(low, limits[0]), max(high, limits[1])
        if not part.groups:
            return math.inf
    return high - low + 1


def _spread(parts: list[Part]) -> list[Part]:
    at = np.unique(np.linspace(0, len(parts) - 1, min(len(parts), _SAMPLES)).round().astype(int))
    return [parts[i] for i in at]


def _samples(
    part: Part, columns: list[str], watch: Watch, chosen: Filter | None
) -> Iterator[tuple[int, pa.RecordBatch]]:
    """Batches of a part, from row groups spread over it."""
    asked = list(columns)
    own = [] if chosen is None else chosen.columns[part.name]
    asked += [name for name in own if name not in columns]
    groups: list[list[int] | None] = [None]
    if part.groups:
        at = np.linspace(0, len(part.groups) - 1, min(len(part.groups), _SAMPLES))
        groups = [[int(i)] for i in np.unique(at.round())]
    for group in groups:
        batches = part.read(asked, False, group)
        with contextlib.closing(batches):  # type: ignore[type-var]
            for batch in batches:
                batch = batch.slice(0, _SAMPLE_ROWS)
                rows = batch.num_rows
                if chosen is not None:
                    keep, _ = chosen.expression.evaluate(batch.select(own), part.name, watch)
                    batch = batch.filter(pa.array(keep))
                yield rows, batch.select(columns)
                break


def available(root: Path = Path("/")) -> Available | None:
    """Memory that this process can still get: of the machine, of its control groups, by ulimit.

    ``root`` is where proc and sys are looked for.
    """
    found = [
        *_of_machine(root),
        *_of_group(root, "0::", "sys/fs/cgroup", ("memory.max", "memory.current"), "inactive_file"),
        *_of_group(
            root,
            "memory",
            "sys/fs/cgroup/memory",
            ("memory.limit_in_bytes", "memory.usage_in_bytes"),
            "total_inactive_file",
        ),
        *_of_limits(root),
    ]
    return min(found, key=lambda each: each.bytes, default=None)


def _of_machine(root: Path) -> Iterator[Available]:
    with contextlib.suppress(OSError, ValueError):
        for line in (root / "proc/meminfo").read_text().splitlines():
            if line.startswith("MemAvailable:"):
                yield Available(int(line.split()[1]) * 1024, "free on this machine")


def _of_group(
    root: Path, mark: str, mount: str, files: tuple[str, str], cache: str
) -> Iterator[Available]:
    """What the limits of a control group and of those around it leave."""
    with contextlib.suppress(OSError, ValueError):
        path = None
        for line in (root / "proc/self/cgroup").read_text().splitlines():
            _, controllers, place = line.split(":", 2)
            if line.startswith(mark) or mark in controllers.split(","):
                path = place
        if path is None:
            return
        steps = [step for step in path.split("/") if step and step != ".."]
        # Within a container the path may be that of the host, and the mount the group itself.
        for depth in range(len(steps), -1, -1):
            folder = (root / mount).joinpath(*steps[:depth])
            with contextlib.suppress(OSError, ValueError):
                limit = (folder / files[0]).read_text().strip()
                if limit == "max" or int(limit) >= 1 << 62:
                    continue
                used = int((folder / files[1]).read_text())
                held = re.search(
                    rf"^{cache} (\d+)", (folder / "memory.stat").read_text(), re.MULTILINE
                )
                # What was read from files is given up when it is needed.
                spare = int(held[1]) if held else 0
                left = max(0, int(limit) - used + spare)
                yield Available(left, "left by the limit of its control group")


def _of_limits(root: Path) -> Iterator[Available]:
    with contextlib.suppress(OSError, ValueError, ImportError):
        import resource

        limit = resource.getrlimit(resource.RLIMIT_AS)[0]
        if limit == resource.RLIM_INFINITY:
            return
        held = re.search(r"^VmSize:\s+(\d+)", (root / "proc/self/status").read_text(), re.MULTILINE)
        if held:
            yield Available(max(0, limit - int(held[1]) * 1024), "left by ulimit -v")
