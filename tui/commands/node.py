"""``kingpost node``: one node, its ranks under every measure, and its neighbours."""

from __future__ import annotations

from typing import Any

import click

from kingpost.core import warm
from kingpost.tui.commands import options
from kingpost.tui.commands.front import ANSWERED, Sectioned
from kingpost.tui.commands.session import Session, load_options

NEIGHBOURS = 20


@click.command(cls=Sectioned)
@click.argument("edges", nargs=-1, metavar="EDGES...")
@click.argument("name", required=False)
@options.loading
@options.measure
@options.top(f"neighbours on each side, or all [{NEIGHBOURS} in table, all in json]")
@options.output("table", "json")
def node(edges: tuple[str, ...], name: str | None, **given: Any) -> int:
    """Show one node of EDGES: attributes, ranks, neighbours.

    NAME is the node's id.  The ranks are those of surfer, eigenvector, katz, degree and
    --measure, each with the options it takes; the ranks of the neighbours are those of --measure.
    """
    if name is None or not edges:
        raise click.UsageError("kingpost node takes EDGES... and then the NAME of one node")
    from kingpost.core.measures import COMPANY, measure
    from kingpost.tui.commands import writing
    from kingpost.tui.commands.choices import build, check_takers, given_settings

    out = given["out"]
    form = given["form"] or ("json" if out and out.lower().endswith(".json") else "table")
    writing.check_places(form, out, inputs=[*edges, *writing.named_files(given)])
    leading = measure(given["measure"]).name
    measures = [measure(other) for other in dict.fromkeys((*COMPANY, leading))]
    values = given_settings(given)
    check_takers(values, measures)

    status = ANSWERED
    warm.expect(*(one.name for one in measures))
    with Session(given["threads"]) as session:
        graph, load_seconds = session.load(edges, load_options(given))
        number = graph.find(name)
        results = {}
        for one in measures:
            choice = build(one, values, graph)
            result = session.solve(one, graph, choice.settings, load_seconds)
            if result.refusal is not None:
                session.check()
            results[one.name] = result
            if result.refusal is None:
                status = max(status, session.status(result))
        session.release()
        from kingpost.core.export.jsonable import dumps
        from kingpost.core.export.node_report import node_json, node_text
        from kingpost.core.insight.node import look

        limit = options.limit_of(given["top"], NEIGHBOURS if form == "table" else None)
        view = look(graph, number, results, leading, limit)
        ascii_only = out is None and writing.ascii_terminal()
        if form == "json":
            text = dumps(node_json(view, results, graph), indent=2, ascii_only=ascii_only) + "\n"
        else:
            width = writing.WIDE if out else writing.table_width()
            flow = given["flow"] or "along"
            text = node_text(graph, view, flow, width, ascii_only=ascii_only)
        writing.write_text(text, out)
    for result in results.values():
        if result.refusal is None:
            session.tell_shortfall(result)
    return status
