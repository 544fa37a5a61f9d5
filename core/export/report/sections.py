"""The sections of a report, in order."""

from __future__ import annotations

from kingpost.core.export.account import account_pairs, losses
from kingpost.core.export.agree_answer import agree_answer
from kingpost.core.export.answer import CAUTION, Sheet
from kingpost.core.export.digits import small
from kingpost.core.export.heading import settings_words
from kingpost.core.export.report.along import along
from kingpost.core.export.report.blocks import (
    LEFT,
    RIGHT,
    Block,
    Bullets,
    Cells,
    Code,
    Document,
    Facts,
    Heading,
    Table,
    Words,
)
from kingpost.core.export.report.drawings import convergence
from kingpost.core.export.report.material import Material
from kingpost.core.export.report.reasons import shortlisted
from kingpost.core.export.report.summary import summary, title_of
from kingpost.core.export.rows import Ranking
from kingpost.core.export.table import columns, rank_text
from kingpost.core.result import BoundKind, Result
from kingpost.core.standing import OPEN, PROVEN, TIED, UNRANKED
from kingpost.core.text import count, visible

_RAIL = {
    PROVEN: "┃ proven",
    OPEN: "╎ open",
    TIED: "= tied",
    UNRANKED: "not told from zero",
}
_ATTRIBUTES = 4  # node attributes that a page has room for


def document(material: Material) -> Document:
    """The report."""
    graph = material.graph
    name = visible(graph.origin.name, 80)
    title = visible(material.question, 300) or f"Which nodes carry {name}"
    about = (
        f"{name}: {count(graph.n, 'node')}, {count(graph.m, 'edge')}"
        f"{'' if graph.directed else ', undirected'}. Made {material.made} by Kingpost "
        f"{material.versions.get('kingpost', '')}."
    )
    blocks: list[Block] = [
        Heading("In short"),
        Bullets(summary(material)),
        Words(f"{CAUTION[0].upper()}{CAUTION[1:]}.", strong=True),
        *_standings(material),
        *_agreement(material),
        *shortlisted(material),
        *_solved(material),
        *along(material),
        *_graph(material),
        *_conventions(material),
        *_cautions(material),
        *_again(material),
    ]
    return Document(title, about, blocks)


def _standings(material: Material) -> list[Block]:
    graph, leading = material.graph, material.leading
    ranking = Ranking(graph, leading, material.top, dict(material.remarks), material.within)
    standing = ranking.standing
    nodes = standing.order[: ranking.count].tolist()
    found = columns(ranking)
    tables = [Cells("against the next", [_RAIL[int(mark)] for mark in standing.rail[: len(nodes)]])]
    for column in [column for column in found[1:] if not column.optional]:
        cells = [cell.strip() for cell in column.cells]
        align = RIGHT if column.align == ">" else LEFT
        tables.append(Cells(column.title, cells, align, head=column.title == "node"))
    tables.append(tables.pop(0))  # read last: rank, node, score, then how sure
    others = [
        Cells(
            name,
            [rank_text(*result.standing.range_of(node)) for node in nodes],
            RIGHT,
        )
        for name, result in list(material.results.items())[1:]
        if result.refusal is None
    ]
    tables[3:3] = others
    listed = {entry.node for entry in material.shortlist}
    marked = frozenset(row for row, node in enumerate(nodes) if node in listed)
    if marked:
        note = ["listed" if row in marked else "" for row in range(len(nodes))]
        tables.append(Cells("shortlist", note))
    optional = [column for column in found if column.optional]
    for column in optional[:_ATTRIBUTES]:
        align = RIGHT if column.align == ">" else LEFT
        tables.append(Cells(column.title, [cell.strip() for cell in column.cells], align))
    caption = f"The first {len(nodes):,} of {graph.n:,} by {title_of(leading)}"
    words = (
        "A rank such as 4-9 means that the node may truly have any of those ranks; under other "
        "measures the column holds the rank there. Against the next: proven, it stands above the "
        "next row whatever the rounding; open, the error bound does not settle it; tied, both "
        "have exactly the same score."
    )
    blocks: list[Block] = [Heading("Standings"), Table(caption, tables, marked), Words(words)]
    if len(optional) > _ATTRIBUTES:
        left = len(optional) - _ATTRIBUTES
        blocks.append(Words(f"{count(left, 'attribute')} of the nodes are not shown."))
    if material.within is not None and material.within.left_out:
        blocks.append(Words(f"{material.within.left_out}."))
    return blocks


def sheet_table(sheet: Sheet, caption: str, head: str) -> Table:
    """A sheet of an answer as a table; ``head`` is the title of the column that names rows."""
    found = []
    for item in sheet.fields:
        if item.title is None:
            continue
        column = item.column()
        align = RIGHT if column.align == ">" else LEFT
        cells = [cell.strip() for cell in column.cells]
        found.append(Cells(column.title, cells, align, head=column.title == head))
    return Table(caption, found)


def _agreement(material: Material) -> list[Block]:
    found = material.agreement
    if found is None:
        return []
    answer = agree_answer(material.graph, dict(material.results), found)
    pairs, nodes = answer.sheets
    return [
        Heading("Agreement"),
        Words(
            f"Kendall's tau-b and Spearman weigh all nodes alike (1 is the same order, 0 none, -1 "
            f"the reverse); rbo is rank-biased overlap with p = {found.p:g}, which weighs the head "
            f"of the list (the first {found.top:,} ranks have {found.head_weight:.0%} of its "
            f"weight); top is the shared part of the first {found.top:,}."
        ),
        sheet_table(pairs, "Agreement of every two measures", "measure"),
        sheet_table(nodes, "Nodes that the measures place furthest apart", "node"),
        Bullets(answer.tail),
    ]


def _solved(material: Material) -> list[Block]:
    leading = material.leading
    blocks: list[Block] = [Heading("How far it is proven")]
    drawn = convergence(leading)
    if drawn is not None:
        blocks.append(drawn)
    else:
        blocks.append(
            Words("There is no convergence to draw: the scores took a single pass over the edges.")
        )
    rows = list(material.results.values())
    refused = [result.refusal is not None for result in rows]
    blocks.append(
        Table(
            "Every measure solved",
            [
                Cells("measure", [result.measure for result in rows], head=True),
                Cells("ended", [result.stop.value for result in rows]),
                Cells("sweeps", [f"{result.sweeps:,}" for result in rows], RIGHT),
                Cells(
                    "error at most",
                    ["-" if no else small(float(r.bound.value)) for r, no in
                     zip(rows, refused, strict=True)],
                    RIGHT,
                ),
                Cells("kind of bound", [result.bound.kind.value for result in rows]),
                Cells(
                    "order proven to",
                    ["-" if no else f"{result.proven_order:,}" for result, no in
                     zip(rows, refused, strict=True)],
                    RIGHT,
                ),
            ],
        )
    )  # fmt: skip
    blocks.append(
        Words(
            "The error is a share of the sum of the scores and a theorem about the exact solution "
            "for the table as read, rounding included; it says nothing about rows that are missing "
            "or wrong."
        )
    )
    return blocks


def _graph(material: Material) -> list[Block]:
    graph = material.graph
    origin = graph.origin
    pairs = [
        ("nodes", f"{graph.n:,}"),
        ("edges", f"{graph.m:,}{'' if graph.directed else ', each both ways'}"),
        ("an edge", f"{visible(origin.source, 60)} -> {visible(origin.target, 60)}"),
        ("weight", visible(origin.weight_words, 80)),
        ("self-loops", f"{graph.loop_count:,}"),
    ]
    pairs += [(f"rows {name}", words) for name, words in account_pairs(graph.account)]
    notes = [*graph.account.notes]
    return [Heading("The graph"), Facts(pairs), *([Bullets(notes)] if notes else [])]


def _conventions(material: Material) -> list[Block]:
    blocks: list[Block] = [
        Heading("Conventions"),
        Words("Choices that other software may make otherwise; scores differ where they do."),
    ]
    shown: dict[str, str] = {}
    for result in material.results.values():
        pairs = [("settings", settings_words(result.settings))]
        told = {**result.conventions}
        if result is material.leading:
            told |= dict(material.remarks)
        for name, words in told.items():
            if shown.get(name) != words:  # what holds for all is said once
                pairs.append((visible(name.replace("_", " ")), visible(words)))
            shown.setdefault(name, words)
        blocks += [Heading(title_of(result), 3), Facts(pairs)]
    return blocks


def _cautions(material: Material) -> list[Block]:
    lines = [
        "A centrality describes the shape of the table. It is no safety assessment: a low rank "
        "does not make a service safe to switch off, and a high one does not say what breaks. "
        "Follow the local change procedure and have changes reviewed by those who run the service.",
        "It is no judgement of a person: citations and preferences carry the habits of a field, "
        "its age and its errors. Do not rank, hire, fund or dismiss people by it.",
        "The bounds cover arithmetic, never the data: edges that are missing, wrong or out of date "
        "are ranked as faithfully as true ones.",
    ]
    lines += [_sentence(words) for words in losses(material.graph.account)]
    for result in material.results.values():
        lines += _shortfall(result)
    missing = [entry.name for entry in material.shortlist if entry.node < 0]
    if missing:
        names = ", ".join(visible(name, 60) for name in missing[:5])
        more = f" and {len(missing) - 5:,} more" if len(missing) > 5 else ""
        lines.append(f"On the shortlist but not in this graph: {names}{more}.")
    return [Heading("Cautions"), Bullets(lines)]


def _sentence(words: str) -> str:
    return f"{words[:1].upper()}{words[1:]}."


def _shortfall(result: Result) -> list[str]:
    if result.refusal is not None:
        return [f"{result.measure}: {result.refusal.sentence}."]
    lines = []
    if not result.stop.accurate:
        lines.append(f"{result.measure} stopped short ({result.stop.value}): {result.reason}.")
    if result.bound.kind is BoundKind.STATISTICAL:
        lines.append(f"{result.measure} is an estimate by random sketches; its order is no proof.")
    if result.bound.kind is BoundKind.BRACKET:
        lines.append(f"{result.measure}: only the eigenvalue is enclosed, not each score.")
    return lines


def _again(material: Material) -> list[Block]:
    graph = material.graph
    blocks: list[Block] = [Heading("To repeat it")]
    if material.command:
        blocks.append(Code(material.command))
    pairs = [(name, version) for name, version in material.versions.items()]
    pairs.append(("graph", f"SHA-256 {graph.fingerprint} of ids, edges and weights as read"))
    for source in material.sources:
        words = f"{source.size:,} bytes, SHA-256 {source.digest}"
        pairs.append((visible(source.name, 200), words))
    blocks.append(Facts(pairs))
    blocks.append(
        Words(
            "The same table, versions and command give the same scores bit for bit, whatever the "
            "number of threads."
        )
    )
    return blocks
