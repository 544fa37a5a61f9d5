"""``kingpost agree``: how far measures agree, and where they disagree most."""

from __future__ import annotations

from typing import Any

import click

from kingpost.core import warm
from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

USUAL = "surfer,eigenvector,katz,degree"


@click.command(cls=Sectioned)
@options.edges
@options.loading
@options.insight(
    "--measures", metavar="A,B,...", default=USUAL, help=f"measures to compare [{USUAL}]"
)
@options.insight(
    "--persistence",
    type=float,
    metavar="P",
    help="p of rank-biased overlap, from 0 to 1: the chance of reading on after a rank [0.98]",
)
@options.insight(
    "--first", type=options.Count(), metavar="K", help="K of the overlap of the first K [100]"
)
@options.insight(
    "--age", metavar="COLUMN", help="node attribute that tells age [guessed from its name]"
)
@options.settings
@options.top("nodes the measures place furthest apart [10]")
@answering.output("pairs, nodes")
def agree(edges: tuple[str, ...], **given: Any) -> int:
    """Compare the rankings of several measures on EDGES.

    Kendall's tau-b and Spearman weigh all nodes alike, rank-biased overlap and the overlap of
    the first K the head of the list.  Below stand the nodes that the measures place furthest
    apart, each with what in the structure around it says why.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    names = answering.names_of(given["measures"])
    if len(names) < 2:
        raise click.UsageError("--measures takes at least two, such as surfer,katz")
    values = given_settings(given)
    check_takers(values, [measure(name) for name in names])
    for name in names:
        build_early(measure(name), values)
    from kingpost.core.insight import agree as insight
    from kingpost.core.insight.ranks import check_p
    from kingpost.core.insight.reasons import age_column

    p = insight.P if given["persistence"] is None else given["persistence"]
    check_p(p)
    warm.expect(*names)
    with Session(given["threads"]) as session:
        graph, seconds = session.load(edges, load_options(given))
        age_column(graph, given["age"])
        results = answering.solve_all(session, graph, names, values, seconds)
        apart = options.limit_of(given["top"] or insight.APART, None)
        found = insight.agree(
            graph,
            results,
            p=p,
            top=given["first"] or insight.TOP,
            apart=graph.n if apart is None else apart,
            age=given["age"],
            watch=session.watch,
        )
        session.release()
        session.line.clear()
        from kingpost.core.export.agree_answer import agree_answer

        answering.deliver(agree_answer(graph, results, found), form, given)
        return answering.status_of(session, results)
