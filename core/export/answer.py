"""Answers of the insights, in every format: sentences, sheets of typed columns, facts.

An insight's own file in this folder turns its answer into an :class:`Answer`; everything about
formats is here.  The first sheet is the one that csv, tsv and parquet hold, unless another is
asked for by name; json and the formats to be read hold all of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, BinaryIO

import numpy as np
import pyarrow as pa

from kingpost.core.errors import OutputError
from kingpost.core.export.cells import plain_ascii, wrap
from kingpost.core.export.data import ForwardOnly, csv_bytes, each_column
from kingpost.core.export.digits import number
from kingpost.core.export.formulas import Plain
from kingpost.core.export.json_rows import row_texts
from kingpost.core.export.jsonable import dumps, jsonable
from kingpost.core.export.layout import Column, escaped, markdown_table, terminal_table
from kingpost.core.export.rows import as_plain, shown
from kingpost.core.export.table import name_text, rank_text, value_text
from kingpost.core.text import listed, visible

FORMATS = ("table", "json", "csv", "tsv", "markdown", "parquet")
NAMES = 8  # columns that a column of ids is narrowed to at most
CAUTION = (
    "caution: this is the structure of the table and no assessment of safety or of people; before "
    "acting on it follow the local change procedure and review"
)


@dataclass(frozen=True)
class Field:
    """One column of a sheet.

    Attributes:
        name: its key in json, csv and parquet.
        values: the exact values.
        title: heading where it is read; None leaves it out there.
        texts: what is read, safe to show; made from the values where not given.
        data: False for a column that is only read.
    """

    name: str
    values: pa.Array
    title: str | None = None
    texts: list[str] | None = None
    align: str | None = None
    least: int | None = None
    optional: bool = False
    data: bool = True

    def column(self) -> Column:
        """As a column of a table to be read."""
        kind = self.values.type
        numeric = pa.types.is_integer(kind) or pa.types.is_floating(kind)
        texts = self.texts
        if texts is None:
            show = _id if self.least == NAMES else _cell
            texts = [show(value) for value in self.values.to_pylist()]
        align = self.align or (">" if numeric else "<")
        return Column(self.title or "", texts, align, self.least, self.optional)


@dataclass(frozen=True)
class Sheet:
    """A table of the answer: ``read`` False keeps it to data formats, ``data`` False to text."""

    name: str
    fields: list[Field]
    heading: str = ""
    read: bool = True
    data: bool = True

    def batch(self) -> pa.RecordBatch:
        """The exact values under their keys."""
        kept = [item for item in self.fields if item.data]
        return pa.RecordBatch.from_arrays([f.values for f in kept], names=[f.name for f in kept])


def read_only(title: str, cells: list[str], align: str = "<", least: int | None = None) -> Field:
    """A column that is only read."""
    return Field(title, pa.nulls(len(cells)), title, cells, align, least, data=False)


def spans(name: str, title: str, ends: Sequence[tuple[int, int]]) -> list[Field]:
    """Ranges of ranks: two columns as data, one where they are read; (-1, -1) for none."""
    shown = ["-" if low < 0 else rank_text(low, high) for low, high in ends]
    return [
        Field(f"{name}_low", whole([low for low, _ in ends])),
        Field(f"{name}_high", whole([high for _, high in ends])),
        read_only(title, shown, ">"),
    ]


@dataclass(frozen=True)
class Answer:
    """What a command found out.

    Attributes:
        head: sentences above the sheets, each safe to show.
        sheets: at least one of them data.
        facts: everything but the sheets, for json and for the metadata of parquet.
        tail: sentences below, cautions among them.
    """

    head: list[str]
    sheets: list[Sheet]
    facts: dict[str, Any]
    tail: list[str] = field(default_factory=list)

    def sheet(self, name: str | None) -> Sheet:
        """The sheet of that name, or the first.

        Raises:
            OutputError: if there is none of that name.
        """
        kept = [sheet for sheet in self.sheets if sheet.data]
        for sheet in kept:
            if name in (None, sheet.name):
                return sheet
        names = listed([sheet.name for sheet in kept], 9)
        raise OutputError(f"this answer has no sheet {name!r}; there are {names}")


def nodes_field(
    graph_labels: pa.Array, nodes: Any, name: str = "node", title: str | None = "node"
) -> Field:
    """Ids of some nodes, of the type they had in the table; -1 stands for none."""
    return Field(name, graph_labels.take(whole(nodes)), title, align="<", least=NAMES)


def _id(value: Any) -> str:
    return "-" if value is None else name_text(value)


def _cell(value: Any) -> str:
    if value is None:
        return "-"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int):
        return f"{value:,}"
    if isinstance(value, float):
        return "-" if value != value else number(value)
    return value_text(value)


def percent(part: float, decimals: int = 0) -> str:
    """A share, without a sign on nothing."""
    text = f"{part:.{decimals}%}"
    return text.removeprefix("-") if float(text.rstrip("%")) == 0 else text


def answer_text(answer: Answer, width: int = 80, *, ascii_only: bool = False) -> str:
    """The whole answer as lines of at most ``width`` columns."""
    lines: list[str] = []
    for sentence in answer.head:
        lines += wrap(sentence, width, "  ")
    for sheet in answer.sheets:
        if not sheet.read:
            continue
        columns = [item.column() for item in sheet.fields if item.title is not None]
        if ascii_only:
            columns = [_ascii(column) for column in columns]
        lines.append("")
        if sheet.heading:
            lines += wrap(sheet.heading, width, "  ")
        rows, left_out = terminal_table(columns, width, "~" if ascii_only else "…")
        lines += rows
        if left_out:
            lines.append(f"({left_out} more columns did not fit)")
    if answer.tail:
        lines.append("")
    for sentence in answer.tail:
        lines += wrap(sentence, width, "  ")
    text = "\n".join(line.rstrip() for line in lines) + "\n"
    return plain_ascii(text) if ascii_only else text


def answer_markdown(answer: Answer, *, ascii_only: bool = False) -> str:
    """The whole answer as Markdown: lists of sentences and pipe tables."""
    lines = [f"- {escaped(sentence)}" for sentence in answer.head]
    for sheet in answer.sheets:
        if sheet.read:
            columns = [item.column() for item in sheet.fields if item.title is not None]
            heading = [escaped(sheet.heading), ""] if sheet.heading else []
            lines += ["", *heading, *markdown_table(columns)]
    lines += ["", *(f"- {escaped(sentence)}" for sentence in answer.tail)] if answer.tail else []
    text = "\n".join(lines) + "\n"
    return plain_ascii(text) if ascii_only else text


def write_answer(
    answer: Answer,
    sink: BinaryIO,
    form: str,
    *,
    sheet: str | None = None,
    width: int = 80,
    ascii_only: bool = False,
    safe: bool = False,
    formulas: Plain | None = None,
) -> None:
    """Write an answer in one of :data:`FORMATS`.

    ``sheet`` names the sheet that csv, tsv and parquet hold; ``safe`` writes control characters
    out in csv and tsv, for a terminal; ``formulas`` makes text plain there that a spreadsheet
    would run.

    Raises:
        OutputError: for a sheet that the answer does not have.
    """
    if form == "json":
        sink.write(_json(answer, ascii_only).encode())
    elif form == "parquet":
        _parquet(answer, answer.sheet(sheet), sink)
    elif form in ("csv", "tsv"):
        from pyarrow import csv

        batch = each_column(answer.sheet(sheet).batch(), as_plain)
        if safe:
            batch = each_column(batch, shown)
        if formulas is not None:
            batch = each_column(batch, formulas)
        options = csv.WriteOptions(delimiter="," if form == "csv" else "\t")
        sink.write(csv_bytes(pa.Table.from_batches([batch]), options))
    elif form == "markdown":
        sink.write(answer_markdown(answer, ascii_only=ascii_only).encode())
    else:
        sink.write(answer_text(answer, width, ascii_only=ascii_only).encode())


def _json(answer: Answer, ascii_only: bool) -> str:
    """One object: the facts, ``notes`` (the sentences below), and every sheet by its name."""
    facts = {**answer.facts, "notes": answer.tail}
    parts = [dumps(facts, indent=2, ascii_only=ascii_only).removesuffix("\n}")]
    for sheet in answer.sheets:
        if sheet.data:
            rows = ",\n    ".join(row_texts(sheet.batch(), ascii_only))
            parts.append(
                f'  "{sheet.name}": [\n    {rows}\n  ]' if rows else f'  "{sheet.name}": []'
            )
    return ",\n".join(parts) + "\n}\n"


def _parquet(answer: Answer, sheet: Sheet, sink: BinaryIO) -> None:
    import pyarrow.parquet as pq

    table = pa.Table.from_batches([sheet.batch()])
    metadata = {"kingpost": dumps({**answer.facts, "notes": answer.tail, "sheet": sheet.name})}
    with pq.ParquetWriter(
        ForwardOnly(sink), table.schema.with_metadata(metadata), compression="zstd"
    ) as writer:
        writer.write_table(table.replace_schema_metadata(metadata))


def _ascii(column: Column) -> Column:
    cells = [plain_ascii(cell) for cell in column.cells]
    return Column(plain_ascii(column.title), cells, column.align, column.least, column.optional)


def graph_facts(graph: Any) -> dict[str, Any]:
    """Which graph an answer is about: input, size, account."""
    import dataclasses

    origin = dataclasses.asdict(graph.origin)
    size = {"name": graph.origin.name, "nodes": graph.n, "edges": graph.m}
    size |= {"directed": graph.directed, "weighted": graph.weighted}
    account = jsonable(dataclasses.asdict(graph.account))
    return {"input": jsonable(origin), "graph": size, "account": account}


def solve_facts(result: Any) -> dict[str, Any]:
    """How one result came about, for json."""
    import dataclasses

    from kingpost.core.export.data import settings

    return {
        "measure": result.measure,
        "settings": settings(result.settings),
        "conventions": jsonable(dict(result.conventions)),
        "stop": result.stop.value,
        "refused": None if result.refusal is None else result.refusal.sentence,
        "error_bound": jsonable(float(result.bound.value)),
        "bound_kind": result.bound.kind.value,
        "proven_order": result.proven_order if result.refusal is None else None,
        "seconds": jsonable(dataclasses.asdict(result.seconds)),
        "from_store_solved_on": result.solved_on,
    }


def whole(values: Sequence[int] | Any) -> pa.Array:
    """Whole numbers; -1 stands for none."""
    numbers = np.asarray(values, dtype=np.int64)
    return pa.array(numbers, mask=numbers < 0)


def reals(values: Sequence[float | None] | Any) -> pa.Array:
    """Numbers; NaN stays NaN in parquet and csv, null in json."""
    return pa.array(values, pa.float64())


def texts(values: Sequence[str | None]) -> pa.Array:
    """Sentences, safe to show as they are."""
    return pa.array([None if value is None else visible(value) for value in values], pa.string())
