"""Every contestant of the bench behind one interface: load, solve at a setting, scores.

Settings are places on a dial: tolerances in quarter decades (place k is 10^(-k/4)) or numbers
of iterations.  What is timed is ``solve`` alone; turning answers into arrays is not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from clean import Edges, Floats, Spec, read
from truth import DAMPING, pull_matrix, walk_matrix

THREADS = 2
SLOW_LOOPS = 2_000_000  # edges beyond which loops in Python take minutes and gigabytes
SMALL = 200_000


@dataclass(frozen=True)
class Dial:
    """The settings a contestant can be run at, from loose to tight."""

    kind: str  # "tol", "iterations" or "none"
    first: int = 0
    last: int = 0
    start: int = 0

    def value(self, place: int) -> float | int:
        """The setting at a place of the dial."""
        return 10.0 ** (-place / 4) if self.kind == "tol" else place

    def words(self, place: int) -> str:
        """A setting in words."""
        if self.kind == "none":
            return "as it is"
        return f"tol {self.value(place):.1e}" if self.kind == "tol" else f"{place} iterations"


TOL = Dial("tol", 8, 72, 36)
COUNT = Dial("iterations", 2, 4000, 40)
FIXED = Dial("none")


class Contestant:
    """One library, or one solver of it."""

    name = ""
    needs = ""
    measures: ClassVar[tuple[str, ...]] = ("surfer", "katz", "eigenvector")
    why_not: ClassVar[str] = "has no such measure"
    dial = TOL

    def skip(self, spec: Spec, measure: str) -> str | None:
        """Why it is not run, or None."""
        if measure not in self.measures:
            return self.why_not
        if measure == "eigenvector" and spec.acyclic:
            return "an acyclic graph has no eigenvector centrality"
        return None

    def load(self, spec: Spec, measure: str, facts: dict[str, Any]) -> None:
        """From the Parquet file to its own graph."""
        self.measure, self.facts = measure, facts
        self.build(read(spec.path, spec.n, spec.directed))

    def build(self, edges: Edges) -> None:
        """From arrays in memory to its own graph."""
        raise NotImplementedError

    def solve(self, value: float | int) -> Any:
        """Run at a setting; what comes back is understood by the other methods."""
        raise NotImplementedError

    def scores(self, answer: Any) -> Floats:
        """Scores by node, in any scaling."""
        return np.asarray(answer, dtype=np.float64)

    def effort(self, answer: Any) -> dict[str, Any]:
        """What is known about the work: sweeps, edge visits by edge, a bound."""
        return {}


class Kingpost(Contestant):
    """This package, to the loosest tolerance that gives the wanted true error."""

    name = "kingpost"
    needs = "kingpost.core"
    options: ClassVar[dict[str, Any]] = {}

    def load(self, spec: Spec, measure: str, facts: dict[str, Any]) -> None:
        """Load, find the structure, lay the rows out; all are stated."""
        import time

        from kingpost.core.ingest import load
        from kingpost.core.layout import layout
        from kingpost.core.watch import Watch

        self.measure, self.facts = measure, facts
        began = time.perf_counter()
        self.graph = load(spec.path, directed=spec.directed)
        loaded = time.perf_counter()
        assert self.graph.structure is not None
        structured = time.perf_counter()
        layout(self.graph.structure, self.graph.inward, Watch(threads=THREADS))
        self.parts = {
            "load": loaded - began,
            "structure": structured - loaded,
            "layout": time.perf_counter() - structured,
        }

    def solve(self, value: float | int) -> Any:
        """A Result, structure known."""
        from kingpost.core.measures import measure

        chosen = measure(self.measure)
        extra = {"alpha": self.facts["alpha"]} if self.measure == "katz" else {}
        if self.measure == "eigenvector":
            extra = self.options
        if self.measure == "surfer":
            extra = {"damping": DAMPING}
        return chosen.rank(self.graph, chosen.settings(tol=value, **extra))

    def scores(self, answer: Any) -> Floats:
        """Scores as they are."""
        return np.asarray(answer.scores)

    def effort(self, answer: Any) -> dict[str, Any]:
        """Everything the Result tells."""
        return {
            "sweeps": answer.sweeps,
            "visits": answer.edge_visits / max(self.graph.stored, 1),
            "bound": answer.bound.value,
            "stop": answer.stop.value,
        }


class KingpostProven(Kingpost):
    """This package asked to prove an error of 1e-9, whatever the true error is by then."""

    name = "kingpost, 1e-9 proven"
    dial = Dial("tol", 36, 36, 36)


class KingpostBracket(Kingpost):
    """Eigenvector without bounds of the scores: the eigenvalue's bracket alone."""

    name = "kingpost, bracket only"
    measures = ("eigenvector",)
    why_not = ""
    options: ClassVar[dict[str, Any]] = {"certificate": "bracket"}


class Networkx(Contestant):
    """networkx: dictionaries and loops in Python (PageRank through scipy)."""

    name = needs = "networkx"

    def skip(self, spec: Spec, measure: str) -> str | None:
        """Not beyond a few million edges."""
        if spec.m > SLOW_LOOPS:
            return f"{spec.m:,} edges as dictionaries: not run beyond {SLOW_LOOPS:,}"
        return super().skip(spec, measure)

    def build(self, edges: Edges) -> None:
        """A DiGraph or Graph."""
        import networkx as nx

        self.graph = nx.DiGraph() if edges.directed else nx.Graph()
        self.graph.add_nodes_from(range(edges.n))
        ends = edges.source.tolist(), edges.target.tolist()
        if edges.weight is None:
            self.graph.add_edges_from(zip(*ends, strict=True))
        else:
            self.graph.add_weighted_edges_from(zip(*ends, edges.weight.tolist(), strict=True))

    def solve(self, value: float | int) -> Any:
        """Its tolerances are multiplied by n inside."""
        import networkx as nx

        limit = {"max_iter": 100_000, "tol": value / len(self.graph)}
        if self.measure == "surfer":
            return nx.pagerank(self.graph, alpha=DAMPING, **limit)
        if self.measure == "katz":
            return nx.katz_centrality(
                self.graph, alpha=self.facts["alpha"], weight="weight", **limit
            )
        return nx.eigenvector_centrality(self.graph, weight="weight", **limit)

    def scores(self, answer: Any) -> Floats:
        """Values in the order of nodes."""
        return np.array([answer[node] for node in range(len(answer))])


class Igraph(Contestant):
    """igraph: PRPACK, which has no tolerance, and ARPACK."""

    name = needs = "igraph"
    measures = ("surfer", "eigenvector")
    why_not = "its Python interface offers no alpha centrality"

    def build(self, edges: Edges) -> None:
        """A Graph; weights as an attribute."""
        import igraph

        pairs = np.column_stack([edges.source, edges.target])
        self.graph = igraph.Graph(n=edges.n, edges=pairs, directed=edges.directed)
        self.weights = None
        if edges.weight is not None:
            self.graph.es["weight"] = edges.weight.tolist()
            self.weights = "weight"
        self.dial = FIXED if self.measure == "surfer" else Dial("tol", 8, 60, 36)

    def solve(self, value: float | int) -> Any:
        """A list of scores."""
        import igraph

        if self.measure == "surfer":
            return self.graph.pagerank(damping=DAMPING, weights=self.weights)
        options = igraph.ARPACKOptions()
        options.tol = value
        options.maxiter = 10_000
        return self.graph.eigenvector_centrality(weights=self.weights, arpack_options=options)


class Networkit(Contestant):
    """NetworKit on two threads."""

    name, needs = "NetworKit", "networkit"

    def build(self, edges: Edges) -> None:
        """A Graph from coordinates."""
        import networkit as nk

        nk.setNumberOfThreads(THREADS)
        ends = (edges.source, edges.target)
        weighted = edges.weight is not None
        data = (edges.weight, ends) if weighted else ends
        if self.measure == "katz":
            rows, _, weights = edges.both_ways()
            self.strength = np.bincount(rows, weights, edges.n)
        self.graph = nk.GraphFromCoo(data, n=edges.n, weighted=weighted, directed=edges.directed)

    def solve(self, value: float | int) -> Any:
        """The object that was run."""
        import networkit as nk

        if self.measure == "surfer":
            # Mass of sinks leaks: the same scores once scaled, and less work.
            run = nk.centrality.PageRank(self.graph, damp=DAMPING, tol=value)
            run.norm = nk.centrality.Norm.L1_NORM
            run.maxIterations = 100_000
        elif self.measure == "katz":
            run = nk.centrality.KatzCentrality(self.graph, self.facts["alpha"], 1.0, value)
        else:
            run = nk.centrality.EigenvectorCentrality(self.graph, value)
        run.run()
        return run

    def scores(self, answer: Any) -> Floats:
        """Scores by node."""
        scores = np.array(answer.scores())
        if self.measure != "katz":
            return scores
        # It gives s (2 x - 1): its right-hand side is 1 + alpha A^T 1.  The sum of that equation
        # over all nodes tells s.  (Found by comparison with dense solutions; no source.)
        alpha = self.facts["alpha"]
        s = float((scores * (1.0 - alpha * self.strength)).sum())
        s /= len(scores) + alpha * float(self.strength.sum())
        return (scores / s + 1.0) / 2.0

    def effort(self, answer: Any) -> dict[str, Any]:
        """Iterations, where it tells."""
        if self.measure != "surfer":
            return {}
        sweeps = answer.numberOfIterations()
        return {"sweeps": sweeps, "visits": sweeps}


class Sknetwork(Contestant):
    """scikit-network; one class for each solver it offers."""

    needs = "sknetwork"
    measures = ("surfer",)
    why_not = ""
    solver = "piteration"

    def build(self, edges: Edges) -> None:
        """A CSR matrix."""
        from scipy.sparse import csr_matrix

        source, target, weight = edges.both_ways()
        self.graph = csr_matrix((weight, (source, target)), shape=(edges.n, edges.n))

    def solve(self, value: float | int) -> Any:
        """Scores."""
        from sknetwork.ranking import PageRank

        given: dict[str, Any] = {"n_iter": value, "tol": 0.0}
        if self.dial.kind == "tol":
            given = {"n_iter": 300, "tol": value}
        return PageRank(DAMPING, self.solver, **given).fit_predict(self.graph)

    def effort(self, answer: Any) -> dict[str, Any]:
        """Nothing is told."""
        return {}


class SknetworkPower(Sknetwork):
    """Power iteration by scipy products."""

    name = "scikit-network, piteration"
    dial = COUNT

    def effort(self, answer: Any) -> dict[str, Any]:
        """As many as it was told to do."""
        return {"sweeps": self.at, "visits": self.at}


class SknetworkHorner(SknetworkPower):
    """A polynomial in the walk's matrix by Horner's rule."""

    name, solver = "scikit-network, RH", "RH"


class SknetworkBicgstab(Sknetwork):
    """scipy's BiCGSTAB."""

    name, solver = "scikit-network, bicgstab", "bicgstab"


class SknetworkLanczos(Sknetwork):
    """ARPACK on the walk's matrix."""

    name, solver = "scikit-network, lanczos", "lanczos"


class SknetworkDiffusion(Sknetwork):
    """D-iteration, in single precision."""

    name, solver = "scikit-network, diteration", "diteration"
    dial = Dial("tol", 24, 24, 24)

    def skip(self, spec: Spec, measure: str) -> str | None:
        """Only on small graphs, to show what it reaches."""
        if measure == "surfer" and spec.m > SMALL:
            return "works in single precision, whose rounding alone is 3e-8"
        return super().skip(spec, measure)


class SknetworkPush(SknetworkDiffusion):
    """Residual push, in single precision."""

    name, solver = "scikit-network, push", "push"


class SknetworkKatz(Sknetwork):
    """Katz by a polynomial of given length; beta is not in its scores, and weights are ignored."""

    name = "scikit-network, Katz"
    measures = ("katz",)
    why_not = ""
    dial = COUNT

    def skip(self, spec: Spec, measure: str) -> str | None:
        """Not where weights matter."""
        if measure == "katz" and spec.weighted:
            return "it ignores weights"
        return super().skip(spec, measure)

    def solve(self, value: float | int) -> Any:
        """Sums over walks of 1 to ``value`` steps."""
        from sknetwork.ranking import Katz

        return Katz(self.facts["alpha"], int(value)).fit_predict(self.graph)

    def scores(self, answer: Any) -> Floats:
        """With the walks of no step added."""
        return np.asarray(answer) + 1.0

    def effort(self, answer: Any) -> dict[str, Any]:
        """As many as it was told to do."""
        return {"sweeps": self.at, "visits": self.at}


class ScipyLoop(Contestant):
    """What one would write in ten lines: a loop over ``matrix @ x``, float64, one thread."""

    name, needs = "scipy loop", "scipy"
    dial = COUNT

    def build(self, edges: Edges) -> None:
        """The transposed matrix, scaled for the measure."""
        if self.measure == "surfer":
            self.matrix = walk_matrix(edges)
        else:
            self.matrix = pull_matrix(edges)
            if self.measure == "katz":
                self.matrix = self.matrix * self.facts["alpha"]

    def solve(self, value: float | int) -> Any:
        """``value`` steps from a uniform start."""
        n = self.matrix.shape[0]
        if self.measure == "surfer":
            x = np.full(n, 1.0 / n)
            for _ in range(int(value)):
                x = self.matrix @ x
                x += (1.0 - x.sum()) / n
        elif self.measure == "katz":
            x = np.ones(n)
            for _ in range(int(value)):
                x = self.matrix @ x
                x += 1.0
        else:
            x = np.full(n, 1.0 / n)
            for _ in range(int(value)):
                x = self.matrix @ x
                x /= x.sum()
        return x

    def effort(self, answer: Any) -> dict[str, Any]:
        """As many as it was told to do."""
        return {"sweeps": self.at, "visits": self.at}


class ScipyKrylov(Contestant):
    """ARPACK through scipy: ``eigs``, or ``eigsh`` where the graph is undirected."""

    name, needs = "scipy eigs", "scipy"
    measures = ("eigenvector",)
    why_not = ""
    dial = Dial("tol", 8, 60, 36)

    def build(self, edges: Edges) -> None:
        """The transposed matrix."""
        self.directed = edges.directed
        self.matrix = pull_matrix(edges)

    def solve(self, value: float | int) -> Any:
        """The leading vector."""
        from scipy.sparse.linalg import LinearOperator, eigs, eigsh

        self.products = 0

        def product(x: Floats) -> Floats:
            self.products += 1
            return np.asarray(self.matrix @ x)

        counted = LinearOperator(self.matrix.shape, matvec=product, dtype=np.float64)
        solver, which = (eigs, "LR") if self.directed else (eigsh, "LA")
        _, vectors = solver(
            counted, k=1, which=which, v0=np.ones(self.matrix.shape[0]), tol=value, maxiter=10_000
        )
        return vectors[:, 0].real

    def effort(self, answer: Any) -> dict[str, Any]:
        """Products with the matrix."""
        return {"sweeps": self.products, "visits": self.products}


ALL: tuple[type[Contestant], ...] = (
    Kingpost,
    KingpostBracket,
    KingpostProven,
    Networkx,
    Igraph,
    Networkit,
    SknetworkPower,
    SknetworkHorner,
    SknetworkBicgstab,
    SknetworkLanczos,
    SknetworkDiffusion,
    SknetworkPush,
    SknetworkKatz,
    ScipyLoop,
    ScipyKrylov,
)


def contestant(name: str) -> Contestant:
    """A new contestant by its name."""
    return next(kind for kind in ALL if kind.name == name)()
