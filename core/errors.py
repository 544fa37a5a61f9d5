"""Everything that can go wrong in a way a user can mend: one class per kind of trouble.

Each error carries one finished sentence, safe to print, and the exit status a shell should see.
"""

from __future__ import annotations

from typing import ClassVar

from kingpost.core.text import visible


class KingpostError(Exception):
    """Base of every error this package raises on purpose; ``str()`` is one printable sentence."""

    exit_status: ClassVar[int] = 2

    def __init__(self, sentence: str) -> None:
        super().__init__(visible(sentence))

    @property
    def sentence(self) -> str:
        """What is wrong, where, and what to do about it."""
        return str(self.args[0])


class InputError(KingpostError):
    """A file or table that cannot be used: missing, broken, empty, of the wrong shape or types."""


class UnclearColumns(InputError):
    """A table whose columns could be read in more than one way: somebody has to choose."""


class RowsError(InputError):
    """Rows that were refused: null ids, or negative, NaN or infinite weights."""


class SettingsError(KingpostError):
    """A setting outside its range, or settings that contradict each other."""


class OutputError(KingpostError):
    """A result that cannot be written where it was asked to go."""


class NodeNotFound(KingpostError):
    """A node that the graph does not hold."""


class Interrupted(KingpostError):
    """The user cancelled before there was any answer to keep."""

    exit_status: ClassVar[int] = 130
