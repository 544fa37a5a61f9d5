"""``kingpost EDGES...``: the screen, or the standings where there is no terminal to draw on."""

from __future__ import annotations

import os
import sys
from typing import TYPE_CHECKING, Any

import click

from kingpost.core.errors import SettingsError
from kingpost.core.measures import NAMES
from kingpost.tui.commands import options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import load_options

if TYPE_CHECKING:
    from collections.abc import Callable

    from kingpost.core.graph import Graph
    from kingpost.core.measures.base import Settings


@click.command(cls=Sectioned, hidden=True, add_help_option=False)
@options.edges_if_any
@options.loading
@options.measure
@options.showing
def screen(edges: tuple[str, ...], **given: Any) -> int:
    """Open the screen on a table of edges."""
    for path in edges:
        if path in ("rank", "audit", "node") and not os.path.exists(path):
            raise click.UsageError(f"{path} is a command and comes first: kingpost {path} EDGES...")
    piped = "-" in edges and sys.stdout.isatty() and not sys.stdin.isatty()
    if piped:
        from kingpost.tui.commands.piped import take_keyboard

        piped = take_keyboard(given["threads"])
    if not sys.stdout.isatty() or not (piped or sys.stdin.isatty()):
        if not edges:
            raise click.UsageError("no edge table was named; kingpost --help shows how")
        from kingpost.tui.commands.rank import answer

        return answer(edges, given)
    from kingpost.tui import config, terminal

    if given["fresh"] and given["resume"]:
        raise click.UsageError("--fresh and --resume ask for opposite things; give one of them")
    found = config.read()
    slow = given["slow_link"] or found.slow_link
    terminal.prepare_environment(slow=slow)  # the toolkit reads it when it is imported
    from kingpost.tui.running import run

    measure = given["measure"]
    if not named("measure") and found.measure:
        measure = found.measure
    status: int = run(
        list(edges),
        # Made in the loading job: the first frame does not wait for Arrow.
        lambda: load_options(given),
        measure,
        settings_asked_for(given | {"measure": measure}),
        threads=given["threads"],
        store=options.store_wanted(),
        slow=slow,
        # What comes through a pipe is never the table of last time.
        kept="fresh" if given["fresh"] or piped else "take" if given["resume"] else "ask",
        config=found,
    )
    return status


def named(option: str) -> bool:
    """Whether an option stands on the command line, rather than having its default."""
    source = click.get_current_context().get_parameter_source(option)
    return source is not click.core.ParameterSource.DEFAULT


def settings_asked_for(given: dict[str, Any]) -> Callable[[Graph], Settings] | None:
    """What makes the settings once the graph is there; None without any, to open at once.

    Raises:
        click.UsageError, KingpostError: before a screen is opened, for what cannot be.
    """
    from kingpost.tui.commands.choices import given_settings

    values = given_settings(given)
    if not values and given["measure"] in NAMES:
        return None
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import build, check_takers
    from kingpost.tui.commands.rank import build_early

    chosen = measure(given["measure"])
    check_takers(values, [chosen])
    build_early(chosen, values)

    def make(graph: Graph) -> Settings:
        try:
            return build(chosen, values, graph).settings
        except click.UsageError as error:
            raise SettingsError(error.format_message()) from None

    return make
