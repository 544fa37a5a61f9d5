"""``kingpost walk``: where a walker may be after each step, and how soon it forgets its start."""

from __future__ import annotations

from typing import Any

import click

from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import ANSWERED, SHORT_OF_ACCURACY, Sectioned, complain
from kingpost.tui.commands.session import Session, load_options


@click.command(cls=Sectioned)
@options.edges
@options.insight(
    "--from",
    "begin",
    multiple=True,
    required=True,
    metavar="NODE|FILE",
    help="begin at this node (repeatable, in equal parts), or by the weights in a two-column file",
)
@options.insight("--steps", type=options.Count(), metavar="K", help="steps to tell of [10]")
@options.insight(
    "--eps",
    type=float,
    metavar="E",
    help="distance to the stationary distribution that counts as mixed [0.01]",
)
@options.insight(
    "--limit", type=options.Count(), metavar="N", help="look no further than N steps for it [1000]"
)
@options.insight(
    "--places", type=options.Count(), metavar="N", help="most probable nodes to name at a step [5]"
)
@options.insight("--flow", metavar="WAY", help="walk along the edges or against them [along]")
@options.insight(
    "--damping", type=float, metavar="D", help="follow an edge with probability D, else jump [1]"
)
@options.insight(
    "--dangling",
    metavar="MODE",
    help="at a node without out-edges: teleport, uniform or leak (the walk ends) [teleport]",
)
@options.insight(
    "--teleport",
    multiple=True,
    metavar="NODE|FILE",
    help="where jumps land [any node alike]",
)
@options.insight(
    "--tol", type=float, metavar="E", help="error allowed in the stationary distribution [1e-8]"
)
@options.loading
@answering.output("steps, places, modes")
def walk(edges: tuple[str, ...], **given: Any) -> int:
    """Let a walker loose on EDGES and say where it may be after each step.

    How far and how fast influence, or a fault, spreads along the edges; the distance to where it
    settles in the long run, and after how many steps the start is forgotten.  A small graph
    also shows the eigenvalues of the walk.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import build, given_settings
    from kingpost.tui.commands.rank import build_early

    form = answering.prepared(edges, given)
    surfer = measure("surfer")
    values = {"damping": 1.0, "tol": 1e-8, **given_settings(given)}
    build_early(surfer, values)
    with Session(given["threads"]) as session:
        graph, _ = session.load(edges, load_options(given))
        from kingpost.core.export.walk_answer import walk_answer
        from kingpost.core.insight import walk as insight
        from kingpost.core.measures.vectors import distribution

        settings: Any = build(surfer, values, graph).settings
        # The start is read as a teleport is: nodes by name, else a file of weights.
        begin: Any = build(surfer, {"teleport": given["begin"]}, graph).settings
        found = insight.walk(
            graph,
            distribution(graph, begin.teleport, "--from"),
            settings,
            steps=given["steps"] or insight.STEPS,
            eps=insight.EPS if given["eps"] is None else given["eps"],
            most=given["limit"] or insight.MOST,
            places=given["places"] or insight.PLACES,
            watch=session.watch,
        )
        session.release()
        session.line.clear()
        answering.deliver(walk_answer(graph, found), form, given)
        lasting = found.stationary
        if lasting.refusal is None and not lasting.stop.accurate:
            complain(f"stationary distribution: {lasting.stop.value}: {lasting.reason}")
            return SHORT_OF_ACCURACY
        return ANSWERED
