"""One runner per kind of entry in check_values.json: from an entry to numbers to compare.

A runner takes an entry and returns a sequence like its ``expected``, through the public API only.
``RUNNERS`` and ``WITHOUT`` together must name every kind; ``WITHOUT_ENTRY`` names single entries.
To add a kind: write its runner, move its line from WITHOUT to RUNNERS.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa

from kingpost.core.graph import Graph
from kingpost.core.ingest import from_table
from kingpost.core.insight.audit import examine
from kingpost.core.insight.ranks import (
    Ranks,
    agreement,
    ranks_from_scores,
    rbo_weight,
    spearman,
    tau_b,
)
from kingpost.core.insight.spectrum import spectrum
from kingpost.core.measures import measure
from kingpost.core.measures.communicability import CommunicabilitySettings
from kingpost.core.measures.eigenvector import EigenvectorSettings
from kingpost.core.measures.hits import HitsSettings
from kingpost.core.measures.katz import KatzSettings
from kingpost.core.measures.subgraph import SubgraphSettings
from kingpost.core.measures.surfer import SurferSettings
from kingpost.core.measures.votes import VotesSettings
from kingpost.core.operators import walk
from kingpost.core.result import Result
from kingpost.core.watch import Watch

Entry = dict[str, Any]
ENTRIES: list[Entry] = json.loads((Path(__file__).parent / "check_values.json").read_text())


def entry(name: str) -> Entry:
    """The entry of that id."""
    return next(item for item in ENTRIES if item["id"] == name)


def table(item: Entry) -> pa.Table:
    """The edges as a user would hold them; ids as text."""
    columns = [[str(u) for u, _, _ in item["edges"]], [str(v) for _, v, _ in item["edges"]]]
    weight = [float(w) for _, _, w in item["edges"]]
    return pa.table({"source": columns[0], "target": columns[1], "weight": weight})


def graph_of(item: Entry) -> Graph:
    """The entry's graph."""
    return from_table(table(item), directed=item["directed"])


def rank(item: Entry, name: str, settings: Any) -> Result:
    """Solve to the end; the answer must have reached its accuracy."""
    result = measure(name).rank(graph_of(item), settings)
    assert result.stop.accurate, result.reason
    return result


def in_order(item: Entry, result: Result, graph: Graph | None = None) -> np.ndarray:
    """Scores in the entry's order of nodes, normalised as it says."""
    graph = graph or graph_of(item)
    scores = result.scores[[graph.find(str(node)) for node in item["nodes"]]]
    return scaled(scores, item["parameters"].get("normalise"))


def scaled(scores: np.ndarray, way: str | None) -> np.ndarray:
    """``scores`` divided by their sum, length or maximum."""
    divide: dict[str | None, Callable[[np.ndarray], float]] = {
        None: lambda x: 1.0,
        "sum=1": np.sum,
        "l1": lambda x: np.abs(x).sum(),
        "l2": np.linalg.norm,
        "max=1": np.max,
    }
    return scores / divide[way](scores)


def pagerank(item: Entry) -> Sequence[float]:
    said, graph = item["parameters"], graph_of(item)
    settings: dict[str, Any] = {"damping": said["alpha"], "tol": 1e-12}
    for name in ("dangling", "teleport"):
        given = said.get(name)
        if isinstance(given, list):
            by_node = dict(zip(map(str, item["nodes"]), given, strict=True))
            settings[name] = {node: value for node, value in by_node.items() if value}
        else:
            assert given in (None, "uniform", "teleport vector")
            if (name, given) == ("dangling", "uniform"):
                settings[name] = "uniform"
    return in_order(item, rank(item, "surfer", SurferSettings(**settings)), graph)


def power_iterates(item: Entry) -> Sequence[float]:
    """No measure forms plain power iterates, but the walk's operator is public."""
    said, graph = item["parameters"], graph_of(item)
    matrix, strength = walk(graph, "along", said["alpha"])
    assert (strength > 0).all()
    places = [graph.find(str(node)) for node in item["nodes"]]
    x = np.zeros(graph.n)
    x[places] = said["x0"]
    found: list[float] = []
    for step in range(1, max(said["iterates"]) + 1):
        x = matrix.apply(x, Watch()) + (1 - said["alpha"]) / graph.n
        if step in said["iterates"]:
            found += x[places].tolist()
    return found


def eigenvector(item: Entry) -> Sequence[float]:
    assert item["parameters"].get("weights") in (None, "ignored")
    return in_order(item, rank(item, "eigenvector", EigenvectorSettings(tol=1e-12)))


def eigenvector_right(item: Entry) -> Sequence[float]:
    settings = EigenvectorSettings(tol=1e-12, flow="against")
    return in_order(item, rank(item, "eigenvector", settings))


def katz(item: Entry) -> Sequence[float]:
    said = item["parameters"]
    settings = KatzSettings(
        alpha=said["alpha"], beta=float(said.get("beta", said.get("exogenous"))), tol=1e-13
    )
    return in_order(item, rank(item, "katz", settings))


def out_degrees(graph: Graph) -> np.ndarray:
    """``A 1``, by the measure of that name."""
    return measure("degree").rank(graph, measure("degree").settings(flow="against")).scores


def katz_bonacich(item: Entry) -> Sequence[float]:
    said, graph = item["parameters"], graph_of(item)
    settings = KatzSettings(
        alpha=said["b"], beta=said["a"] * out_degrees(graph), flow="against", tol=1e-13
    )
    return in_order(item, rank(item, "katz", settings), graph)


def bonacich_power(item: Entry) -> Sequence[float]:
    """Bonacich's c(alpha, beta): his negative beta is a negative alpha of ours."""
    said, graph = item["parameters"], graph_of(item)
    reported = [item["nodes"].index(node) for node in said.get("reported_nodes", item["nodes"])]
    found: list[float] = []
    for b in said["betas"]:
        settings = KatzSettings(alpha=b, beta=out_degrees(graph), flow="against", tol=1e-11)
        scores = in_order(item, rank(item, "katz", settings), graph)
        found += (scaled(scores, "l2") * np.sqrt(len(scores)))[reported].tolist()
    return found


def unrolled(item: Entry, steps: int) -> pa.Table:
    """Copies 0..steps of every node, an edge u -> v from each copy to the next one's v.

    Walks from copy j to copy k of this graph are the walks of length k - j of the entry's.
    """
    edges = [(str(u), str(v)) for u, v, w in item["edges"] if w == 1]
    assert len(edges) == len(item["edges"])
    if not item["directed"]:
        edges += [(v, u) for u, v in edges if u != v]
    copies = [(f"{k} {u}", f"{k + 1} {v}") for k in range(steps) for u, v in edges]
    return pa.table({"source": [u for u, _ in copies], "target": [v for _, v in copies]})


def katz_truncated(item: Entry) -> Sequence[float]:
    """Walks of bounded length are all walks of the unrolled graph; it has no cycle."""
    said = item["parameters"]
    length, graph = said["path_length"], from_table(unrolled(item, said["path_length"]))
    result = measure("katz").rank(graph, KatzSettings(alpha=said["damping"], tol=1e-13))
    assert result.stop.accurate
    return [
        result.scores[graph.find(f"{length} {node}")] - 1.0  # the walk of length 0
        for node in item["nodes"]
    ]


def score_vectors(item: Entry) -> Sequence[float]:
    """Row sums of A^k: walks of length k from a node, counted against the edges."""
    found: list[float] = []
    for steps in item["parameters"]["levels"]:
        graph = from_table(unrolled(item, steps))
        ends = {f"{steps} {v}": 1.0 for _, v, _ in item["edges"]}
        ends = {name: 1.0 for name in ends if name in set(graph.labels.to_pylist())}
        settings = KatzSettings(alpha=1.0, beta=ends, flow="against", tol=1e-13)
        result = measure("katz").rank(graph, settings)
        assert result.stop.accurate
        found += [result.scores[graph.find(f"0 {node}")] for node in item["nodes"]]
    return found


def hits(item: Entry) -> Sequence[float]:
    role = item["measure"].removeprefix("hits_")
    return in_order(item, rank(item, "hits", HitsSettings(role=role, tol=1e-12)))


def keener(item: Entry) -> Sequence[float]:
    """Edges there lead from who scored, here score flows against them."""
    settings = VotesSettings(link="skew", division="games", diagonal=0.5, flow="against", tol=1e-12)
    return in_order(item, rank(item, "votes", settings))


def subgraph(item: Entry) -> Sequence[float]:
    return in_order(item, rank(item, "subgraph", SubgraphSettings(scale="none", tol=1e-12)))


def subgraph_normalised(item: Entry) -> Sequence[float]:
    """Divided by e^lambda_1, lambda_1 as the spectrum has it."""
    top = spectrum(graph_of(item), "eigenvector").values[0].real
    return np.asarray(subgraph(item)) / np.exp(top)


def communicability(item: Entry) -> Sequence[float]:
    settings = CommunicabilitySettings(scale="none", tol=1e-12)
    return in_order(item, rank(item, "communicability", settings))


def communicability_out(item: Entry) -> Sequence[float]:
    settings = CommunicabilitySettings(scale="none", tol=1e-12, flow="against")
    return in_order(item, rank(item, "communicability", settings))


def spectral_radius(item: Entry) -> Sequence[float]:
    low, high = examine(graph_of(item)).radius
    assert high - low <= 1e-9 * high
    return [(low + high) / 2]


def second_thoughts(item: Entry) -> Sequence[float]:
    """Facts about the surfer, Katz and rho; each entry has its own way."""
    return FACTS[item["id"]](item)


def collatz_wielandt(item: Entry) -> Sequence[float]:
    """The bracket of rho is the claim; its middle is compared with the entry's rho."""
    result = rank(item, "eigenvector", EigenvectorSettings(tol=1e-12))
    low, high = result.facts["rho"]
    violations = sum(
        not line.eigenvalue[0] <= item["expected"][1] + 1e-14
        or not item["expected"][1] - 1e-14 <= line.eigenvalue[1]
        for line in result.log
        if line.eigenvalue
    )
    return [float(violations), (low + high) / 2]


def error_bounds(item: Entry) -> Sequence[float]:
    """At every number of sweeps the claimed bound must hold for the L1 error of the iterate."""
    exact = pagerank(entry("fact-ipsen-selee-lumping"))
    violations = 0
    for sweeps in range(1, 40):
        settings = SurferSettings(damping=item["parameters"]["alpha"], max_sweeps=sweeps, tol=1e-14)
        result = measure("surfer").rank(graph_of(item), settings)
        off = np.abs(in_order(entry("fact-ipsen-selee-lumping"), result) - exact).sum()
        violations += not off <= result.bound.value + 1e-13  # what the reference is good for
    return [float(violations)]


def katz_near_limit(item: Entry) -> Sequence[float]:
    settings = KatzSettings(alpha_fraction=1 - 1e-9, tol=1e-6)
    result = measure("katz").rank(graph_of(item), settings)
    assert result.refusal is None
    return scaled(in_order(item, result), "l2")


def katz_near_zero(item: Entry) -> Sequence[float]:
    alpha = 1e-8
    result = rank(item, "katz", KatzSettings(alpha=alpha, tol=5e-15))
    return (in_order(item, result) - 1) / alpha


def second_eigenvalue(item: Entry) -> Sequence[float]:
    """What is certain of it, and what was found, agree."""
    settings = SurferSettings(damping=item["parameters"]["alpha"])
    found = spectrum(graph_of(item), "surfer", settings)
    assert found.second == (settings.damping, settings.damping)
    return [found.values[1].modulus]


def two_by_two(item: Entry) -> Sequence[float]:
    """The matrices of the statement as undirected graphs of two nodes with self-loops."""
    seconds = []
    for same, other in ((0.65, 0.35), (0.85, 0.15)):
        edges = {
            "source": ["a", "a", "b"], "target": ["a", "b", "b"], "weight": [same, other, same]
        }  # fmt: skip
        found = spectrum(from_table(pa.table(edges), directed=False), "eigenvector")
        assert found.values[0].low <= 1.0 <= found.values[0].high
        seconds.append(found.values[1].real)
    return seconds


def pair_of_ranks(item: Entry) -> tuple[Ranks, Ranks]:
    """The entry's two lists of values as rankings."""
    x, y = (np.asarray(item["parameters"][name], dtype=float) for name in ("x", "y"))
    return ranks_from_scores(x), ranks_from_scores(y)


def average_overlap(item: Entry) -> Sequence[float]:
    """Mean of the shares at depths 1..d; an item a list does not hold is beyond every depth."""
    said = item["parameters"]
    names, depth = sorted({*said["a"], *said["b"]}), max(said["depths"])
    places = [
        np.array([said[one].index(n) + 1 if n in said[one] else depth + 1 for n in names])
        for one in ("a", "b")
    ]
    shares = agreement(*places, depth)
    return [float(shares[:d].mean()) for d in said["depths"]]


FACTS: dict[str, Callable[[Entry], Sequence[float]]] = {
    "fact-second-eigenvalue-two-closed-sets": second_eigenvalue,
    "fact-ams-2x2-eigenvalues": two_by_two,
    "fact-collatz-wielandt-karate": collatz_wielandt,
    "fact-ipsen-selee-lumping": pagerank,
    "fact-pagerank-error-bounds": error_bounds,
    "fact-katz-limit-eigenvector": katz_near_limit,
    "fact-katz-limit-degree": katz_near_zero,
}

RUNNERS: dict[str, Callable[[Entry], Sequence[float]]] = {
    "pagerank": pagerank,
    "pagerank_power_iterates": power_iterates,
    "eigenvector": eigenvector,
    "eigenvector_right": eigenvector_right,
    "katz": katz,
    "katz_bonacich": katz_bonacich,
    "katz_bonacich_power": bonacich_power,
    "katz_truncated": katz_truncated,
    "tournament_eigenvector": eigenvector_right,
    "tournament_score_vectors": score_vectors,
    "spectral_radius": spectral_radius,
    "spectral_fact": second_thoughts,
    "hits_authority": hits,
    "hits_hub": hits,
    "keener": keener,
    "subgraph_centrality": subgraph,
    "subgraph_centrality_normalised": subgraph_normalised,
    "total_communicability": communicability,
    "total_communicability_out": communicability_out,
    "kendall_tau_b": lambda item: [tau_b(*pair_of_ranks(item))],
    "spearman": lambda item: [spearman(*pair_of_ranks(item))],
    "average_overlap": average_overlap,
    "rbo_weight_mass": lambda item: [rbo_weight(item["parameters"]["p"], item["parameters"]["d"])],
}

# Kinds of comparison the package does not offer, with what it has in their place.
WITHOUT: dict[str, str] = {
    "kendall_tau_c": "rankings are compared by tau-b; tau-c is for tables of unequal sides",
    "weighted_tau": "the head of a ranking is weighed by rank-biased overlap",
    "friedman_chi2_tie_corrected": "no test of many judges",
    "friedman_chi2_uncorrected": "no test of many judges",
}

WITHOUT_ENTRY: dict[str, str] = {}
