"""What a report is made of, apart from the language it is written in.

Every text is safe to show (see :mod:`kingpost.core.text`); writers escape it for their language.
"""

from __future__ import annotations

from dataclasses import dataclass, field

LEFT, RIGHT = "<", ">"


@dataclass(frozen=True)
class Heading:
    """A section (level 2) or a part of one (level 3)."""

    text: str
    level: int = 2


@dataclass(frozen=True)
class Words:
    """A paragraph; ``strong`` for what must not be overlooked."""

    text: str
    strong: bool = False


@dataclass(frozen=True)
class Bullets:
    """Sentences of equal rank."""

    items: list[str]


@dataclass(frozen=True)
class Facts:
    """Names and what belongs to them."""

    pairs: list[tuple[str, str]]


@dataclass(frozen=True)
class Cells:
    """One column of a table; ``head`` marks the one that names the rows."""

    title: str
    cells: list[str]
    align: str = LEFT
    head: bool = False


@dataclass(frozen=True)
class Table:
    """Columns of equal length under a caption; ``marked`` are rows to stand out, by number."""

    caption: str
    columns: list[Cells]
    marked: frozenset[int] = frozenset()


@dataclass(frozen=True)
class Code:
    """Text to be copied as it stands."""

    text: str


@dataclass(frozen=True)
class Chart:
    """A drawing: SVG without outside references, its words for those who do not see it, and the
    same as a table for languages that do not draw."""

    svg: str
    caption: str
    table: Table | None = None


Block = Heading | Words | Bullets | Facts | Table | Code | Chart


@dataclass(frozen=True)
class Document:
    """A report: title, what it is about in a line, and its blocks in order."""

    title: str
    about: str
    blocks: list[Block] = field(default_factory=list)
