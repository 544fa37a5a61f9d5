"""``kingpost drift``: what changed between two tables of the same system."""

from __future__ import annotations

from typing import Any

import click

from kingpost.core import warm
from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

ROWS = 10


@click.command(cls=Sectioned)
@click.argument("before", metavar="BEFORE")
@click.argument("after", metavar="AFTER")
@options.insight(
    "--causes", type=options.Count(), metavar="N", help="biggest rises to explain by edges [3]"
)
@options.loading
@options.measure
@options.top(f"rows of each kind, or all [{ROWS} in table and markdown, all in the others]")
@answering.output("moves, edges")
def drift(before: str, after: str, **given: Any) -> int:
    """Compare the standings of two tables: who is new, gone, risen, fallen, and why.

    A node has risen or fallen where the ranks it may truly have in the two tables do not
    overlap; a change within error bounds or ties is none.  The biggest rises are taken apart
    into the edges that caused them.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared((before, after), given)
    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    warm.expect(chosen.name)
    with Session(given["threads"]) as session:
        loaded = [session.load((path,), load_options(given)) for path in (before, after)]
        solved = {}
        for name, (graph, seconds) in zip(("before", "after"), loaded, strict=True):
            found = answering.solve_all(session, graph, [chosen.name], values, seconds)
            refused = answering.refusal(found)
            if refused is not None:
                return refused
            solved[name] = found[chosen.name]
        from kingpost.core.export.drift_answer import drift_answer
        from kingpost.core.insight import drift as insight

        graphs = loaded[0][0], loaded[1][0]
        results = solved["before"], solved["after"]
        causes = given["causes"] or insight.CAUSES
        changed = insight.drift(*graphs, *results, causes=causes, watch=session.watch)
        session.release()
        session.line.clear()
        limit = options.limit_of(given["top"], ROWS if form in ("table", "markdown") else None)
        answering.deliver(drift_answer(graphs, results, changed, limit), form, given)
        return answering.status_of(session, solved)
