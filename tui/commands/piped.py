"""A table through a pipe and a screen at the same time: the keyboard is the terminal's own."""

from __future__ import annotations

import os
import sys


def take_keyboard(threads: int | None = None) -> bool:
    """Read standard input to its end, then put the controlling terminal in its place.

    False, with nothing read, where there is no terminal to take keys from.

    Raises:
        InputError: if standard input is empty or cannot be kept.
        Interrupted: after Ctrl-C.
    """
    try:
        keyboard = os.open("/dev/tty", os.O_RDWR)
    except OSError:
        return False
    from kingpost.core.ingest.stdin import spooled
    from kingpost.tui.commands.session import Session

    try:
        with Session(threads) as session:
            spooled(session.watch)
        sys.stdin.flush()
        os.dup2(keyboard, 0)
    finally:
        os.close(keyboard)
    return True
