"""The sample graphs show what sample_graphs/README.md says they show.

Every rank here is computed by networkx and scipy, not by this project.  Conventions: score flows
along the edges, weights are strengths, parallel edges are summed; the random surfer follows
networkx.pagerank (damping 0.85, dangling nodes jump uniformly); Katz solves x = 1 + alpha A^T x;
the eigenvector is the Perron vector of A^T.
"""

from __future__ import annotations

import subprocess
import sys
from collections import Counter
from dataclasses import dataclass
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as sl

FOLDER = Path(__file__).resolve().parents[1] / "sample_graphs"


def read(stem: str) -> pa.Table:
    return pq.read_table(FOLDER / f"{stem}.parquet")


@dataclass
class Sample:
    """A sample as scipy sees it: names in ascending order and the summed matrix."""

    names: list[str]
    matrix: sp.csr_array

    @classmethod
    def load(cls, stem: str, source: str, target: str, weight: str | None) -> Sample:
        table = read(stem)
        tails, heads = table[source].to_pylist(), table[target].to_pylist()
        names = sorted({*tails, *heads})
        place = {name: i for i, name in enumerate(names)}
        values = np.ones(table.num_rows) if weight is None else table[weight].to_numpy()
        where = ([place[a] for a in tails], [place[b] for b in heads])
        shape = (len(names), len(names))
        return cls(names, sp.coo_array((values, where), shape=shape).tocsr())

    def graph(self) -> nx.DiGraph:
        return nx.from_scipy_sparse_array(self.matrix, create_using=nx.DiGraph)

    def surfer(self) -> np.ndarray:
        scores = nx.pagerank(self.graph(), alpha=0.85, tol=1e-13, max_iter=2_000)
        return np.array([scores[i] for i in range(len(self.names))])

    def perron(self) -> tuple[float, np.ndarray]:
        start = np.ones(len(self.names))
        values, vectors = sl.eigs(self.matrix.T.tocsr(), k=1, which="LR", v0=start, tol=1e-12)
        return float(values[0].real), np.abs(vectors[:, 0].real)

    def katz(self, alpha: float) -> np.ndarray:
        transposed, x = self.matrix.T.tocsr(), np.ones(len(self.names))
        for _ in range(2_000):
            new = 1.0 + alpha * (transposed @ x)
            done = np.abs(new - x).sum() <= 1e-12 * np.abs(new).sum()
            x = new
            if done:
                return x
        raise AssertionError("the reference did not converge")

    def strength(self) -> np.ndarray:
        return np.asarray(self.matrix.sum(axis=0)).ravel()

    def callers(self) -> np.ndarray:
        return np.diff(self.matrix.tocsc().indptr).astype(float)

    def rank(self, scores: np.ndarray, name: str) -> int:
        """1 + the number of nodes that score clearly more."""
        own = scores[self.names.index(name)]
        return 1 + int((scores > own * (1 + 1e-9)).sum())

    def ranks(self, name: str, *scores: np.ndarray) -> list[int]:
        return [self.rank(each, name) for each in scores]


def harbour(stem: str) -> Sample:
    return Sample.load(stem, "caller", "callee", "calls_per_min")


@pytest.fixture(scope="module")
def ordinary() -> Sample:
    return harbour("harbour_calls")


@pytest.fixture(scope="module")
def failover() -> Sample:
    return harbour("harbour_calls_failover")


@pytest.fixture(scope="module")
def reef() -> Sample:
    return Sample.load("reef_citations", "citing", "cited", None)


@pytest.fixture(scope="module")
def cheese() -> Sample:
    return Sample.load("cheese_tastings", "loser", "winner", "margin")


def test_the_script_writes_the_same_values_again(tmp_path):
    subprocess.run([sys.executable, str(FOLDER / "make.py"), str(tmp_path)], check=True)
    made = sorted(path.name for path in tmp_path.iterdir())
    kept = sorted(path.name for path in FOLDER.glob("*.parquet"))
    assert made == kept
    for name in made:
        assert pq.read_table(tmp_path / name).equals(pq.read_table(FOLDER / name)), name
    assert sum(path.stat().st_size for path in FOLDER.glob("*.parquet")) < 5_000_000


@pytest.mark.parametrize(
    ("stem", "rows", "columns"),
    [
        ("harbour_calls", 6_062, "caller callee calls_per_min error_rate region"),
        ("harbour_calls_failover", 6_148, "caller callee calls_per_min error_rate region"),
        ("harbour_services", 402, "service team tier language"),
        ("reef_citations", 205_022, "citing cited"),
        ("reef_papers", 20_000, "paper year venue topic"),
        ("cheese_tastings", 524, "loser winner margin"),
        ("cheese_list", 60, "cheese valley style milk months"),
    ],
)
def test_shapes(stem, rows, columns):
    table = read(stem)
    assert (table.num_rows, " ".join(table.column_names)) == (rows, columns)
    assert all(column.null_count == 0 for column in table.columns)


def test_harbour_has_parallel_edges_by_region_and_heavy_tailed_weights():
    table = read("harbour_calls")
    pairs = Counter(zip(table["caller"].to_pylist(), table["callee"].to_pylist(), strict=True))
    assert len(pairs) == 3_821
    assert Counter(pairs.values()) == {1: 1_939, 2: 1_529, 3: 347, 4: 6}
    weights = table["calls_per_min"].to_numpy()
    assert weights.min() > 0
    assert weights.max() > 1_000 * np.median(weights)
    errors = table["error_rate"].to_numpy()
    assert errors.min() >= 0
    assert errors.max() < 0.05


def test_harbour_structure(ordinary):
    graph = ordinary.graph()
    assert graph.number_of_nodes() == 399
    strong = sorted((len(c) for c in nx.strongly_connected_components(graph)), reverse=True)
    assert strong[:3] == [275, 2, 1]
    weak = sorted((len(c) for c in nx.weakly_connected_components(graph)), reverse=True)
    assert weak == [392, 5, 2]
    assert sum(degree == 0 for _, degree in graph.out_degree()) == 16
    relay = ordinary.names.index("bell-relay")
    assert graph.out_degree(relay) == 71
    corner = next(c for c in nx.weakly_connected_components(graph) if len(c) == 5)
    assert nx.is_bipartite(graph.subgraph(corner).to_undirected())


def test_harbour_service_list_has_gaps(ordinary, failover):
    listed = set(read("harbour_services")["service"].to_pylist())
    unlisted = {"fog-horn-west", "heron-pier-scanner", "name-finder", "night-tally"}
    assert set(ordinary.names) - listed == unlisted
    assert set(failover.names) - listed == unlisted
    assert listed - set(ordinary.names) - set(failover.names) == {
        "carbon-copy-archive",
        "coupon-press",
        "fax-bridge",
        "paper-ticket-desk",
        "steam-schedule-store",
        "telex-relay",
    }
    assert set(failover.names) - set(ordinary.names) == {"snapshot-replay"}
    assert set(ordinary.names) - set(failover.names) == {"winter-timetable-import"}


def test_harbour_measures_disagree(ordinary):
    rho, eigen = ordinary.perron()
    scores = (
        ordinary.surfer(),
        ordinary.katz(0.85 / rho),
        eigen,
        ordinary.strength(),
        ordinary.callers(),
    )
    assert ordinary.ranks("audit-trail", *scores) == [1, 5, 5, 4, 1]
    assert ordinary.ranks("config-loft", *scores) == [6, 63, 149, 67, 5]
    assert ordinary.ranks("guest-store", *scores) == [8, 1, 12, 2, 109]
    assert ordinary.ranks("tide-gauge-bridge", *scores) == [24, 2, 1, 5, 320]
    assert ordinary.ranks("price-rules", *scores) == [13, 26, 13, 27, 7]
    assert ordinary.ranks("seat-inventory", *scores) == [10, 11, 61, 10, 12]


def test_failover_lifts_the_standby_and_the_umpire(ordinary, failover):
    before, after = ordinary.surfer(), failover.surfer()
    moves = {
        name: ordinary.rank(before, name) - failover.rank(after, name)
        for name in set(ordinary.names) & set(failover.names)
    }
    risen = sorted(moves, key=lambda name: -moves[name])[:3]
    assert risen[:2] == ["seat-inventory-standby", "lease-umpire"]
    assert moves[risen[2]] < 30
    assert min(moves, key=lambda name: moves[name]) == "seat-inventory"
    for name, old, new in (
        ("seat-inventory-standby", 370, 10),
        ("lease-umpire", 324, 11),
        ("seat-inventory", 10, 93),
    ):
        assert (ordinary.rank(before, name), failover.rank(after, name)) == (old, new)


def test_the_umpire_is_held_up_by_the_standby(failover):
    scores, place = failover.surfer(), failover.names.index("lease-umpire")
    into = failover.matrix.tocsc()[:, [place]].tocoo()
    out = np.asarray(failover.matrix.sum(axis=1)).ravel()
    gives = {
        failover.names[row]: 0.85 * scores[row] * value / out[row] / scores[place]
        for row, value in zip(into.row, into.data, strict=True)
    }
    assert set(gives) == {"seat-inventory-standby", "snapshot-replay", "seat-register"}
    assert gives["seat-inventory-standby"] == pytest.approx(0.857, abs=5e-4)
    assert gives["snapshot-replay"] == pytest.approx(0.079, abs=5e-4)


def test_failing_calls_show_in_the_error_rates():
    table = read("harbour_calls_failover")
    callee = np.array(table["callee"].to_pylist())
    errors = table["error_rate"].to_numpy()
    assert errors[callee == "seat-inventory"].min() >= 0.55
    others = ["seat-inventory", "seat-inventory-standby", "lease-umpire", "snapshot-replay"]
    assert errors[~np.isin(callee, others)].max() <= 0.04


def forward() -> tuple[pa.Table, np.ndarray]:
    table, papers = read("reef_citations"), read("reef_papers")
    year = dict(zip(papers["paper"].to_pylist(), papers["year"].to_pylist(), strict=True))
    citing = np.array([year[p] for p in table["citing"].to_pylist()])
    return table, citing < np.array([year[p] for p in table["cited"].to_pylist()])


def test_reef_has_sixty_citations_forward_in_time_and_is_acyclic_without_them(reef):
    table, wrong = forward()
    assert wrong.sum() == 60
    pairs = np.array([table["citing"].to_pylist(), table["cited"].to_pylist()])
    good = nx.DiGraph(zip(*pairs[:, ~wrong].tolist(), strict=True))
    assert nx.is_directed_acyclic_graph(good)
    strong = [len(c) for c in nx.strongly_connected_components(reef.graph())]
    assert sorted(size for size in strong if size > 1) == [5, 79, 233, 337]
    assert reef.matrix.nnz == table.num_rows  # no citation is listed twice


def test_reef_papers_cover_the_citations(reef):
    papers = read("reef_papers")
    year = papers["year"].to_numpy()
    assert (year.min(), year.max()) == (1984, 2023)
    assert len(set(papers["topic"].to_pylist())) == 8
    lists = dict(zip(reef.names, np.diff(reef.matrix.indptr).tolist(), strict=True))
    venues = zip(papers["paper"].to_pylist(), papers["venue"].to_pylist(), strict=True)
    surveys = [lists[paper] for paper, venue in venues if venue == "Reviews of Walking Reefs"]
    assert (len(surveys), min(surveys), max(surveys)) == (36, 60, 96)
    known = set(papers["paper"].to_pylist())
    assert set(reef.names) <= known
    assert len(known) - len(reef.names) == 203


def test_reef_measures_disagree_on_old_papers(reef):
    rho, eigen = reef.perron()
    assert rho == pytest.approx(2.4958, abs=1e-3)
    scores = (reef.surfer(), reef.katz(0.05), reef.katz(0.85 / rho), eigen, reef.strength())
    assert reef.ranks("rk-1989-0012", *scores[:3], scores[4]) == [1, 1, 53, 1]
    quiet = reef.ranks("rk-1985-0007", *scores)
    assert quiet[:3] == [7, 209, 125]
    assert quiet[4] > 5_000
    primer = reef.ranks("rk-1987-0021", *scores)
    assert primer[:3] == [262, 24, 159]
    assert primer[4] > 1_000
    assert reef.ranks("rk-1984-0129", *scores) == [3, 2, 1, 1, 15]


def test_reef_quiet_source_rests_on_one_citation(reef):
    citing = reef.matrix.tocsc()[:, [reef.names.index("rk-1985-0007")]].tocoo().row
    by = sorted(reef.names[i] for i in citing)
    assert by == ["rk-1989-0012", "rk-1990-0006", "rk-1990-0010", "rk-1997-0006", "rk-1997-0010"]
    lists = np.diff(reef.matrix.indptr)
    assert lists[reef.names.index("rk-1989-0012")] == 2


def test_one_misprint_makes_a_paper_famous(reef):
    scores = reef.surfer()
    assert reef.rank(scores, "rk-1987-0144") == 6
    mended = reef.matrix.tolil()
    mended[reef.names.index("rk-1984-0008"), reef.names.index("rk-1987-0144")] = 0
    matrix = mended.tocsr()
    matrix.eliminate_zeros()
    assert reef.rank(Sample(reef.names, matrix).surfer(), "rk-1987-0144") > 1_000


def votes(cheese: Sample) -> np.ndarray:
    """Keener-type rating from numbers of wins, Laplace-smoothed shares, zero diagonal."""
    table = read("cheese_tastings")
    place = {name: i for i, name in enumerate(cheese.names)}
    won = np.zeros((len(place), len(place)))
    for loser, winner in zip(table["loser"].to_pylist(), table["winner"].to_pylist(), strict=True):
        won[place[winner], place[loser]] += 1
    met = (won + won.T) > 0
    share = np.where(met, (won + 1) / (won + won.T + 2), 0)
    values, vectors = np.linalg.eig(share / share.sum(axis=0))
    return np.abs(vectors[:, values.real.argmax()].real)


def test_cheese_measures_disagree(cheese):
    rho, eigen = cheese.perron()
    table = read("cheese_tastings")
    wins = Counter(table["winner"].to_pylist())
    losses = Counter(table["loser"].to_pylist())
    scores = (
        cheese.surfer(),
        cheese.katz(0.85 / rho),
        eigen,
        cheese.strength(),
        np.array([float(wins[name]) for name in cheese.names]),
        votes(cheese),
    )
    assert cheese.ranks("Lantern Fell", *scores) == [1, 1, 1, 10, 20, 6]
    assert cheese.ranks("Parson's Doorstop", *scores) == [8, 10, 16, 1, 1, 2]
    assert cheese.ranks("Nine Acre", *scores) == [4, 8, 12, 2, 2, 1]
    for name, record in (
        ("Lantern Fell", (9, 0)),
        ("Parson's Doorstop", (40, 7)),
        ("Nine Acre", (38, 47)),
        ("Little Orrin", (3, 0)),
        ("Ropewalk", (0, 5)),
    ):
        assert (wins[name], losses[name]) == record


def test_not_every_pair_of_cheeses_meets(cheese):
    met = (cheese.matrix + cheese.matrix.T) > 0
    assert sp.triu(met).nnz == 419  # of 60 * 59 / 2 = 1,770
    strong = [len(c) for c in nx.strongly_connected_components(cheese.graph())]
    assert sorted(strong) == [1, 1, 1, 57]
