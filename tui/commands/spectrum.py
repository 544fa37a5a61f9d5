"""``kingpost spectrum``: leading eigenvalues, the gap, and the rate of convergence they predict."""

from __future__ import annotations

from typing import Any

import click

from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

COUNT = 6


@click.command(cls=Sectioned)
@options.edges
@options.loading
@options.insight(
    "--count", type=options.Count(), metavar="K", help=f"leading eigenvalues to give [{COUNT}]"
)
@options.measure
@answering.output("values, rates")
def spectrum(edges: tuple[str, ...], **given: Any) -> int:
    """Give the leading eigenvalues of the matrix that a measure iterates on EDGES.

    The gap between the first two predicts how fast power iteration converges; beside it stands
    the rate that the solve really had.  Every value comes with its residual, and with certain
    ends where there are any.
    """
    from kingpost.core.insight.spectrum import check_measure
    from kingpost.core.insight.spectrum import spectrum as insight
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    chosen = measure(given["measure"])
    check_measure(chosen.name)
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    with Session(given["threads"]) as session:
        graph, seconds = session.load(edges, load_options(given))
        results = answering.solve_all(session, graph, [chosen.name], values, seconds)
        result = results[chosen.name]
        found = insight(
            graph,
            chosen.name,
            result=result,
            count=given["count"] or COUNT,
            watch=session.watch,
        )
        session.release()
        session.line.clear()
        from kingpost.core.export.spectrum_answer import spectrum_answer

        answering.deliver(spectrum_answer(graph, result, found), form, given)
        return answering.status_of(session, results)
