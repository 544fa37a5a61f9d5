"""Finished results kept beside their graph: found by measure and settings, equal bit for bit.

A result is filed under the content of its graph, the measure, every field of its settings, the
sources of the solvers and the versions of the libraries they stand on.  It comes back with its
log, bound, ranks and proven order, and says when it was solved.  What was cancelled or refused is
not kept, nor what a measure from outside this package answered, whose code is not known.
"""

from __future__ import annotations

import contextlib
import dataclasses
import hashlib
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from kingpost.core.graph import Graph
from kingpost.core.result import Bound, BoundKind, Iteration, Result, Seconds, Stop
from kingpost.core.store.code import code_of, libraries
from kingpost.core.store.graphs import now
from kingpost.core.store.plain import NotPlain
from kingpost.core.store.sealed import (
    FORMAT,
    StoreTrouble,
    hash_text,
    making,
    read_files,
    read_manifest,
    remove,
)
from kingpost.core.watch import Watch

if TYPE_CHECKING:
    from kingpost.core.measures.base import Measure, Settings, Solve
    from kingpost.core.store.shelf import Shelf

KIND = "result"
_HOUSE = "kingpost.core.measures."
_PARTS = ("measures", "solvers", "kernels", "certify.py", "colours.py", "operators.py",
          "parallel.py", "standing.py", "structure.py")  # fmt: skip


@dataclasses.dataclass(frozen=True)
class Drawer:
    """Where the results of one graph are looked for, and where new ones go."""

    content: str
    shelf: Shelf | None = None
    also: Path | None = None  # the results that came with a pack

    def places(self, key: str) -> list[Path]:
        """Folders that may hold the result of this key."""
        found = [self.also / key] if self.also is not None else []
        if self.shelf is not None:
            found.append(self.shelf.results / self.content / key)
        return found


def solve(
    measure: Measure, graph: Graph, settings: Settings | None = None, watch: Watch | None = None
) -> Solve:
    """Like ``measure.solve``, but a result that is kept is handed back without a sweep."""
    chosen, watch = settings or measure.settings(), watch or Watch()
    kept = find_result(measure, graph, chosen, watch)
    if kept is not None:
        return kept
    return (yield from measure.solve(graph, chosen, watch))


def result_key(measure: Measure, settings: Any) -> str | None:
    """The key of a result within its graph; None for what cannot be told apart for certain."""
    solver = measure.solver
    if not getattr(solver, "__module__", "").startswith(_HOUSE):
        return None
    fields = {item.name: getattr(settings, item.name) for item in dataclasses.fields(settings)}
    try:
        return hash_text(
            {
                "format": FORMAT,
                "measure": measure.name,
                "solver": f"{solver.__module__}.{solver.__qualname__}",
                "settings": {name: _telling(value) for name, value in fields.items()},
                "code": code_of(*_PARTS),
                "libraries": libraries(),
            }
        )
    except NotPlain:
        return None


def _telling(value: Any) -> Any:
    """A setting as a plain value: vectors by their bits."""
    if isinstance(value, np.ndarray):
        if value.dtype.hasobject:
            raise NotPlain("objects")
        bits = hashlib.blake2b(np.ascontiguousarray(value).tobytes(), digest_size=20)
        return {"array": [str(value.dtype), list(value.shape), bits.hexdigest()]}
    if isinstance(value, Mapping):
        # Order counts: the weights of one node given twice are added up in it.
        return [[type(key).__name__, _telling(key), _telling(item)] for key, item in value.items()]
    if isinstance(value, float):
        return value.hex()  # tells 0.0 from -0.0 and 1.0 from 1
    return value


def find_result(measure: Measure, graph: Graph, settings: Any, watch: Watch) -> Result | None:
    """The kept result of these settings; one that must not be believed is taken away.

    Raises:
        Interrupted: if the watch was cancelled.
    """
    drawer: Drawer | None = graph.drawer
    if drawer is None or (key := result_key(measure, settings)) is None:
        return None
    for place in drawer.places(key):
        if not place.is_dir():
            continue
        try:
            found = read_result(place, graph, settings, watch)
        except StoreTrouble:
            if place.parent != drawer.also:  # a pack is not ours to tidy
                with contextlib.suppress(OSError):
                    remove(place)
            continue
        if found.measure == measure.name:
            if drawer.shelf is not None:
                drawer.shelf.used(place)
            return found
    return None


def keep_result(measure: Measure, graph: Graph, result: Result, watch: Watch) -> str | None:
    """Keep a finished result whose order has been established; a sentence where it cannot be.

    Does nothing for what came from the store, was cancelled or refused, or has no place.

    Raises:
        Interrupted: if the watch is cancelled; nothing is left behind then.
    """
    drawer: Drawer | None = graph.drawer
    if (
        drawer is None
        or drawer.shelf is None
        or result.solved_on is not None
        or result.stop in (Stop.CANCELLED, Stop.REFUSED)
        or watch.cancelled  # ties may be missing
        or "standing" not in result.__dict__
        or (key := result_key(measure, result.settings)) is None
    ):
        return None
    shelf = drawer.shelf
    parent = shelf.results / drawer.content
    try:
        shelf.prepare()
        shelf.make_room(40 * graph.n + 200 * len(result.log) + 10_000)
        shelf.folder(parent)
        with making(parent / key, watch) as draft:
            write_result(result, draft, drawer.content, graph.origin.name)
    except (OSError, StoreTrouble) as error:
        return f"the result is not kept: {shelf.why(error)}"
    return None


def write_result(result: Result, draft: Any, content: str, graph_name: str) -> None:
    """Write a result with its log, bound and ranks into a sealed folder.

    Raises:
        StoreTrouble: for facts that cannot be written exactly.
        OSError: if the system refuses.
    """
    standing, bound = result.standing, result.bound
    columns = {
        "score": result.scores,
        "order": standing.order.astype(np.uint32),
        "rail": standing.rail,
        "first": standing.first.astype(np.uint32),
        "last": standing.last.astype(np.uint32),
    }
    if result.exact_zero is not None:
        columns["exact_zero"] = result.exact_zero.astype(np.uint8)
    if isinstance(bound.absolute, np.ndarray):
        columns["absolute"] = np.broadcast_to(bound.absolute, result.scores.shape)
    draft.arrays("nodes.arrow", columns)
    _write_log(result.log, draft)
    draft.seal(
        KIND,
        {
            "content": content,
            "graph": graph_name,
            "measure": result.measure,
            "settings": _settings_words(result.settings),
            "n": len(result.scores),
            "stop": result.stop.value,
            "reason": result.reason,
            "bound": {
                "kind": bound.kind.value,
                "value": bound.value,
                "relative": bound.relative,
                "absolute": None if "absolute" in columns else bound.absolute,
            },
            "proven": standing.proven,
            "conventions": dict(result.conventions),
            "seconds": dataclasses.asdict(result.seconds),
            "facts": dict(result.facts),
            "solved_on": now(),
        },
    )


def read_result(place: Path, graph: Graph, settings: Any, watch: Watch) -> Result:
    """The result in a sealed folder, for the graph and the settings it was solved with.

    Raises:
        StoreTrouble: if it must not be believed, or belongs to another graph.
        Interrupted: if the watch was cancelled.
    """
    from kingpost.core.standing import Standing

    import pyarrow as pa  # isort: skip

    manifest = read_manifest(place, KIND)
    about = manifest["about"]
    if graph.drawer is None or about.get("content") != graph.drawer.content:
        raise StoreTrouble("it belongs to another graph")
    opened = read_files(place, manifest, watch)
    try:
        nodes = opened["nodes.arrow"]()
        if nodes.num_rows != graph.n or about["n"] != graph.n:
            raise ValueError("nodes")
        column = {name: nodes.column(name).to_numpy() for name in nodes.column_names}
        _in_range(column, graph.n)
        bound = dict(about["bound"])
        if "absolute" in column:
            bound["absolute"] = column["absolute"]
        bound["kind"] = BoundKind(bound["kind"])
        zero = column.get("exact_zero")
        result = Result(
            measure=about["measure"],
            settings=settings,
            scores=column["score"],
            stop=Stop(about["stop"]),
            reason=about["reason"],
            bound=Bound(**bound),
            log=_read_log(opened["log.arrow"]()),
            conventions=about["conventions"],
            seconds=Seconds(**about["seconds"]),
            facts=about["facts"],
            exact_zero=None if zero is None else zero.astype(bool),
            solved_on=about["solved_on"],
            known_standing=Standing(
                order=column["order"].astype(np.int64),
                rail=column["rail"],
                first=column["first"].astype(np.int64),
                last=column["last"].astype(np.int64),
                proven=about["proven"],
            ),
        )
    except (pa.ArrowException, ValueError, KeyError, TypeError, IndexError) as error:
        raise StoreTrouble(f"its parts do not fit together ({error})") from None
    return result


def _in_range(column: Mapping[str, Any], n: int) -> None:
    """Every node has its place in the order: a position outside would lead loops astray."""
    if n and (np.bincount(column["order"], minlength=n) != 1).any():
        raise ValueError("order")


def _write_log(log: tuple[Iteration, ...], draft: Any) -> None:
    import pyarrow as pa

    whole, real = pa.int64(), pa.float64()
    spans = [line.eigenvalue or (None, None) for line in log]
    columns = {
        "index": pa.array([line.index for line in log], whole),
        "residual": pa.array([float(line.residual) for line in log], real),
        "bound": pa.array([float(line.bound) for line in log], real),
        "edge_visits": pa.array([int(line.edge_visits) for line in log], whole),
        "seconds": pa.array([float(line.seconds) for line in log], real),
        "proven": pa.array([line.proven for line in log], whole),
        "low": pa.array([span[0] for span in spans], real),
        "high": pa.array([span[1] for span in spans], real),
        "part": pa.array([line.part for line in log], pa.string()),
    }
    draft.arrays("log.arrow", columns)


def _read_log(table: Any) -> tuple[Iteration, ...]:
    rows = table.to_pydict()
    names = ("index", "residual", "bound", "edge_visits", "seconds", "proven")
    spans = zip(rows["low"], rows["high"], strict=True)
    brackets = [None if low is None else (low, high) for low, high in spans]
    columns = [rows[name] for name in names]
    lines = zip(*columns, brackets, rows["part"], strict=True)
    return tuple(Iteration(*line) for line in lines)


def _settings_words(settings: Any) -> str:
    """The settings that differ from their defaults, for a list."""
    words = []
    for item in dataclasses.fields(settings):
        value = getattr(settings, item.name)
        default = item.default
        if default is dataclasses.MISSING and item.default_factory is not dataclasses.MISSING:
            default = item.default_factory()
        if isinstance(value, (np.ndarray, Mapping)):
            words.append(f"{item.name}=({len(value):,} values)")
        elif value != default:
            words.append(f"{item.name}={value}")
    return ", ".join(words)
