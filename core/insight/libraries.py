"""Functions of other libraries and what they solve when called without further arguments.

Versions looked at: networkx 3.6, igraph 1.0 (Python), NetworKit 11.3, scikit-network 0.33.
"""

from __future__ import annotations

from dataclasses import dataclass

from kingpost.core.graph import Flow
from kingpost.core.insight.parameters import Parameter
from kingpost.core.insight.variants import Choice


@dataclass(frozen=True, slots=True)
class Default:
    """One function: its equation, flow (None: either), weights (None: either) and parameter."""

    name: str
    form: str
    scale: str
    weights: str | None
    flow: Flow | None = "along"
    parameter: tuple[str, float | str] | None = None
    undirected: bool | None = None


_SURFER = ("damping", 0.85)
_LENGTH, _SUM, _LARGEST = "Euclidean length 1", "sum 1", "largest 1"

DEFAULTS = (
    Default("networkx.pagerank", "surfer", _SUM, "asis", parameter=_SURFER),
    Default("networkx.eigenvector_centrality", "eigenvector", _LENGTH, "none"),
    Default("networkx.katz_centrality", "katz", _LENGTH, "none", parameter=("alpha", 0.1)),
    Default("networkx.hits (authorities)", "authorities", _SUM, "asis"),
    Default("networkx.hits (hubs)", "authorities", _SUM, "asis", "against"),
    Default("networkx.in_degree_centrality", "degree", "divided by n - 1", "none"),
    Default("networkx.out_degree_centrality", "degree", "divided by n - 1", "none", "against"),
    Default("networkx.degree_centrality", "total degree", "divided by n - 1", "none"),
    Default("igraph pagerank", "surfer", _SUM, "none", parameter=_SURFER),
    Default("igraph eigenvector_centrality", "eigenvector", _LARGEST, "none"),
    Default("igraph authority_score", "authorities", _LARGEST, "none"),
    Default("igraph hub_score", "authorities", _LARGEST, "none", "against"),
    Default("NetworKit PageRank", "surfer", _SUM, None, parameter=_SURFER),
    Default("NetworKit EigenvectorCentrality", "eigenvector", _LENGTH, None),
    Default(
        "NetworKit KatzCentrality", "katz shifted", _LENGTH, None,
        parameter=("alpha", "1 / (largest out-degree + 1)"),
    ),
    Default(
        "scikit-network PageRank", "surfer, landing on dangling", _SUM, "asis", parameter=_SURFER
    ),
    Default(
        "scikit-network Katz", "katz without beta in steps", "beta 1, not normalised", "none",
        parameter=("alpha", 0.5),
    ),
    Default("scikit-network HITS (columns)", "authorities", _LENGTH, "asis"),
    Default("scikit-network HITS (rows)", "authorities", _LENGTH, "asis", "against"),
)  # fmt: skip


def recognised(
    form: str, choice: Choice, flow: Flow, parameters: dict[str, Parameter], scale: str
) -> tuple[str, ...]:
    """Names of the functions whose defaults give just this."""
    return tuple(
        item.name
        for item in DEFAULTS
        if item.form == form
        and item.scale == scale
        and (item.flow is None or item.flow == flow)
        and _weights(item, choice)
        and _parameter(item, parameters)
    )


def _weights(item: Default, choice: Choice) -> bool:
    weights = "none" if choice.weights == "count" else choice.weights
    if weights in ("first", "last"):  # a graph that keeps one of parallel edges
        weights = "asis"
    return weights == item.weights if item.weights else weights in ("asis", "none")


def _parameter(item: Default, found: dict[str, Parameter]) -> bool:
    if item.parameter is None:
        return True
    name, wanted = item.parameter
    if name not in found:
        return False
    one = found[name]
    if isinstance(wanted, str):
        return one.words == wanted
    return one.value == wanted
