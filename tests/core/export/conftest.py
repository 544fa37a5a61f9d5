"""Rankings for the tests of this folder, which may import the helper beside them."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pytest

sys.path.insert(0, str(Path(__file__).parent))

from handmade import HOSTILE, make_graph, make_result

from kingpost.core.export.rows import Ranking


@pytest.fixture
def hostile() -> Ranking:
    """One node a name that a terminal, a spreadsheet, a browser or a reader trips over."""
    names = sorted(HOSTILE, key=str.encode)
    n = len(names)
    extra = pa.table({"note": names[::-1], "rank": list(range(n))})
    graph = make_graph(pa.array(names), [(i, 0) for i in range(1, n)], None, extra)
    return Ranking(graph, make_result(np.linspace(1.0, 0.1, n)))


@pytest.fixture
def ranking() -> Callable[..., Ranking]:
    """A ranking from scores, with ids ``a``, ``b``, ... and edges all towards ``a``."""

    def make(scores: list[float], top: int | None = None, **about: Any) -> Ranking:
        labels = pa.array([chr(97 + i) for i in range(len(scores))])
        graph = make_graph(labels, [(i, 0) for i in range(1, len(scores))])
        return Ranking(graph, make_result(scores, **about), top)

    return make
