"""Small hand-made graphs, results and measures for testing the screen without real solves."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyarrow as pa
import pytest

from kingpost.core.graph import Adjacency, Graph, Origin
from kingpost.core.measures.base import Measure, Settings, option
from kingpost.core.result import Bound, BoundKind, Iteration, Refusal, Result, Stop


def adjacency(n: int, edges: Sequence[tuple[int, int, float]]) -> Adjacency:
    """Compressed rows of a short list of edges, ascending in each row."""
    ordered = sorted(edges)
    counts = np.bincount([u for u, _, _ in ordered], minlength=n)
    offsets = np.concatenate(([0], np.cumsum(counts))).astype(np.int64)
    near = np.array([v for _, v, _ in ordered], dtype=np.uint32)
    return Adjacency(offsets, near, np.array([w for _, _, w in ordered], dtype=np.float64))


def hand_made(
    names: Sequence[Any],
    edges: Sequence[tuple[int, int, float]],
    attributes: dict[str, Any] | None = None,
) -> Graph:
    """A directed graph of named nodes; the names must ascend."""
    assert list(names) == sorted(names)
    return Graph(
        pa.array(names),
        outward=adjacency(len(names), edges),
        inward=adjacency(len(names), [(v, u, w) for u, v, w in edges]),
        attributes=pa.table(attributes) if attributes else None,
        origin=Origin(("hand_made.parquet",), "caller", "callee", "calls"),
    )


def scored(
    graph: Graph,
    scores: Sequence[float],
    *,
    measure: str = "plain",
    error: float = 0.0,
    log: tuple[Iteration, ...] = (),
    settings: Any = None,
    **facts: Any,
) -> Result:
    """A result with these scores, each known within ``error``."""
    return Result(
        measure=measure,
        settings=settings or PlainSettings(),
        scores=np.asarray(scores, dtype=np.float64),
        stop=Stop.CONVERGED,
        reason="by hand",
        bound=Bound(BoundKind.COMPONENTWISE, error, absolute=error),
        log=log,
        facts=facts,
    )


@dataclass(frozen=True, kw_only=True)
class PlainSettings(Settings):
    """Settings of the measures made for these tests."""

    pull: float = option(0.5, "how strongly it pulls", low=0.0, high=1.0, open_high=True)
    side: str = option("near", "which side it looks at", choices=("near", "far"))
    steps: int = option(3, "how many sweeps it makes", low=1)


@dataclass
class Workbench:
    """Measures made for these tests.

    ``plain`` scores by in-strength times ``pull``, ``mirror`` by out-strength; ``barren`` refuses;
    ``held`` sweeps until ``release`` is set or it is cancelled; ``broken`` raises.
    """

    release: threading.Event = field(default_factory=threading.Event)
    sweeping: threading.Event = field(default_factory=threading.Event)
    names: tuple[str, ...] = ("plain", "mirror", "barren", "held", "broken")

    def find(self, name: str) -> Measure:
        letter = dict(zip(self.names, "PMBHX", strict=True))[name]
        return Measure(name, letter, f"the {name} one", PlainSettings, getattr(self, name))

    def plain(self, graph: Graph, settings: Any, watch: Any) -> Any:
        yield from (
            Iteration(i, 10.0**-i, 3 * 10.0**-i, i * graph.stored, i / 100, proven=i)
            for i in range(1, settings.steps + 1)
        )
        scores = graph.inward.strengths() * settings.pull
        log = tuple(
            Iteration(i, 10.0**-i, 3 * 10.0**-i, i * graph.stored, i / 100, proven=i)
            for i in range(1, settings.steps + 1)
        )
        return scored(graph, scores, measure="plain", settings=settings, log=log)

    def mirror(self, graph: Graph, settings: Any, watch: Any) -> Any:
        yield Iteration(1, 0.0, 0.0, graph.stored, 0.0)
        return scored(graph, graph.outward.strengths(), measure="mirror", settings=settings)

    def barren(self, graph: Graph, settings: Any, watch: Any) -> Any:
        yield Iteration(1, 0.0, 0.0, graph.stored, 0.0)
        refusal = Refusal("the graph has no such eigenvector", "use plain, which always answers")
        return Result(
            "barren",
            settings,
            np.full(graph.n, np.nan),
            Stop.REFUSED,
            refusal.sentence,
            Bound(BoundKind.NONE, np.nan),
            refusal=refusal,
        )

    def held(self, graph: Graph, settings: Any, watch: Any) -> Any:
        index = 0
        while not watch.cancelled and not self.release.wait(0.005):
            index += 1
            yield Iteration(index, 1.0 / index, 2.0 / index, index * graph.stored, 0.0)
            self.sweeping.set()
        result = scored(graph, graph.inward.strengths()[::-1], measure="held", settings=settings)
        stop = Stop.CANCELLED if watch.cancelled else Stop.CONVERGED
        return Result(**{**vars(result), "stop": stop, "reason": "best so far"})

    def broken(self, graph: Graph, settings: Any, watch: Any) -> Any:
        yield Iteration(1, 1.0, 1.0, graph.stored, 0.0)
        raise RuntimeError("a \x1b[31mbroken\x1b[0m solver")


NAMES = ["berth", "fare", "gate", "kiosk", "quay", "ticket"]
EDGES = [
    (0, 1, 4.0),
    (0, 2, 2.0),
    (1, 2, 3.0),
    (2, 3, 1.0),
    (3, 2, 6.0),
    (4, 2, 1.0),
    (4, 1, 5.0),
    (5, 0, 2.0),
]
ATTRIBUTES = {"team": ["red", None, "blue", "red", "blue", "amber"], "tier": [3, 1, 2, None, 1, 2]}


@pytest.fixture(autouse=True)
def _state_of_its_own(tmp_path: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    """Logs of faults, marks and sittings stay out of the home folder."""
    monkeypatch.delenv("COLUMNS", raising=False)  # some runners of tests set it
    for name in ("XDG_STATE_HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME"):
        monkeypatch.setenv(name, str(tmp_path / name.split("_")[1].lower()))


@pytest.fixture
def graph() -> Graph:
    """Six nodes, eight weighted edges, two attributes with a null each."""
    return hand_made(NAMES, EDGES, ATTRIBUTES)


@pytest.fixture(scope="session")
def make_graph() -> Callable[..., Graph]:
    return hand_made


@pytest.fixture(scope="session")
def make_result() -> Callable[..., Result]:
    return scored


@pytest.fixture(scope="session")
def plain_settings() -> type[PlainSettings]:
    return PlainSettings


@pytest.fixture
def bench() -> Any:
    """The measures made for these tests; whatever still sweeps is released afterwards."""
    made = Workbench()
    yield made
    made.release.set()
