"""Mass balance of a stage: the solution obeys it, and a scaled one is scaled back."""

from __future__ import annotations

import numpy as np
import pytest
from graphs import dense, graphs
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from kingpost.core.operators import walk
from kingpost.core.solvers.balance import Balance
from kingpost.core.solvers.stages import plan
from kingpost.core.watch import Watch


@settings(deadline=None)
@given(graphs(), st.sampled_from(["along", "against"]), st.floats(0.3, 3.0))
def test_a_scaled_solution_is_scaled_back(graph, flow, factor):
    matrix, _ = walk(graph, flow, 0.85)
    a = dense(graph)
    a = a.T if flow == "along" else a
    b = np.array([0.15 / graph.n])
    x = np.linalg.solve(np.eye(graph.n) - a * matrix.scale, np.full(graph.n, b[0]))
    made = plan(graph.structure, matrix.rows, flow)
    stages = [stage for stage in made.stages if stage.swept]
    assume(stages)
    for stage in stages:
        z = matrix.scale * x
        balance = Balance(matrix, b, made.order, stage, graph.structure, z, Watch(threads=1))
        inside = made.order[stage.low : stage.high]
        y, w = x.copy(), z.copy()
        y[inside] *= factor
        w[inside] *= factor
        found = balance.factor(y, w)
        assert found == pytest.approx(1.0 if abs(factor - 1) < 1e-9 else 1 / factor, rel=1e-9)
        assert balance.factor(x, z) == 1.0
