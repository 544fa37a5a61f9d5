"""The shortlist of a report: each node's note, its places, and what its score is made of."""

from __future__ import annotations

from kingpost.core.export.report.blocks import RIGHT, Block, Cells, Facts, Heading, Table, Words
from kingpost.core.export.report.drawings import ruler
from kingpost.core.export.report.material import Material
from kingpost.core.export.report.shortlist import Entry
from kingpost.core.export.report.summary import title_of
from kingpost.core.export.rows import as_plain, attributes, single
from kingpost.core.export.table import name_text, rank_text, value_text
from kingpost.core.export.why_answer import PARTS
from kingpost.core.insight.terms import has_terms
from kingpost.core.insight.why import why
from kingpost.core.measures import measure
from kingpost.core.text import visible

FEEDERS = 5
PATHS = 3


def shortlisted(material: Material) -> list[Block]:
    """One part for every node on the list; nothing without a list."""
    if not material.shortlist:
        return []
    blocks: list[Block] = [
        Heading("Shortlist"),
        Words(
            "Notes are those of whoever made the list. What a score is made of is exact: each "
            "feeder's part, and what the node has without feeders."
        ),
    ]
    for entry in material.shortlist:
        blocks += _entry(material, entry)
    return blocks


def _entry(material: Material, entry: Entry) -> list[Block]:
    graph = material.graph
    blocks: list[Block] = [Heading(visible(entry.name, 200) or '""', 3)]
    if entry.note:
        blocks.append(Words(f"Note: {visible(entry.note)}"))
    if entry.node < 0:
        blocks.append(Words("This graph holds no node of that name."))
        return blocks
    node = entry.node
    pairs = [(name, words) for name, words in _attributes(material, node) if words]
    pairs.append(("edges", f"{_degree(graph.inward, node)} in, {_degree(graph.outward, node)} out"))
    if material.within is not None and material.within.peers[node] > 0:
        within = material.within
        rank = rank_text(int(within.first[node]), int(within.last[node]))
        pairs.append(("among peers", f"{rank} of {within.peers[node]:,}"))
    blocks.append(Facts(pairs))
    places = {
        name: (measure(name).letter, *result.standing.range_of(node))
        for name, result in material.results.items()
        if result.refusal is None
    }
    drawn = ruler(visible(entry.name, 60), places, graph.n)
    if drawn is not None:
        blocks.append(drawn)
    return blocks + _why(material, node)


def _degree(rows: object, node: int) -> str:
    offsets = rows.offsets  # type: ignore[attr-defined]
    return f"{int(offsets[node + 1] - offsets[node]):,}"


def _attributes(material: Material, node: int) -> list[tuple[str, str]]:
    extra = attributes(material.graph)
    if extra is None:
        return []
    row = extra.slice(node, 1)
    return [
        (visible(title, 40), value_text(as_plain(single(values)).to_pylist()[0]))
        for title, values in zip(row.column_names, row.columns, strict=True)
    ]


def _why(material: Material, node: int) -> list[Block]:
    graph, result = material.graph, material.leading
    if not has_terms(result):
        return []
    found = why(graph, result, node)
    own = [(name, part) for name, part in found.parts.items() if part]
    near = found.neighbours[:FEEDERS].tolist()
    names = [name_text(graph.label(feeder)) for feeder in near]
    shares = [float(part) for part in found.share[:FEEDERS]]
    ranks = [rank_text(*result.standing.range_of(feeder)) for feeder in near]
    rest = len(found.neighbours) - len(near)
    if rest:
        names.append(f"({rest:,} more feeders)")
        shares.append(float(found.share[FEEDERS:].sum()))
        ranks.append("")
    for name, part in own:
        names.append(f"({PARTS[name]})")
        shares.append(part / found.score if found.score else 0.0)
        ranks.append("")
    if not names:
        return [Words(f"Nothing gives it any {title_of(result)} score.")]
    table = Table(
        f"What makes up its {title_of(result)} score",
        [
            Cells("what gives", names, head=True),
            Cells("share", [f"{share:.1%}" for share in shares], RIGHT),
            Cells("its rank", ranks, RIGHT),
        ],
    )
    blocks: list[Block] = [table]
    if found.paths:
        ways = [
            f"{' > '.join(graph.name(step, 60) for step in path.nodes)} ({path.share:.1%})"
            for path in found.paths[:PATHS]
        ]
        blocks.append(Words(f"Strongest supply paths: {'; '.join(ways)}."))
    return blocks
