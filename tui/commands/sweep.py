"""``kingpost sweep``: ranks along a parameter."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import ANSWERED, SHORT_OF_ACCURACY, Sectioned, complain
from kingpost.tui.commands.session import Session, load_options

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.insight.over import Over

ROWS = 20


@click.command(cls=Sectioned)
@options.edges
@options.insight(
    "--over",
    required=True,
    metavar="NAME=VALUES",
    help="damping=0.5:0.99:12, alpha=1e-4:1e-2:9:log, dangling=teleport,leak; also weight-as, "
    "parallel, loops",
)
@options.insight(
    "--first", type=options.Count(), metavar="K", help="follow the nodes among the first K [10]"
)
@options.insight(
    "--interval",
    type=float,
    metavar="WIDTH",
    help="how narrow to find where the leader changes; for log the logarithm of a ratio "
    "[a thousandth of the range]",
)
@options.loading
@options.measure
@options.top(f"nodes to show, or all [{ROWS} in table and markdown; data formats have all]")
@answering.output("ranks, values, changes")
def sweep(edges: tuple[str, ...], **given: Any) -> int:
    """Follow the first nodes of EDGES along a parameter of a measure or of the reading.

    Every value is solved to the same proven error, from the scores of the one before.  Where the
    proven leader differs between two values, the place where it changes is found by halving.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import build, check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    from kingpost.core.insight.over import READING, at, parse_over

    over = parse_over(given["over"])
    if over.name in values:
        raise click.UsageError(f"--{over.flag} is what --over sweeps; give it only there")
    reading = over.name in READING and over.name not in _fields(chosen)
    if reading:
        _check_reading(over)
    else:
        for value in over.values:
            at(build(chosen, values, None).settings, over, value)
    with Session(given["threads"]) as session:
        graphs = _graphs(session, edges, given, over) if reading else None
        graph: Graph
        if graphs is None:
            graph, _ = session.load(edges, load_options(given))
        else:
            graph = next(iter(graphs.values()))
        from kingpost.core.export.sweep_answer import sweep_answer
        from kingpost.core.insight import sweep as insight

        settings = build(chosen, values, graph).settings
        found = insight.sweep(
            graph,
            chosen.name,
            settings,
            over,
            graphs=graphs,
            top=given["first"] or insight.TOP,
            interval=given["interval"],
            watch=session.watch,
        )
        session.release()
        session.line.clear()
        limit = options.limit_of(given["top"], ROWS if form in ("table", "markdown") else None)
        answering.deliver(sweep_answer(graph, settings, found, limit), form, given)
        short = [point for point in found.points if point.refusal is None and not point.accurate]
        for point in short:
            complain(f"{over.flag} {point.value}: the proven error is {point.error:.1e}")
        return SHORT_OF_ACCURACY if short else ANSWERED


def _fields(chosen: Any) -> set[str]:
    from kingpost.tui.commands.choices import field_names

    return field_names(chosen)


def _check_reading(over: Over) -> None:
    from kingpost.core.insight.over import READING

    for value in over.values:
        if value not in READING[over.name]:
            raise click.UsageError(
                f"--{over.flag} takes {', '.join(READING[over.name])}, not {value}"
            )


def _graphs(
    session: Session, edges: tuple[str, ...], given: dict[str, Any], over: Over
) -> dict[str, Graph]:
    """The table read once for each value."""
    return {
        str(value): session.load(edges, load_options({**given, over.name: value}))[0]
        for value in over.values
    }
