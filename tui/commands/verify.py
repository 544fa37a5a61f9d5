"""``kingpost verify``: which equation scores made elsewhere solve."""

from __future__ import annotations

from typing import Any

import click

from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import ANSWERED, NO_SUCH_ANSWER, Sectioned
from kingpost.tui.commands.session import Session, load_options


@click.command(cls=Sectioned)
@click.argument("edges", nargs=-1, metavar="EDGES...")
@click.argument("scores", required=False)
@options.insight("--node-column", metavar="COLUMN", help="id column of SCORES [guessed]")
@options.insight("--score-column", metavar="COLUMN", help="score column of SCORES [guessed]")
@options.loading
@answering.output("equations, differences")
def verify(edges: tuple[str, ...], scores: str | None, **given: Any) -> int:
    """Find out which equation the scores in the file SCORES solve on EDGES.

    SCORES is a Parquet, CSV or TSV file with one row a node.  Degree, eigenvector, hits, surfer
    and Katz in several forms are fitted by least squares, along the edges and against them, with
    weights and without, self-loops and parallel rows by other policies; the best is solved here
    and its distance stated.  Exit status 3 where nothing fits.
    """
    if scores is None or not edges:
        raise click.UsageError("kingpost verify takes EDGES... and then a file of SCORES")
    form = answering.prepared(edges, given, scores)
    with Session(given["threads"]) as session:
        chosen = load_options(given)
        graph, _ = session.load(edges, chosen)
        from kingpost.core.export.verify_answer import verify_answer
        from kingpost.core.ingest.again import rereadings
        from kingpost.core.ingest.scores import read_scores
        from kingpost.core.insight.verify import NONE
        from kingpost.core.insight.verify import verify as judge

        foreign = read_scores(scores, graph, given["node_column"], given["score_column"])
        again = rereadings(list(edges), chosen, graph, session.watch)
        found = judge(graph, foreign, reload=again, watch=session.watch)
        session.release()
        session.line.clear()
        answering.deliver(verify_answer(graph, found), form, given)
    return NO_SUCH_ANSWER if found.verdict == NONE else ANSWERED
