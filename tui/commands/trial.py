"""``kingpost trial``: what if nodes or edges were taken out, or edges reweighted."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.measures.base import Measure, Settings
    from kingpost.core.result import Result

ROWS = 10


@click.command(cls=Sectioned)
@options.edges
@options.insight("--without", multiple=True, metavar="NODE", help="take this node out (repeatable)")
@options.insight(
    "--without-edge",
    type=(str, str),
    multiple=True,
    metavar="SOURCE TARGET",
    help="take this edge out (repeatable); two words, so that any name can be written",
)
@options.insight(
    "--scale-edge",
    type=(str, str, float),
    multiple=True,
    metavar="SOURCE TARGET FACTOR",
    help="multiply the weight of this edge (repeatable)",
)
@options.insight(
    "--each",
    type=options.Count(),
    metavar="K",
    help="instead: what the loss of each of the first K nodes would do, one at a time",
)
@options.loading
@options.measure
@options.top(f"rows of each table, or all [{ROWS} in table and markdown, all in the others]")
@answering.output("standings, moves, losses, risers")
def trial(edges: tuple[str, ...], **given: Any) -> int:
    """Recompute the standings of EDGES as if nodes or edges were gone, or edges reweighted.

    The scores after the change are exact to the bound they state.  A node has risen or fallen
    where the ranks it may truly have before and after do not overlap, among the nodes that stay.

    This is structure, not traffic engineering: before switching anything off follow the local
    change procedure.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    changes = given["without"] or given["without_edge"] or given["scale_edge"]
    if bool(changes) == (given["each"] is not None):
        raise click.UsageError(
            "name what to change by --without, --without-edge or --scale-edge, or ask for --each K "
            "alone"
        )
    _check_sheet(given)
    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    with Session(given["threads"]) as session:
        graph, seconds = session.load(edges, load_options(given))
        from kingpost.core.export import trial_answer as export
        from kingpost.core.insight.edit import edit_named
        from kingpost.core.insight.loss import losses
        from kingpost.core.insight.trial import trial as insight

        edit = edit_named(graph, given["without"], given["without_edge"], given["scale_edge"])
        result, tol = _before(session, graph, chosen, values, seconds)
        results = {"before": result}
        refused = answering.refusal(results)
        if refused is not None:
            return refused
        if given["each"] is not None:
            rows = losses(graph, result, given["each"], watch=session.watch, tol=tol)
            answer = export.losses_answer(graph, result, rows, tol)
        else:
            found = insight(graph, result, edit, session.watch, tol=tol)
            results = {"after": found.result, **results}
            refused = answering.refusal(results)
            if refused is not None:
                return refused
            limit = options.limit_of(given["top"], ROWS if form in ("table", "markdown") else None)
            answer = export.trial_answer(graph, result, found, limit)
        session.release()
        session.line.clear()
        answering.deliver(answer, form, given)
        return answering.status_of(session, results)


def _check_sheet(given: dict[str, Any]) -> None:
    usual = ("losses", "risers") if given["each"] is not None else ("standings", "moves")
    if given["sheet"] not in (None, *usual):
        raise click.UsageError(f"this answer has the sheets {' and '.join(usual)}")


def _before(
    session: Session, graph: Graph, chosen: Measure, values: dict[str, Any], seconds: float
) -> tuple[Result, float]:
    """The result before, and the error asked for after.

    What is proven after the change includes the error before it, so that is asked to be smaller.
    """
    import dataclasses

    from kingpost.core.insight.trial import LOOSER
    from kingpost.tui.commands.choices import build

    asked: Settings = build(chosen, values, graph).settings
    finer = max(asked.tol / LOOSER, min(asked.tol, 1e-13))
    result = session.solve(chosen, graph, dataclasses.replace(asked, tol=finer), seconds)
    session.check()
    return result, asked.tol
