"""An audit, as text and as JSON."""

from __future__ import annotations

import dataclasses
from typing import Any

from kingpost.core.export.account import account_pairs
from kingpost.core.export.cells import plain_ascii, wrap
from kingpost.core.export.digits import number, small
from kingpost.core.export.heading import graph_line
from kingpost.core.export.jsonable import jsonable
from kingpost.core.export.layout import Column, terminal_table
from kingpost.core.graph import Graph
from kingpost.core.ingest.about import TableAbout
from kingpost.core.ingest.room import Prediction
from kingpost.core.insight.audit import QUANTILES, Audit
from kingpost.core.text import count, listed, visible


def audit_json(
    graph: Graph, audit: Audit, table: TableAbout, memory: Prediction | None = None
) -> dict[str, Any]:
    """Keys: ``table`` (files, rows, columns), ``input``, ``account``, ``memory``, ``structure``.

    ``memory`` holds bytes: ``peak`` of loading as predicted, and ``available``; null for a pack.

    ``structure`` holds the fields of :class:`Audit`, degree quantiles keyed by the quantile,
    and the graph's fingerprint.
    """
    structure = dataclasses.asdict(audit)
    for side in ("in_degrees", "out_degrees"):
        structure[side] = dict(zip(map(str, QUANTILES), structure[side], strict=True))
    structure["directed"] = graph.directed
    structure["fingerprint"] = graph.fingerprint
    found: dict[str, Any] = jsonable(
        {
            "table": dataclasses.asdict(table),
            "input": dataclasses.asdict(graph.origin),
            "account": dataclasses.asdict(graph.account),
            "memory": None if memory is None else dataclasses.asdict(memory),
            "structure": structure,
        }
    )
    return found


def audit_text(
    graph: Graph,
    audit: Audit,
    table: TableAbout,
    width: int = 80,
    *,
    memory: Prediction | None = None,
    ascii_only: bool = False,
) -> str:
    """An audit as lines of at most ``width`` columns."""
    lines = wrap(graph_line(graph), width, "  ")
    lines += ["", "Table", *_table(table, width)]
    lines += ["", "Rows", *_pairs(account_pairs(graph.account), width)]
    if memory is not None:
        lines += ["", "Memory", *_pairs([("needed", memory.words)], width)]
    lines += ["", "Structure", *_pairs(structure_pairs(audit), width)]
    lines += ["", *_degrees(audit, width)]
    text = "\n".join(line.rstrip() for line in lines) + "\n"
    return plain_ascii(text) if ascii_only else text


def _pairs(pairs: list[tuple[str, str]], width: int) -> list[str]:
    room = max(len(name) for name, _ in pairs)
    lines = []
    for name, words in pairs:
        lines += wrap(f"  {name:<{room}}  {words}", width, " " * (room + 4))
    return lines


def _table(table: TableAbout, width: int) -> list[str]:
    files = listed([visible(name, 60) for name in table.files], 3)
    lines = wrap(f"  {count(table.rows, 'row')} in {files}", width, "    ")
    roles = {table.source: "source", table.target: "target", table.weight: "weight"}
    rows = terminal_table(
        [
            Column("  column", [f"  {visible(c.name, 60)}" for c in table.columns], least=10),
            Column("type", [visible(c.type, 60) for c in table.columns], least=8),
            Column("could be", [_could_be(c) for c in table.columns]),
            Column("guess", [roles.get(c.name, "") for c in table.columns]),
        ],
        width,
    )[0]
    return [*lines, *rows, *wrap(f"  guess: {visible(table.why)}", width, "    ")]


def _could_be(column: Any) -> str:
    uses = [("an end", column.can_be_id), ("a weight", column.can_be_weight)]
    return " or ".join(name for name, possible in uses if possible) or "-"


def structure_pairs(audit: Audit) -> list[tuple[str, str]]:
    """What an audit found, as short names and phrases; degrees apart."""
    low, high = audit.radius
    pairs = [
        ("nodes", f"{audit.nodes:,}"),
        ("edges", f"{audit.edges:,}"),
        ("density", f"{audit.density:.3g}"),
        ("self-loops", f"{audit.self_loops:,}"),
        ("zero weight", f"{audit.zero_weight:,} edges, left out"),
        ("dangling", f"{count(audit.dangling, 'node')} that point at nobody"),
        ("sources", f"{count(audit.sources, 'node')} that nobody points at"),
        ("isolated", f"{count(audit.isolated, 'node')} without any edge"),
        ("weak components", _components(audit.weak, audit.weak_largest)),
        ("strong components", _components(audit.strong, audit.strong_largest)),
        ("with a cycle", f"{audit.cyclic:,}, holding {audit.cyclic_share:.1%} of the edges"),
    ]
    if audit.weights is not None:
        w = audit.weights
        words = f"{number(w.least)} to {number(w.greatest)}, {number(w.total)} in all"
        pairs.insert(2, ("weights", words))
    if audit.period is None:
        pairs.append(("spectral radius", "0: there is no cycle, so no eigenvector centrality"))
        return pairs
    where = f"in the component with most edges ({count(audit.period_nodes or 0, 'node')})"
    pairs.append(("period", f"{audit.period} {where}"))
    pairs.append(("spectral radius", _bracket(low, high)))
    return pairs


def _components(number: int, largest: int) -> str:
    return f"{number:,}, {count(largest, 'node')} in the largest"


def _bracket(low: float, high: float) -> str:
    if low == high:
        return f"{low:.10g}, exactly"
    width = (high - low) / high
    if width > 1e-6:
        return f"between {low:.8g} and {high:.8g}"
    return f"{low:.10g}, bracketed to a relative width of {small(width)}"


def _degrees(audit: Audit, width: int) -> list[str]:
    titles = ["least", "25%", "median", "75%", "90%", "99%", "greatest"]
    sides = (audit.in_degrees, audit.out_degrees)
    columns = [Column("Degrees", ["  in", "  out"])]
    for at, title in enumerate(titles):
        columns.append(Column(title, [f"{side[at]:,}" for side in sides], ">"))
    return terminal_table(columns, width)[0]
