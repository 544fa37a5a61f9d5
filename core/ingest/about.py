"""What a table holds, from its footers alone: for a column chooser and for the audit."""

from __future__ import annotations

from dataclasses import dataclass

from kingpost.core.ingest.columns import guess_ends, guess_weight, is_numeric
from kingpost.core.ingest.files import Paths, open_parts
from kingpost.core.ingest.idtypes import family
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.watch import Watch


@dataclass(frozen=True)
class ColumnAbout:
    """One column: its type as text, what it could serve as, and its nulls where footers tell."""

    name: str
    type: str
    can_be_id: bool
    can_be_weight: bool
    nulls: int | None = None


@dataclass(frozen=True)
class TableAbout:
    """Files, rows and columns of an edge table, and the columns a load would take unasked."""

    files: tuple[str, ...]
    rows: int
    columns: tuple[ColumnAbout, ...]
    source: str | None
    target: str | None
    weight: str | None
    why: str


def about(
    paths: Paths, options: LoadOptions | None = None, watch: Watch | None = None
) -> TableAbout:
    """Describe the files; columns are those of the first."""
    parts = open_parts(paths, options, watch)
    first = parts[0]
    columns = tuple(
        ColumnAbout(
            name=item.name,
            type=str(item.type),
            can_be_id=family(item.type) is not None,
            can_be_weight=is_numeric(item.type),
            nulls=sum(part.nulls[item.name] for part in parts)
            if all(item.name in part.nulls for part in parts)
            else None,
        )
        for item in first.schema
    )
    ends = guess_ends(first)
    weight = guess_weight(first.schema, set(ends or ()))
    if ends is None:
        why = "no two columns are clearly the ends of an edge"
    else:
        why = f"{ends[0]} -> {ends[1]} by name or as the only two id columns of one type"
        why += f", {weight} by name as the weight" if weight else ", no column is named as a weight"
    return TableAbout(
        files=tuple(part.name for part in parts),
        rows=sum(part.rows for part in parts),
        columns=columns,
        source=ends[0] if ends else None,
        target=ends[1] if ends else None,
        weight=weight,
        why=why,
    )
