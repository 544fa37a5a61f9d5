"""The gallery's graphs have the shape they promise; networkx and scipy are the references."""

from __future__ import annotations

import importlib.util
from pathlib import Path

import networkx as nx
import numpy as np
import pyarrow.parquet as pq
import pytest
import scipy.sparse as sp
from scipy.stats import chi2

from kingpost.core import gallery
from kingpost.core.errors import SettingsError
from kingpost.core.gallery import chance

FIRST = {
    "rmat": [[7, 243, 194], [213, 0, 169]],
    "citation": [[1, 1, 1], [0, 0, 0]],
    "layered": [[1, 69, 3], [37, 81, 18]],
    "powerlaw": [[0, 64, 0], [1, 209, 140]],
    "pairwise": [[24, 13, 124], [17, 133, 39]],
}


def as_networkx(edges: gallery.EdgeList) -> nx.Graph:
    graph = nx.DiGraph() if edges.directed else nx.Graph()
    graph.add_nodes_from(range(edges.n))
    graph.add_edges_from(zip(edges.source.tolist(), edges.target.tolist(), strict=True))
    return graph


def matrix(edges: gallery.EdgeList) -> sp.csr_array:
    ones = np.ones(edges.m)
    return sp.coo_array((ones, (edges.source, edges.target)), shape=(edges.n, edges.n)).tocsr()


def same(one: gallery.EdgeList, other: gallery.EdgeList) -> bool:
    weights = (one.weight is None) == (other.weight is None) and (
        one.weight is None or np.array_equal(one.weight, other.weight)
    )
    return (
        one.n == other.n
        and one.directed == other.directed
        and np.array_equal(one.source, other.source)
        and np.array_equal(one.target, other.target)
        and weights
    )


SHAPES = [
    (gallery.path(7), nx.path_graph(7, nx.DiGraph)),
    (gallery.path(1), nx.empty_graph(1, nx.DiGraph)),
    (gallery.star(6, inward=False), nx.DiGraph([(0, i) for i in range(1, 6)])),
    (gallery.star(6), nx.DiGraph([(i, 0) for i in range(1, 6)])),
    (gallery.cycle(5), nx.cycle_graph(5, nx.DiGraph)),
    (gallery.cycle(1), nx.DiGraph([(0, 0)])),
    (gallery.complete(6), nx.complete_graph(6, nx.DiGraph)),
    (gallery.bipartite(3, 4, both=True), nx.complete_bipartite_graph(3, 4).to_directed()),
    (
        gallery.grid(4, 6),
        nx.relabel_nodes(
            nx.grid_2d_graph(4, 6), {(i, j): 6 * i + j for i in range(4) for j in range(6)}
        ),
    ),
    (
        gallery.two_tied_components(4),
        nx.disjoint_union(nx.complete_graph(4, nx.DiGraph), nx.complete_graph(4, nx.DiGraph)),
    ),
]


@pytest.mark.parametrize(("made", "reference"), SHAPES)
def test_shapes_equal_networkx(made, reference):
    assert made.source.dtype == made.target.dtype == np.int64
    assert made.m == reference.number_of_edges()  # none listed twice
    graph = as_networkx(made)
    assert graph.is_directed() == reference.is_directed()
    assert set(graph) == set(reference)
    assert nx.difference(graph, reference).number_of_edges() == 0


def test_one_way_bipartite_is_acyclic():
    graph = as_networkx(gallery.bipartite(3, 5))
    assert nx.is_directed_acyclic_graph(graph)
    assert [graph.out_degree(i) for i in range(8)] == [5, 5, 5, 0, 0, 0, 0, 0]


def test_clique_chain_has_its_cliques_as_strong_components_in_a_row():
    graph = as_networkx(gallery.clique_chain(4, 3))
    condensed = nx.condensation(graph)
    assert sorted(len(condensed.nodes[c]["members"]) for c in condensed) == [3, 3, 3, 3]
    assert condensed.number_of_edges() == 3
    assert nx.dag_longest_path_length(condensed) == 3


@pytest.mark.parametrize("bridge", [False, True])
def test_tied_components_tie(bridge):
    edges = gallery.two_tied_components(5, bridge=bridge)
    values = np.sort(np.linalg.eigvals(matrix(edges).toarray()).real)
    # rho of a complete graph on k nodes is k - 1.
    assert values[-2:] == pytest.approx([4, 4], abs=1e-6)
    assert nx.number_weakly_connected_components(as_networkx(edges)) == (1 if bridge else 2)


def test_layered_dag():
    edges = gallery.layered_dag(5, 20, 3, seed=4)
    assert nx.is_directed_acyclic_graph(as_networkx(edges))
    assert np.bincount(edges.source, minlength=100).tolist() == [3] * 80 + [0] * 20
    assert set((edges.target // 20 - edges.source // 20).tolist()) == {1}


def test_hub_row_holds_all_but_one_edge():
    edges = gallery.hub(1_000)
    assert np.bincount(edges.target).tolist() == [1_000, 1]
    strong = nx.strongly_connected_components(as_networkx(edges))
    assert max(len(c) for c in strong) == 2


BIG = {
    "rmat": lambda seed: gallery.rmat(12, 70_000, seed=seed),
    "citation": lambda seed: gallery.citation(4_001, 15, 0.01, seed=seed),
    "layered": lambda seed: gallery.layered_services(2_000, 40_000, seed=seed),
    "powerlaw": lambda seed: gallery.powerlaw_undirected(5_000, 50_000, seed=seed),
    "pairwise": lambda seed: gallery.pairwise(40_000, players=300, seed=seed),
}


@pytest.mark.parametrize("kind", sorted(BIG))
def test_big_graphs_depend_on_the_seed_alone(kind):
    assert same(BIG[kind](3), BIG[kind](3))
    assert not same(BIG[kind](3), BIG[kind](4))
    edges = BIG[kind](3)
    assert min(edges.source.min(), edges.target.min()) >= 0
    assert max(edges.source.max(), edges.target.max()) < edges.n


@pytest.mark.parametrize("kind", gallery.KINDS)
@pytest.mark.parametrize("chunk", [1, 977, 32_768, 1 << 20])
def test_streams_hold_the_same_edges_for_any_chunk_size(kind, chunk):
    count = 300 if chunk == 1 else 70_001
    whole = gallery.recipe(kind, count, seed=9).whole()
    assert whole.m == count
    parts = list(gallery.stream(kind, count, 9, chunk))
    assert [part.m for part in parts[:-1]] == [chunk] * (len(parts) - 1)
    joined = gallery.EdgeList(
        parts[0].n,
        np.concatenate([part.source for part in parts]),
        np.concatenate([part.target for part in parts]),
        None if whole.weight is None else np.concatenate([part.weight for part in parts]),
        parts[0].directed,
    )
    assert same(joined, whole)


def test_known_edges_stay_the_same_for_ever():
    # The first edges of every kind as first published; a change here changes every bench graph.
    first = {
        kind: [
            gallery.recipe(kind, 3_000, seed=1).part(0, 3).source.tolist(),
            gallery.recipe(kind, 3_000, seed=1).part(0, 3).target.tolist(),
        ]
        for kind in gallery.KINDS
    }
    assert first == FIRST


def test_the_hash_is_splitmix64():
    # splitmix64 of seed 0 yields 0xE220A8397B1DCDAF first: the finalizer applied to golden
    # (test vector from memory; java.util.SplittableRandom has the same).  Subtracting the key of
    # lane 0 from the counter times golden leaves the plain generator.
    inverse = pow(chance._GOLDEN, -1, 1 << 64)
    counter = (1 - chance._key(0, 0) * inverse) % (1 << 64)
    drawn = chance.bits(0, 0, np.array([counter], np.uint64))
    assert int(drawn[0]) == 0xE220A8397B1DCDAF


def test_uniform_numbers_are_uniform():
    counts = np.bincount(
        (chance.uniform(5, 2, np.arange(200_000, dtype=np.uint64)) * 100).astype(int)
    )
    statistic = ((counts - 2_000) ** 2 / 2_000).sum()
    assert statistic < chi2.ppf(0.999, 99)


@pytest.mark.parametrize("scale", [1, 2, 5, 12])
def test_scrambling_is_one_to_one(scale):
    ids = np.arange(1 << scale, dtype=np.uint64)
    assert np.array_equal(np.sort(chance.scramble(ids, scale)), ids)


def test_rmat_fills_the_quadrants_as_published():
    edges = gallery.rmat(12, 70_000, seed=3)
    ids = chance.scramble(np.arange(4_096, dtype=np.uint64), 12).astype(np.int64)
    back = np.argsort(ids)
    source, target = back[edges.source], back[edges.target]
    for level in (0, 1, 6, 11):
        quadrant = 2 * (source >> level & 1) + (target >> level & 1)
        share = np.bincount(quadrant, minlength=4) / edges.m
        assert share == pytest.approx([0.57, 0.19, 0.19, 0.05], abs=0.01)
    # The first node's expected out-degree is edges * 0.76^scale (rows: a + b at each level).
    assert np.bincount(source)[0] == pytest.approx(70_000 * 0.76**12, rel=0.1)


def test_citations_without_errors_are_acyclic_and_backward():
    edges = gallery.citation(4_001, 15, seed=2)
    assert edges.m == 4_000 * 15
    assert np.all(edges.target < edges.source)
    assert np.all(np.diff(edges.source) >= 0)
    assert nx.is_directed_acyclic_graph(as_networkx(edges))
    lists = np.bincount(edges.source, minlength=4_001)
    assert lists[0] == 0
    assert lists.max() <= 30
    assert np.all(lists[1::2] + lists[2::2] == 30)


def test_copied_citations_come_from_an_earlier_list():
    # With everything copied, a paper's references are its prototypes' references; from the
    # definition, every target is then a target already or a paper that cites nothing.
    edges = gallery.citation(2_001, 3, seed=5, copied=1.0)
    lists = np.bincount(edges.source, minlength=2_001)
    seen: set[int] = set()
    for target in edges.target.tolist():
        assert target in seen or lists[target] == 0
        seen.add(target)


def test_copying_makes_a_heavier_tail_than_uniform_choice():
    copied = np.bincount(gallery.citation(20_001, 15, seed=1).target)
    plain = np.bincount(gallery.citation(20_001, 15, seed=1, copied=0.0).target)
    assert copied.max() > 5 * plain.max()
    # Uniform choice: paper t is cited by later ones 15 * (H_n - H_t) times in the mean.
    harmonic = np.cumsum(1 / np.arange(1, 20_001))
    expected = 15 * (harmonic[-1] - harmonic[99:199].mean())
    assert plain[100:200].mean() == pytest.approx(expected, rel=0.05)


def test_citation_errors_point_forward_in_the_share_asked_for():
    edges = gallery.citation(20_001, 15, 0.01, seed=2)
    clean = gallery.citation(20_001, 15, seed=2)
    forward = edges.target > edges.source
    assert forward.mean() == pytest.approx(0.01, abs=0.001)
    assert np.array_equal(edges.target[~forward], clean.target[~forward])
    components, labels = sp.csgraph.connected_components(matrix(edges), connection="strong")
    assert components < edges.n
    assert np.bincount(labels).max() > 1_000


def test_layered_services_without_calls_back_go_down_only():
    edges = gallery.layered_services(4_000, 60_000, layers=8, back=0.0, seed=1)
    step = edges.target // 500 - edges.source // 500
    assert set(step.tolist()) == {1, 2}
    assert nx.is_directed_acyclic_graph(as_networkx(edges))
    assert edges.weight is not None
    assert edges.weight.min() >= 1
    # Pareto: the median is 2^(1 / exponent).
    assert np.median(edges.weight) == pytest.approx(2 ** (1 / 1.2), rel=0.02)


def test_layered_services_with_calls_back_have_a_large_strong_component():
    edges = gallery.layered_services(4_000, 80_000, back=0.02, seed=1)
    _, labels = sp.csgraph.connected_components(matrix(edges), connection="strong")
    assert np.bincount(labels).max() > 400
    assert (edges.target < edges.source).mean() == pytest.approx(0.02, abs=0.005)


def test_powerlaw_degrees_follow_their_expectation():
    edges = gallery.powerlaw_undirected(20_000, 200_000, gamma=2.5, seed=7)
    assert np.all(edges.source < edges.target)
    degrees = np.bincount(edges.source, minlength=20_000) + np.bincount(
        edges.target, minlength=20_000
    )
    # Place i holds the mass of the density x^(-2/3) between i + 1 and i + 2.
    bounds = np.arange(1, 20_002) ** (1 / 3)
    expected = 400_000 * np.diff(bounds) / (bounds[-1] - 1)
    assert degrees[:50].sum() == pytest.approx(expected[:50].sum(), rel=0.03)
    assert degrees[10_000:].sum() == pytest.approx(expected[10_000:].sum(), rel=0.03)


def test_pairwise_winners_are_the_strong_ones():
    edges = gallery.pairwise(40_000, players=100, seed=3)
    assert np.all(edges.source != edges.target)
    assert edges.weight is not None
    assert edges.weight.min() >= 1
    won = np.bincount(edges.target, minlength=100)
    share = won / (won + np.bincount(edges.source, minlength=100))
    # Two halves of the contests agree on who is strong only if strength decides.
    half = edges.m // 2
    first = np.bincount(edges.target[:half], minlength=100)
    second = np.bincount(edges.target[half:], minlength=100)
    assert np.corrcoef(first, second)[0, 1] > 0.9
    assert share.max() > 0.8
    assert share.min() < 0.2


def test_distinct_drops_repeats_and_loops():
    edges = gallery.EdgeList(
        3, np.array([2, 0, 0, 1, 1]), np.array([1, 0, 1, 1, 2]), np.array([5.0, 1, 2, 3, 4])
    )
    assert edges.distinct().m == 5
    plain = edges.distinct(loops=False)
    assert list(zip(plain.source, plain.target, strict=True)) == [(0, 1), (1, 2), (2, 1)]
    assert plain.weight.tolist() == [2, 4, 5]
    undirected = gallery.EdgeList(edges.n, edges.source, edges.target, None, directed=False)
    assert undirected.distinct(loops=False).m == 2


def test_shuffling_keeps_the_graph_up_to_names():
    edges = gallery.grid(4, 5)
    other = edges.shuffled(3)
    assert not same(edges, other)
    assert nx.is_isomorphic(as_networkx(edges), as_networkx(other))


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: gallery.path(0), "n must be at least 1"),
        (lambda: gallery.recipe("torus", 10), "no graph of kind 'torus'"),
        (lambda: gallery.recipe("rmat", 10, nodes=1_000), "power of two"),
        (lambda: gallery.recipe("citation", 10, nodes=1_000), "follow from its edges"),
        (lambda: gallery.recipe("powerlaw", 10, errors=0.1), "belong to citation"),
        (lambda: gallery.recipe("layered", 0), "number of edges must be at least 1"),
        (lambda: gallery.citation(10, 2, 1.5), "share of errors must be at least 0 and at most 1"),
        (lambda: gallery.powerlaw_undirected(10, 5, gamma=1.5), "gamma must be at least"),
        (lambda: next(gallery.stream("rmat", 10, chunk=0)), "chunk must hold at least 1"),
    ],
)
def test_sizes_out_of_range_are_refused_in_words(call, words):
    with pytest.raises(SettingsError, match=words):
        call()


def bench_script():
    place = Path(__file__).resolve().parents[1] / "bench" / "graphs.py"
    spec = importlib.util.spec_from_file_location("bench_graphs", place)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_bench_script_writes_what_the_gallery_makes(tmp_path, monkeypatch):
    script = bench_script()
    monkeypatch.setattr(script, "GROUP", 1_000)
    for kind in ("layered", "citation"):
        graph = gallery.recipe(kind, 4_500, seed=6)
        script.write(tmp_path / f"{kind}.parquet", graph)
        read, whole = pq.read_table(tmp_path / f"{kind}.parquet"), graph.whole()
        assert np.array_equal(read["source"].to_numpy(), whole.source)
        assert np.array_equal(read["target"].to_numpy(), whole.target)
        if whole.weight is not None:
            assert np.array_equal(read["weight"].to_numpy(), whole.weight)
    assert [path.suffix for path in tmp_path.iterdir()] == [".parquet"] * 2


def test_text_ids_are_distinct_and_25_characters_long(tmp_path):
    script = bench_script()
    names = script.text_ids(5_000)
    assert len(set(names.to_pylist())) == 5_000
    assert {len(name) for name in names.to_pylist()} == {25}
    graph = gallery.recipe("rmat", 3_000, seed=6)
    script.write(tmp_path / "text.parquet", graph, script.text_ids(graph.n))
    read = pq.read_table(tmp_path / "text.parquet")["source"].to_pylist()
    places = {name: i for i, name in enumerate(script.text_ids(graph.n).to_pylist())}
    assert [places[name] for name in read] == graph.whole().source.tolist()
