"""Vectors over nodes that a setting may name: teleport, beta."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from kingpost.core.errors import NodeNotFound, SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.text import id_text, listed, visible


def node_vector(graph: Graph, value: Any, name: str) -> Floats:
    """A vector of shape (n,) from an array of that shape or a mapping from id to number.

    Ids of a mapping are compared by their text; nodes it does not name get 0.

    Raises:
        SettingsError: for a wrong shape or numbers that are not finite.
        NodeNotFound: for ids that the graph does not hold.
    """
    if isinstance(value, Mapping):
        vector = np.zeros(graph.n)
        unknown = []
        for label, weight in value.items():
            try:
                vector[graph.find(id_text(label))] += float(weight)
            except NodeNotFound:
                unknown.append(visible(id_text(label), 40))
        if unknown:
            raise NodeNotFound(f"{name} names nodes the graph does not hold: {listed(unknown)}")
    else:
        vector = np.asarray(value, dtype=np.float64)
        if vector.shape != (graph.n,):
            raise SettingsError(
                f"{name} has shape {vector.shape}; it takes one number for each node ({graph.n:,})"
            )
    if not np.isfinite(vector).all():
        raise SettingsError(f"{name} holds a value that is NaN or infinite")
    return vector


def distribution(graph: Graph, value: Any, name: str) -> Floats:
    """A probability vector of shape (n,): as :func:`node_vector`, nonnegative, scaled to sum 1."""
    vector = node_vector(graph, value, name)
    if (vector < 0).any():
        raise SettingsError(f"{name} holds negative values; it takes weights from 0")
    total = float(vector.sum())
    if not total > 0:
        raise SettingsError(f"{name} is zero everywhere; give at least one node a positive weight")
    return vector / total
