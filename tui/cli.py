"""The command line; imports no numpy, pyarrow, rich or textual until a command runs."""

from __future__ import annotations

import click

from kingpost.core.kernels import settings
from kingpost.tui.commands import (
    agree,
    audit,
    drift,
    node,
    pack,
    rank,
    report,
    screen,
    shelf,
    spectrum,
    sweep,
    synth,
    trial,
    verify,
    walk,
    why,
)
from kingpost.tui.commands.front import BARE, Front

EPILOG = """\
\b
kingpost calls.parquet                    open the screen (piped: print the standings)
kingpost rank calls.parquet --top 50      the standings as a table
kingpost rank calls.parquet --out ranks.csv
kingpost audit calls.parquet              what the table holds and how the graph is built
kingpost node calls.parquet billing       one node: ranks, who points at it, at whom it points

EDGES are Parquet files, folders or patterns, or the folder of one pack; a file that is called
like a command is reached as ./rank.  Node names that begin with a dash follow after --.

\b
Exit status: 0 answered; 1 answered without reaching the accuracy asked for;
2 unusable input or usage; 3 the mathematics has no such answer; 130 interrupted.
"""


@click.group(cls=Front, epilog=EPILOG, context_settings={"help_option_names": ["--help", "-h"]})
@click.version_option(package_name="kingpost", message="kingpost %(version)s")
def cli() -> None:
    """Which nodes carry a large sparse graph, with proof.

    Reads a table of edges and ranks its nodes; every score comes with an error bound, every
    ranking says how much of its order is proven.
    """


cli.commands[BARE] = screen.screen
cli.add_command(rank.rank)
cli.add_command(audit.audit)
cli.add_command(node.node)
cli.add_command(why.why)
cli.add_command(agree.agree)
cli.add_command(spectrum.spectrum)
cli.add_command(drift.drift)
cli.add_command(verify.verify)
cli.add_command(sweep.sweep)
cli.add_command(report.report)
cli.add_command(trial.trial)
cli.add_command(walk.walk)
cli.add_command(synth.synth)
cli.add_command(pack.pack)
cli.add_command(shelf.shelf)


def main() -> None:
    """Entry point of the installed program."""
    settings.look_for_blas = False
    cli.main()
