"""Comparing graphs and results bit by bit."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from kingpost.core.result import Iteration

EDGES = {
    "source": ["a", "b", "c", "e", "e", "b", "a", "g", "h"],
    "target": ["b", "c", "a", "a", "d", "d", "b", "d", "d"],
    "weight": [1.0, 2.0, 1.0, 3.0, 1.0, 2.0, 1.0, 1.0, 1.0],
}
LINE = [item.name for item in dataclasses.fields(Iteration) if item.name != "seconds"]


def bits(array: Any) -> Any:
    """Type, shape and bytes of an array; None stays None."""
    if array is None or not isinstance(array, np.ndarray):
        return array if not isinstance(array, float) else array.hex()
    return str(array.dtype), array.shape, array.tobytes()


def graph_facts(graph: Any) -> dict[str, Any]:
    """Everything a graph holds, ready to be compared."""
    found: dict[str, Any] = {
        "labels": (graph.labels.type, graph.labels.to_pylist()),
        "directed": graph.directed,
        "one direction": graph.inward is graph.outward,
        "account": graph.account,
        "origin": graph.origin,
        "m": graph.m,
        "loops": graph.loop_count,
        "fingerprint": graph.fingerprint,
    }
    if graph.attributes is not None:
        found["attributes"] = (graph.attributes.schema, repr(graph.attributes.to_pylist()))
    for name in ("outward", "inward"):
        rows = getattr(graph, name)
        found[name] = [bits(rows.offsets), bits(rows.neighbours), bits(rows.weights)]
    structure = graph.structure
    for name in ("component", "order", "starts", "cyclic", "inner", "stored"):
        found[f"structure {name}"] = bits(getattr(structure, name))
    return found


def result_facts(result: Any) -> dict[str, Any]:
    """Everything a result says but the seconds it took and where it came from."""
    standing, bound = result.standing, result.bound
    log = [[plain(getattr(line, name)) for name in LINE] for line in result.log]
    return {
        "measure": result.measure,
        "settings": repr(result.settings),
        "scores": bits(result.scores),
        "stop": result.stop,
        "reason": result.reason,
        "bound": [bound.kind, *map(bits, (bound.value, bound.relative, bound.absolute))],
        "log": repr(log),
        "conventions": dict(result.conventions),
        "facts": {name: repr(plain(value)) for name, value in result.facts.items()},
        "exact zero": bits(result.exact_zero),
        "order": bits(standing.order),
        "rail": bits(standing.rail),
        "first": bits(standing.first),
        "last": bits(standing.last),
        "proven": int(standing.proven),
    }


def plain(value: Any) -> Any:
    """Numpy numbers as Python's."""
    if isinstance(value, tuple):
        return tuple(map(plain, value))
    return value.item() if isinstance(value, np.generic) else value
