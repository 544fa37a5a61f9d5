"""A report as Markdown: the same blocks; drawings become the tables they show."""

from __future__ import annotations

from kingpost.core.export.layout import Column, escaped, markdown_table
from kingpost.core.export.report.blocks import (
    Block,
    Bullets,
    Chart,
    Code,
    Document,
    Facts,
    Heading,
    Table,
    Words,
)


def markdown(document: Document) -> str:
    """The whole file as text."""
    parts = [f"# {escaped(document.title)}", escaped(document.about)]
    parts += [text for text in map(_block, document.blocks) if text]
    return "\n\n".join(parts) + "\n"


def _block(block: Block) -> str:
    if isinstance(block, Heading):
        return f"{'#' * block.level} {escaped(block.text)}"
    if isinstance(block, Words):
        return f"**{escaped(block.text)}**" if block.strong else _line(block.text)
    if isinstance(block, Bullets):
        return "\n".join(f"- {escaped(item)}" for item in block.items)
    if isinstance(block, Facts):
        return "\n".join(f"- {escaped(name)}: {escaped(words)}" for name, words in block.pairs)
    if isinstance(block, Code):
        fence = "```"
        while fence in block.text:
            fence += "`"
        return f"{fence}sh\n{block.text}\n{fence}"
    if isinstance(block, Chart):
        words = _line(block.caption)
        return f"{words}\n\n{_table(block.table)}" if block.table is not None else words
    return _table(block)


def _line(text: str) -> str:
    # What would begin a heading, a list or a quotation at the start of a line is text here.
    text = escaped(text)
    head = text[:1]
    if head in "#+-=" or (head.isdigit() and text.lstrip("0123456789")[:1] in ".)"):
        mark = len(text) - len(text.lstrip("0123456789")) if head.isdigit() else 0
        return text[:mark] + "\\" + text[mark:]
    return text


def _table(table: Table) -> str:
    columns = [Column(item.title, item.cells, item.align) for item in table.columns]
    return "\n".join([escaped(table.caption), "", *markdown_table(columns)])
