"""Scores of one small graph by other libraries under their own defaults, as a test fixture.

``python tests/bench/foreign.py`` writes ``tests/core/insight/foreign.json`` again: the edges, the
versions and the scores.  The tests read that file, so they need none of the libraries.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import igraph
import networkit
import networkx
import numpy as np
import sknetwork
from scipy import sparse
from sknetwork import ranking

TARGET = Path(__file__).parents[1] / "core" / "insight" / "foreign.json"
N = 60


def edges() -> list[tuple[int, int, float]]:
    """Weighted rows without repeats: one large strong component, dangling nodes, loops."""
    rng = np.random.default_rng(20)
    found: dict[tuple[int, int], float] = {(i, (i + 1) % 50): 1.0 for i in range(50)}
    while len(found) < 420:
        u, v = int(rng.integers(50)), int(N * rng.random() ** 2)
        if u != v:
            found[u, v] = round(float(rng.gamma(1.0, 4.0)) + 0.5, 1)
    for v in range(50, N):  # fed, and feeding nobody
        found[int(rng.integers(50)), v] = 2.0
    for u in (3, 7, 20):
        found[u, u] = 5.0
    return [(u, v, w) for (u, v), w in sorted(found.items())]


def of_networkx(rows: list[tuple[int, int, float]]) -> dict[str, Any]:
    graph = networkx.DiGraph()
    graph.add_nodes_from(range(N))
    graph.add_weighted_edges_from(rows)
    hubs, authorities = networkx.hits(graph)
    plain = graph.to_undirected()
    found = {
        "pagerank": networkx.pagerank(graph),
        "eigenvector_centrality": networkx.eigenvector_centrality(graph, max_iter=1000),
        "katz_centrality alpha=0.05": networkx.katz_centrality(graph, alpha=0.05, max_iter=5000),
        "hits hubs": hubs,
        "hits authorities": authorities,
        "in_degree_centrality": networkx.in_degree_centrality(graph),
        "degree_centrality": networkx.degree_centrality(graph),
        "pagerank undirected": networkx.pagerank(plain),
    }
    return {name: [float(scores[i]) for i in range(N)] for name, scores in found.items()}


def of_igraph(rows: list[tuple[int, int, float]]) -> dict[str, Any]:
    graph = igraph.Graph(n=N, edges=[row[:2] for row in rows], directed=True)
    graph.es["weight"] = [row[2] for row in rows]
    return {
        "pagerank": graph.pagerank(),
        "pagerank weighted": graph.pagerank(weights="weight"),
        "pagerank undirected": graph.pagerank(directed=False),
        "eigenvector_centrality": graph.eigenvector_centrality(),
        "hub_score": graph.hub_score(),
        "authority_score": graph.authority_score(),
        "strength in": graph.strength(mode="in", weights="weight"),
    }


def of_networkit(rows: list[tuple[int, int, float]]) -> dict[str, Any]:
    graph = networkit.Graph(N, weighted=True, directed=True)
    for u, v, w in rows:
        graph.addEdge(u, v, w)
    bare = networkit.Graph(N, weighted=False, directed=True)
    for u, v, _ in rows:
        bare.addEdge(u, v)
    centrality = networkit.centrality
    runs = {
        "PageRank": centrality.PageRank(graph),
        "PageRank unweighted": centrality.PageRank(bare),
        "EigenvectorCentrality": centrality.EigenvectorCentrality(graph),
        "EigenvectorCentrality unweighted": centrality.EigenvectorCentrality(bare),
        "KatzCentrality unweighted": centrality.KatzCentrality(bare),
    }
    return {name: [float(x) for x in run.run().scores()] for name, run in runs.items()}


def of_sknetwork(rows: list[tuple[int, int, float]]) -> dict[str, Any]:
    source, target, weight = zip(*rows, strict=True)
    matrix = sparse.csr_matrix((weight, (source, target)), shape=(N, N))
    hits = ranking.HITS().fit(matrix)
    found = {
        "PageRank": ranking.PageRank().fit_predict(matrix),
        "Katz": ranking.Katz().fit_predict(matrix),
        "HITS row": hits.scores_row_,
        "HITS col": hits.scores_col_,
    }
    return {name: [float(x) for x in scores] for name, scores in found.items()}


def main() -> None:
    rows = edges()
    held = {
        "made by": "tests/bench/foreign.py",
        "edges": rows,
        "scores": {
            f"networkx {networkx.__version__}": of_networkx(rows),
            f"igraph {igraph.__version__}": of_igraph(rows),
            f"networkit {networkit.__version__}": of_networkit(rows),
            f"scikit-network {sknetwork.__version__}": of_sknetwork(rows),
        },
    }
    TARGET.write_text(json.dumps(held, separators=(",", ":")) + "\n")


if __name__ == "__main__":
    main()
