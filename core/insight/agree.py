"""How far measures agree on one graph, and the nodes on which they disagree most."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from kingpost.core.errors import SettingsError
from kingpost.core.graph import Floats, Graph
from kingpost.core.insight.ranks import (
    Ranks,
    check_p,
    rank_biased_overlap,
    ranks_of,
    rbo_weight,
    spearman,
    tau_b,
    top_overlap,
)
from kingpost.core.insight.reasons import Reason, age_column, explain
from kingpost.core.parallel import each
from kingpost.core.result import Result
from kingpost.core.watch import Watch

P = 0.98  # half of the weight of rank-biased overlap on the first 16 ranks
TOP = 100
APART = 10


@dataclass(frozen=True, slots=True)
class Pair:
    """Agreement of two measures: tau-b and Spearman over all nodes (-1 to 1, NaN where one
    measure ties them all), rank-biased overlap and overlap of the first K (0 to 1)."""

    a: str
    b: str
    tau_b: float
    spearman: float
    rbo: float
    top: float


@dataclass(frozen=True, slots=True)
class Apart:
    """A node that two measures place far apart.

    ``high`` places it first, ``low`` last; ``factor`` is the quotient of the two mean ranks;
    ``ranks`` holds the ranks it may truly have, by measure.
    """

    node: int
    high: str
    low: str
    factor: float
    ranks: Mapping[str, tuple[int, int]]
    reasons: tuple[Reason, ...]


@dataclass(frozen=True)
class Agreement:
    """What :func:`agree` found.

    Attributes:
        names: the measures compared, in the order given.
        refused: measures without an answer on this graph, with the reason.
        pairs: every two of ``names``.
        p, head_weight: parameter of rank-biased overlap, and how much of its weight lies on
            the first ``top`` ranks.
        top: K of the overlap of the first K.
        apart: the nodes placed furthest apart, furthest first.
        ranks: the ranking of every measure, ties as classes; for a rank-rank scatter.
    """

    names: tuple[str, ...]
    refused: Mapping[str, str]
    pairs: tuple[Pair, ...]
    p: float
    head_weight: float
    top: int
    apart: tuple[Apart, ...]
    ranks: Mapping[str, Ranks]

    def scatter(self, a: str, b: str, bins: int = 48) -> tuple[Floats, Floats]:
        """Counts of nodes by log rank in ``a`` (rows) and ``b`` (columns), and the bins' edges.

        Shapes (bins, bins) and (bins + 1,); rank 1 is in row and column 0.
        """
        x, y = self.ranks[a].mean, self.ranks[b].mean
        edges = np.geomspace(1.0, max(len(x), 2), bins + 1)
        edges[0], edges[-1] = 0.5, max(len(x), 2) + 0.5
        return np.histogram2d(x, y, bins=(edges, edges))[0], edges


def agree(
    graph: Graph,
    results: Mapping[str, Result],
    *,
    p: float = P,
    top: int = TOP,
    apart: int = APART,
    age: str | None = None,
    watch: Watch | None = None,
) -> Agreement:
    """Compare the rankings of several results on one graph.

    Args:
        results: by any names; those that were refused are set aside.
        p: rank-biased overlap's chance of reading on after each rank, in (0, 1).
        top: K for the overlap of the first K.
        apart: how many nodes the measures disagree on most are wanted, with reasons.
        age: node attribute that tells age; found by its name where None.

    Disagreement is the quotient of the worst and the best mean rank a node has: being 1st and
    100th counts as much as 10th and 1,000th.

    Raises:
        SettingsError: for fewer than two answers, a p outside (0, 1), an unusable ``age``.
    """
    watch = watch or Watch()
    check_p(p)
    age = age_column(graph, age)
    refused = {name: r.refusal.sentence for name, r in results.items() if r.refusal is not None}
    kept = {name: result for name, result in results.items() if name not in refused}
    if len(kept) < 2:
        why = "".join(f"; {name}: {reason}" for name, reason in refused.items())
        raise SettingsError(f"agreement takes two measures with an answer on this graph{why}")
    names = tuple(kept)
    ranks = {}
    for done, (name, result) in enumerate(kept.items()):
        watch.check()
        watch.report("ranking", done, len(kept), "measures")
        ranks[name] = ranks_of(result)
    couples = list(combinations(names, 2))
    for name in names:  # computed once, before threads ask for them at the same time
        _ = ranks[name].mean, ranks[name].first, ranks[name].tied_pairs

    def compare(couple: tuple[str, str]) -> Pair:
        a, b = (ranks[name] for name in couple)
        watch.check()
        return Pair(
            *couple, tau_b(a, b, watch), spearman(a, b), rank_biased_overlap(a, b, p),
            top_overlap(a, b, top),
        )  # fmt: skip

    watch.report("comparing", 0, len(couples), "pairs of measures")
    pairs = tuple(each(compare, couples, watch.threads))
    k = min(top, graph.n)
    return Agreement(
        names,
        refused,
        pairs,
        p,
        rbo_weight(p, k),
        k,
        _furthest(graph, kept, ranks, apart, age, watch),
        ranks,
    )


def _furthest(
    graph: Graph,
    results: Mapping[str, Result],
    ranks: Mapping[str, Ranks],
    wanted: int,
    age: str | None,
    watch: Watch,
) -> tuple[Apart, ...]:
    names = list(ranks)
    best = np.full(graph.n, np.inf)
    worst = np.zeros(graph.n)
    for name in names:
        np.minimum(best, ranks[name].mean, out=best)
        np.maximum(worst, ranks[name].mean, out=worst)
    factor = worst / best
    wanted = min(wanted, graph.n)
    if wanted == 0:
        return ()
    some = np.argpartition(-factor, wanted - 1)[:wanted]
    found = []
    for node in some[np.lexsort((some, -factor[some]))].tolist():
        watch.check()
        if factor[node] == 1.0:
            break
        means = {name: float(ranks[name].mean[node]) for name in names}
        high, low = _ends(names, means)
        spans = {name: results[name].standing.range_of(node) for name in names}
        reasons = explain(graph, results, node, high, low, age)
        found.append(Apart(node, high, low, float(factor[node]), spans, reasons))
    return tuple(found)


def _ends(names: Sequence[str], means: Mapping[str, float]) -> tuple[str, str]:
    high = min(names, key=lambda name: means[name])
    low = max(names, key=lambda name: means[name])
    return high, low
