"""From the command to the screen and back: the application is run, and what it leaves is told."""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Callable
from typing import TYPE_CHECKING

from kingpost.core.text import visible
from kingpost.tui import terminal
from kingpost.tui.app import PATIENCE, KingpostApp
from kingpost.tui.config import Config
from kingpost.tui.opening import ASK

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.measures.base import Settings


def run(
    paths: list[str],
    load_options: LoadOptions | Callable[[], LoadOptions] | None,
    measure: str,
    settings: Settings | Callable[[Graph], Settings] | None,
    *,
    threads: int | None = None,
    slow: bool = False,
    store: bool = True,
    kept: str = ASK,
    config: Config | None = None,
) -> int:
    """Open the screen on some edge tables; returns the exit status.

    Options and settings may be given as functions: they are then called in the loading job,
    settings with the graph, so that the first frame need not wait for the modules they need.
    ``kept`` says what becomes of a sitting over these tables that was kept.
    """
    config = config or Config()
    looks = terminal.decide(
        slow=slow,
        ascii_only=config.ascii,
        coloured=config.colour,
        background=config.background,
    )
    # The framework's own reading of NO_COLOR paints greys; our styles have no colour then.
    os.environ.pop("NO_COLOR", None)
    app = KingpostApp(
        paths,
        None,
        measure,
        settings,
        options=load_options,
        kept=kept,
        store=store,
        threads=threads,
        looks=looks,
        config=config,
    )
    try:
        status: int | None = app.run(mouse=False)
    except KeyboardInterrupt:
        status = 130
    ended = app.runner.shutdown(PATIENCE)
    if status is None:
        status = app.return_code or 1
    for note in app.opener.notes:  # the screen goes without; it is told where it stays to be read
        with contextlib.suppress(OSError):
            print(f"kingpost: note: {visible(note)}", file=sys.stderr)
    if app.sentence:
        # The terminal may have gone: then there is nobody to tell.
        with contextlib.suppress(OSError):
            print(f"kingpost: {app.sentence}", file=sys.stderr, flush=True)
    if not ended:
        # A thread deep in a library cannot be stopped; waiting for it would hang the shell.
        sys.stdout.flush()
        sys.stderr.flush()
        os._exit(status)
    return status
