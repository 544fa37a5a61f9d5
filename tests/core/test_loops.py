"""Loops are counted in pieces; the pieces do not matter."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kingpost.core import graph as module
from kingpost.core.graph import Adjacency, Graph


@given(edges=st.sets(st.tuples(st.integers(0, 7), st.integers(0, 7)), max_size=40))
@pytest.mark.parametrize("piece", [1, 3, 1_000])
def test_loops_are_those_counted_one_by_one(piece, edges):
    ordered = sorted(edges)
    counts = np.bincount([u for u, _ in ordered], minlength=8)
    offsets = np.concatenate(([0], np.cumsum(counts))).astype(np.int64)
    near = np.array([v for _, v in ordered], dtype=np.uint32)
    side = Adjacency(offsets, near, None)
    made = Graph(pa.array([f"n{i}" for i in range(8)]), outward=side, inward=side)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(module, "_PIECE", piece)
        assert made.loop_count == sum(u == v for u, v in edges)
