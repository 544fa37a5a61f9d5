"""``kingpost pack``: a compiled graph with its results in a folder, to be carried elsewhere."""

from __future__ import annotations

from typing import Any

import click

from kingpost.core.text import count, visible
from kingpost.tui.commands import options
from kingpost.tui.commands.front import ANSWERED, Sectioned, SectionOption
from kingpost.tui.commands.session import Session, load_options


@click.command(cls=Sectioned)
@options.edges
@options.loading
@click.option(
    "--out",
    cls=SectionOption,
    section=options.OUTPUT,
    metavar="FOLDER",
    required=True,
    help="a new folder, or a pack to put this one in place of; whole or not at all",
)
def pack(edges: tuple[str, ...], **given: Any) -> int:
    """Compile EDGES into a folder that opens at once: kingpost FOLDER.

    The folder holds the graph, its structure and the results solved so far, as Arrow IPC files
    with a checksum of each.  It holds every id and weight of the table: treat it like the table.
    """
    from kingpost.core.open import describe
    from kingpost.core.store.pack import check_place, write_pack

    out: str = given["out"]
    check_place(out)
    with Session(given["threads"]) as session:
        chosen = load_options(given)
        described = describe(list(edges), chosen, session.watch)
        graph, _ = session.load(edges, chosen)
        results = write_pack(graph, out, chosen, described, session.watch)
    held = f"{count(graph.n, 'node')}, {count(graph.m, 'edge')}, {count(results, 'result')}"
    click.echo(f"packed {visible(graph.origin.name, 60)} into {visible(out)}: {held}")
    return ANSWERED
