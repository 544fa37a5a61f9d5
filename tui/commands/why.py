"""``kingpost why``: what a node's score is made of, and why one node stands above another."""

from __future__ import annotations

from typing import Any

import click

from kingpost.core import warm
from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

TERMS = 20


@click.command(cls=Sectioned)
@click.argument("edges", nargs=-1, metavar="EDGES...")
@click.argument("name", required=False)
@options.insight("--than", metavar="OTHER", help="compare with this node, term by term")
@options.insight(
    "--least",
    type=float,
    metavar="SHARE",
    help="share of the score a supply path must carry [0.02]",
)
@options.insight(
    "--depth", type=options.Count(), metavar="N", help="most edges of a supply path [6]"
)
@options.loading
@options.measure
@options.top(f"feeders or terms to give, or all [{TERMS} in table and markdown, all in the others]")
@answering.output("terms, paths")
def why(edges: tuple[str, ...], name: str | None, **given: Any) -> int:
    """Take the score of one node of EDGES apart.

    NAME is the node's id.  Its score is the sum of what each feeder gives and of what it has by
    teleport, dangling nodes or beta; the supply paths follow the strongest feeders upstream.
    """
    if name is None or not edges:
        raise click.UsageError("kingpost why takes EDGES... and then the NAME of one node")
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    if given["than"] is not None and given["sheet"] == "paths":
        raise click.UsageError("--than compares terms; it has no paths")
    warm.expect(chosen.name)
    with Session(given["threads"]) as session:
        graph, seconds = session.load(edges, load_options(given))
        node = graph.find(name)
        other = None if given["than"] is None else graph.find(given["than"])
        results = answering.solve_all(session, graph, [chosen.name], values, seconds)
        refused = answering.refusal(results)
        if refused is not None:
            return refused
        result = results[chosen.name]
        from kingpost.core.export import why_answer as export
        from kingpost.core.insight import why as insight

        limit = options.limit_of(given["top"], TERMS if form in ("table", "markdown") else None)
        if other is None:
            found = insight.why(
                graph,
                result,
                node,
                least=insight.LEAST if given["least"] is None else given["least"],
                depth=given["depth"] or insight.DEPTH,
                watch=session.watch,
            )
            answer = export.why_answer(graph, result, found, limit)
        else:
            answer = export.than_answer(
                graph, result, insight.than(graph, result, node, other, session.watch), limit
            )
        session.release()
        answering.deliver(answer, form, given)
        return answering.status_of(session, results)
