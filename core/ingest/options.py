"""How an edge table is to be read: every option with its choices, validated as one value."""

from __future__ import annotations

from dataclasses import dataclass, fields

from kingpost.core.errors import SettingsError

CHOICES: dict[str, tuple[str, ...]] = {
    "parallel": ("sum", "mean", "min", "max", "first", "count"),
    "loops": ("keep", "drop"),
    "bad_rows": ("refuse", "skip"),
    "weight_as": ("asis", "log1p", "inverse", "none"),
    "read_as": ("guess", "parquet", "csv", "tsv", "arrow", "matrix-market", "graphml"),
    "header": ("guess", "yes", "no"),
    "memory": ("check", "ignore"),
}

_NAMES = ("source", "target", "weight", "nodes", "node_id")


@dataclass(frozen=True, kw_only=True)
class LoadOptions:
    """How rows become edges.

    Attributes:
        source, target: columns that hold the two ends of an edge; guessed where None.
        weight: column of strengths (not distances); guessed where None, and where nothing can
            be guessed every row counts 1.
        nodes: a Parquet or CSV file of node attributes, joined by id.
        node_id: the id column of that file; guessed where None.
        directed: whether u -> v and v -> u are different edges.
        parallel: what becomes of rows that name the same edge: their weights are added up
            (``sum``, in row order), averaged, the least, greatest or first is taken, or the
            rows are counted and their weights ignored (``count``).
        loops: whether edges from a node to itself are kept; the node stays in either case.
        bad_rows: rows with a null id, or a weight that is null, negative, NaN or infinite, are
            refused with their counts, or skipped and counted.
        weight_as: applied after merging: ``asis``; ``log1p``, the natural logarithm of 1 + w;
            ``inverse``, 1 / w, for weights that are distances; ``none``, the column is ignored
            and every row counts 1.
        where: an SQL expression over the columns of the edge table; rows for which it is true
            are read, the others are counted and otherwise not looked at.
        node_where: an SQL expression over the columns of the nodes table; nodes for which it is
            true stay, with the edges among them (the induced subgraph).
        read_as: the format of the edge table; by its first bytes and its name where ``guess``.
        delimiter: what separates the fields of a text table; guessed where None.
        encoding: of a text table, as Python names it; UTF-8 where None and no mark says else.
        header: whether the first line of a text table holds the names of its columns; where
            ``guess``, it does unless it holds numbers only.
        memory: whether a table that is not going to fit in memory is refused before it is read.

    Raises:
        SettingsError: for a value that is none of the choices.
    """

    source: str | None = None
    target: str | None = None
    weight: str | None = None
    nodes: str | None = None
    node_id: str | None = None
    directed: bool = True
    parallel: str = "sum"
    loops: str = "keep"
    bad_rows: str = "refuse"
    weight_as: str = "asis"
    where: str | None = None
    node_where: str | None = None
    read_as: str = "guess"
    delimiter: str | None = None
    encoding: str | None = None
    header: str = "guess"
    memory: str = "check"

    def __post_init__(self) -> None:
        for name, choices in CHOICES.items():
            value = getattr(self, name)
            if value not in choices:
                flag = "--" + name.replace("_", "-")
                raise SettingsError(f"{flag} is {value!r}; it takes {', '.join(choices)}")
        for item in fields(self):
            value = getattr(self, item.name)
            if item.name in _NAMES and value is not None:
                flag = "--" + item.name.replace("_", "-")
                if not isinstance(value, str) or not value:
                    raise SettingsError(f"{flag} is {value!r}; it takes a name")
        if self.delimiter is not None and (
            len(self.delimiter) != 1 or not self.delimiter.isascii() or self.delimiter in '"\r\n'
        ):
            raise SettingsError(
                f"--delimiter is {self.delimiter!r}; it takes one character, such as , or ;"
            )
        if self.encoding is not None:
            try:
                "a".encode(self.encoding)
            except (LookupError, UnicodeError):
                raise SettingsError(
                    f"--encoding is {self.encoding!r}; it takes a text encoding such as latin-1, "
                    "cp1252 or utf-16"
                ) from None
        if self.source is not None and self.source == self.target:
            raise SettingsError(
                f"--source and --target both name {self.source!r}; an edge needs two columns"
            )
        if self.node_id is not None and self.nodes is None:
            raise SettingsError("--node-id names a column of --nodes FILE, which is not given")

    @property
    def reads_weight(self) -> bool:
        """Whether the values of a weight column play any part."""
        return self.weight_as != "none" and self.parallel != "count"
