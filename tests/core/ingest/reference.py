"""A second, independent ingest: dictionaries and loops over Python values, nothing shared."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import pytest


class Refused(Exception):
    """The table must be refused."""


@dataclass
class Expected:
    """What the graph and its account must say."""

    labels: list = field(default_factory=list)
    edges: dict = field(default_factory=dict)
    skipped: dict = field(default_factory=dict)
    rows_read: int = 0
    rows_kept: int = 0
    merged: int = 0
    loops: int = 0
    loops_dropped: int = 0
    zero_weight: int = 0


def sort_key(value):
    return value.encode() if isinstance(value, str) else value


def _trouble(source, target, weight, weighted):
    if source is None:
        return "null source"
    if target is None:
        return "null target"
    if not weighted:
        return None
    if weight is None:
        return "null weight"
    number = float(weight)
    if math.isnan(number):
        return "NaN weight"
    if math.isinf(number):
        return "infinite weight"
    return "negative weight" if number < 0 else None


def _fold(weights, policy):
    if policy == "count":
        return float(len(weights))
    if policy == "min":
        return min(weights)
    if policy == "max":
        return max(weights)
    if policy == "first":
        return weights[0]
    total = weights[0]
    for weight in weights[1:]:
        total += weight
    return total / len(weights) if policy == "mean" else total


def expected(rows, *, weighted, directed, parallel, loops, bad_rows, weight_as):
    """``rows`` are (source, target, weight) triples; raises Refused where load must."""
    weighted = weighted and weight_as != "none" and parallel != "count"
    out = Expected(rows_read=len(rows))
    names, groups = set(), {}
    for source, target, weight in rows:
        trouble = _trouble(source, target, weight, weighted)
        if trouble:
            out.skipped[trouble] = out.skipped.get(trouble, 0) + 1
            continue
        out.rows_kept += 1
        names |= {source, target}
        if source == target:
            out.loops += 1
            if loops == "drop":
                out.loops_dropped += 1
                continue
        ends = (source, target)
        if not directed and sort_key(target) < sort_key(source):
            ends = (target, source)
        groups.setdefault(ends, []).append(float(weight) if weighted else 1.0)
    if (out.skipped and bad_rows == "refuse") or out.rows_kept == 0:
        raise Refused
    out.labels = sorted(names, key=sort_key)
    out.merged = sum(len(group) - 1 for group in groups.values())
    for ends, group in groups.items():
        value = _fold(group, parallel)
        if math.isinf(value):
            raise Refused
        if value == 0:
            out.zero_weight += 1
            continue
        if weight_as == "log1p":
            value = math.log1p(value)
        elif weight_as == "inverse":
            value = 1 / value if value > 6e-309 else math.inf
        if math.isinf(value):
            raise Refused
        out.edges[ends] = value
    return out


def edges_of(graph):
    """The edges of a graph as {(source id, target id): weight}, from ``outward`` alone."""
    labels = graph.labels.to_pylist()
    found = {}
    for node in range(graph.n):
        near, weights = graph.outward.row(node)
        assert list(near) == sorted(set(near.tolist())), "rows ascend and do not repeat"
        for other, weight in zip(near.tolist(), weights.tolist(), strict=True):
            if graph.directed or other >= node:
                found[labels[node], labels[other]] = weight
    return found


def assert_sound(graph):
    """What holds for every graph: shapes, the other direction, the arithmetic of the account."""
    out, inn = graph.outward, graph.inward
    assert out.offsets[0] == 0
    assert out.offsets[-1] == len(out.neighbours)
    assert (out.offsets.dtype, out.neighbours.dtype) == ("int64", "uint32")
    assert len(graph.labels) == graph.n == len(inn.offsets) - 1
    entries = {
        (u, int(v)): w
        for u in range(graph.n)
        for v, w in zip(*(part.tolist() for part in out.row(u)), strict=True)
    }
    turned = {}
    for v in range(graph.n):
        near, weights = inn.row(v)
        assert list(near) == sorted(set(near.tolist()))
        turned |= {(int(u), v): w for u, w in zip(near.tolist(), weights.tolist(), strict=True)}
    assert entries == turned
    if not graph.directed:
        assert out is inn
        assert all(entries[v, u] == w for (u, v), w in entries.items())
    if out.weights is not None:
        assert (out.weights != 1).any()
        assert (out.weights > 0).all()
    a = graph.account
    assert a.rows_read == a.rows_kept + a.filtered + a.outside + sum(a.skipped.values())
    assert 0 <= a.filtered_null <= a.filtered
    assert graph.m == a.rows_kept - a.loops_dropped - a.merged - a.zero_weight
    assert a.loops_dropped in (0, a.loops)
    assert set(a.examples) == set(a.skipped)
    assert a.nodes_rows == a.nodes_joined + a.nodes_unknown + a.nodes_repeated
    if graph.attributes is not None:
        assert graph.attributes.num_rows == graph.n
        assert graph.n == a.nodes_joined + a.nodes_missing - a.nodes_filtered


def agree(graph, want):
    assert_sound(graph)
    assert graph.labels.to_pylist() == want.labels
    found = edges_of(graph)
    assert found.keys() == want.edges.keys()
    for ends, weight in want.edges.items():
        assert found[ends] == pytest.approx(weight, rel=1e-15, abs=0)
    account = graph.account
    for name in ("rows_read", "rows_kept", "skipped", "merged", "loops", "loops_dropped"):
        assert getattr(account, name) == getattr(want, name), name
    assert account.zero_weight == want.zero_weight
