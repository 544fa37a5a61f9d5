"""``kingpost EDGES...``: the screen, or the standings where there is no terminal to draw on."""

from __future__ import annotations

import os
import sys
from typing import Any

import click

from kingpost.tui.commands import options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import load_options


@click.command(cls=Sectioned, hidden=True, add_help_option=False)
@options.edges
@options.loading
@options.measure
def screen(edges: tuple[str, ...], **given: Any) -> int:
    """Open the screen on a table of edges."""
    for path in edges:
        if path in ("rank", "audit", "node") and not os.path.exists(path):
            raise click.UsageError(f"{path} is a command and comes first: kingpost {path} EDGES...")
    if not sys.stdout.isatty() or not sys.stdin.isatty():
        from kingpost.tui.commands.rank import answer

        return answer(edges, given)
    from kingpost.core.measures import measure
    from kingpost.tui.app import run
    from kingpost.tui.commands.choices import build, check_takers, given_settings

    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    settings = build(chosen, values, None).settings
    status: int = run(
        list(edges), load_options(given), chosen.name, settings, threads=given["threads"]
    )
    return status
