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
from kingpost.core.solvers.sweeping import Swept, Weighing, sweep
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
        z = np.atleast_2d(matrix.scale * x)
        watch = Watch(threads=1)
        balance = Balance(matrix, b, made.order, stage, graph.structure, z[0], watch)
        inside = made.order[stage.low : stage.high]
        # What a sweep that ends in the solution, times a factor, would say of it.
        weight = float(balance.weighing.left[0] * x[inside].sum())
        image = float(balance.weighing.given[inside] @ x[inside])
        found = balance.factor(Swept(0.0, 0.0, 0.0, factor * weight, factor * image))
        assert found == pytest.approx(1 / factor, rel=1e-9)
        assert balance.factor(Swept(0.0, 0.0, 0.0, weight, image)) == pytest.approx(1.0, abs=1e-12)
        y, w = x.copy(), z.copy()
        balance.scale(factor, y, w)
        assert y[inside] == pytest.approx(factor * x[inside], rel=1e-15)
        assert np.delete(y, inside).tolist() == np.delete(x, inside).tolist()
        assert w[0] == pytest.approx(matrix.scale * y, rel=1e-15)


@settings(deadline=None)
@given(graphs(), st.sampled_from(["along", "against"]))
def test_a_sweep_weighs_what_it_leaves(graph, flow):
    matrix, _ = walk(graph, flow, 0.85)
    made = plan(graph.structure, matrix.rows, flow)
    stages = [stage for stage in made.stages if stage.swept]
    assume(stages)
    b, x = np.full(1, 0.15), np.ones(graph.n)
    z = np.tile(matrix.scale * x, (made.lanes, 1))
    rng = np.random.default_rng(graph.n)
    weighing = Weighing(rng.random(graph.n), rng.random(graph.n))
    for stage in stages:
        before = x.copy()
        swept = sweep(matrix, b, made.order, stage, z, x, Watch(threads=1), weighing=weighing)
        rows = made.order[stage.low : stage.high]
        assert swept.weight == pytest.approx(float(weighing.left[rows] @ x[rows]), rel=1e-12)
        assert swept.image == pytest.approx(float(weighing.given[rows] @ x[rows]), rel=1e-12)
        moved = np.abs(x - before)[rows]
        assert swept.moved == pytest.approx(float(moved.sum()), rel=1e-12)
        assert swept.farthest == pytest.approx(float((moved / x[rows]).max()), rel=1e-12)
