"""``kingpost EDGES...``: the screen, or the standings where there is no terminal to draw on."""

from __future__ import annotations

import os
import sys
from typing import TYPE_CHECKING, Any

import click

from kingpost.tui.commands import options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import load_options

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings


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
    from kingpost.tui.app import run

    status: int = run(
        list(edges),
        load_options(given),
        given["measure"],
        settings_asked_for(given),
        threads=given["threads"],
    )
    return status


def settings_asked_for(given: dict[str, Any]) -> Settings | None:
    """Settings from the options given; None without any, so that the screen opens at once.

    Raises:
        click.UsageError, KingpostError: before a screen is opened, for what cannot be.
    """
    from kingpost.tui.commands.choices import given_settings

    values = given_settings(given)
    if not values and given["measure"] in options.MEASURES:
        return None
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import build, check_takers

    chosen = measure(given["measure"])
    check_takers(values, [chosen])
    return build(chosen, values, None).settings
