"""A ranking to be read: as a table for a terminal or a file of text, and as Markdown."""

from __future__ import annotations

from typing import Any

import numpy as np

from kingpost.core.export.cells import plain_ascii, wrap
from kingpost.core.export.digits import on_the_point, score_texts
from kingpost.core.export.heading import RAIL, RAIL_ASCII, header, legend
from kingpost.core.export.layout import Column, escaped, markdown_table, terminal_table
from kingpost.core.export.rows import Ranking, as_plain, attributes, degrees, single
from kingpost.core.standing import UNRANKED
from kingpost.core.text import count, id_text, visible

NAME_LIMIT = 200  # characters of a name worth laying out; the column cuts it further


def columns(ranking: Ranking, *, ascii_only: bool = False) -> list[Column]:
    """The columns of a ranking's table, texts safe to show; attributes are optional ones."""
    graph, result, standing = ranking.graph, ranking.result, ranking.standing
    nodes = standing.order[: ranking.count]
    low, high = result.bound.interval(result.scores)
    if result.exact_zero is not None:
        low[result.exact_zero] = high[result.exact_zero] = 0.0
    scores = score_texts(result.scores[nodes], low[nodes], high[nodes])
    rail = RAIL_ASCII if ascii_only else RAIL
    spans = zip(standing.first[: len(nodes)], standing.last[: len(nodes)], strict=True)
    found = [
        Column("", [rail[int(mark)] for mark in standing.rail[: len(nodes)]]),
        Column("rank", [rank_text(int(a), int(b)) for a, b in spans], ">"),
        Column("node", [name_text(graph.label(int(node))) for node in nodes], least=8),
        Column(result.measure, on_the_point(scores), ">"),
        *_among_peers(ranking, nodes),
        Column("in", _counts(graph.inward.offsets, nodes), ">"),
        Column("out", _counts(graph.outward.offsets, nodes), ">"),
    ]
    extra = attributes(graph)
    if extra is not None:
        picked = extra.take(nodes)
        for title, values in zip(picked.column_names, picked.columns, strict=True):
            number = _is_number(values.type)
            texts = [value_text(value) for value in as_plain(single(values)).to_pylist()]
            found.append(Column(visible(title, 40), texts, ">" if number else "<", optional=True))
    return found


def _among_peers(ranking: Ranking, nodes: Any) -> list[Column]:
    within = ranking.within
    if within is None:
        return []
    z, low, high = (values[nodes] for values in (within.scores, within.low, within.high))
    spans = zip(within.first[nodes], within.last[nodes], within.peers[nodes], strict=True)
    among = [f"{rank_text(int(a), int(b))} of {size:,}" if size else "-" for a, b, size in spans]
    return [
        Column("z", on_the_point(score_texts(z, low, high)), ">"),
        Column("among peers", among, ">"),
    ]


def rank_text(first: int, last: int) -> str:
    """``7``, or ``4-9`` where the rank is not settled."""
    return f"{first:,}" if first == last else f"{first:,}-{last:,}"


def name_text(label: Any) -> str:
    """An id, safe to show and never nothing."""
    return visible(id_text(label), NAME_LIMIT) or '""'


def value_text(value: Any) -> str:
    """An attribute, safe to show and short; nothing for a null."""
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.6g}"
    return visible(id_text(value), NAME_LIMIT)


def _counts(offsets: Any, nodes: Any) -> list[str]:
    return [f"{number:,}" for number in degrees(offsets, nodes).tolist()]


def _is_number(kind: Any) -> bool:
    import pyarrow as pa

    return bool(
        pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_decimal(kind)
    )


def table(ranking: Ranking, width: int = 80, *, ascii_only: bool = False) -> str:
    """A ranking as lines of at most ``width`` columns, with its header and a legend."""
    rule = ("-" if ascii_only else "─") * width
    ellipsis = "~" if ascii_only else "…"
    body = columns(ranking, ascii_only=ascii_only)
    if ascii_only:
        body = [_ascii_column(column) for column in body]
    rows, left_out = terminal_table(body, width, ellipsis)
    lines: list[str] = []
    for sentence in header(ranking):
        lines += wrap(plain_ascii(sentence) if ascii_only else sentence, width, "  ")
    lines += [rule, *rows, rule, *wrap(legend(ascii_only), width, "  ")]
    lines += wrap(_tail(ranking, left_out), width, "  ")
    return "\n".join(line.rstrip() for line in lines if line.strip()) + "\n"


def _ascii_column(column: Column) -> Column:
    cells = [plain_ascii(cell) for cell in column.cells]
    return Column(plain_ascii(column.title), cells, column.align, column.least, column.optional)


def _tail(ranking: Ranking, left_out: int) -> str:
    parts = []
    rest = ranking.graph.n - ranking.count
    if rest:
        parts.append(f"{rest:,} more below (--top N, --top all)")
    marks = ranking.standing.rail
    if ranking.within is not None:
        if ranking.within.left_out:
            parts.append(ranking.within.left_out)
    elif len(marks) and (unsure := int(np.count_nonzero(marks == UNRANKED))):
        parts.append(f"{unsure:,} cannot be told from zero")
    if left_out:
        parts.append(f"{count(left_out, 'attribute column')} did not fit")
    return "; ".join(parts)


def markdown(ranking: Ranking, *, ascii_only: bool = False) -> str:
    """A ranking as Markdown: a list of the header's sentences, a pipe table, the legend."""
    lines = [f"- {escaped(sentence)}" for sentence in header(ranking)]
    body = markdown_table(columns(ranking, ascii_only=ascii_only))
    lines += ["", *body, "", escaped(legend(ascii_only))]
    if tail := _tail(ranking, 0):
        lines += ["", escaped(tail)]
    text = "\n".join(lines) + "\n"
    return plain_ascii(text) if ascii_only else text
