"""A report as one HTML file: no scripts, no network, light and dark, screen and paper."""

from __future__ import annotations

import re
from html import escape

from kingpost.core.export.report.blocks import (
    RIGHT,
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
from kingpost.core.export.report.style import STYLE

# Nothing may be loaded or run, whatever the data says.
_POLICY = "default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'"


def html(document: Document) -> str:
    """The whole file as text, to be written in UTF-8."""
    writer = _Writer()
    body = writer.sections(document.blocks)
    contents = "".join(
        f'<li><a href="#{name}">{escape(text)}</a></li>' for name, text in writer.contents
    )
    title = escape(document.title)
    return f"""<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<title>{title}</title>
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<meta name="referrer" content="no-referrer">
<meta http-equiv="Content-Security-Policy" content="{_POLICY}">
<style>
{STYLE}</style>
</head>
<body>
<a class="skip" href="#begin">To the report</a>
<header>
<h1>{title}</h1>
<p>{escape(document.about)}</p>
<nav aria-label="Contents"><ul>{contents}</ul></nav>
</header>
<main id="begin">
{body}</main>
</body>
</html>
"""


_BRIEF = 28  # characters of cells that are not broken into lines


class _Writer:
    def __init__(self) -> None:
        self.contents: list[tuple[str, str]] = []
        self._taken: set[str] = {"begin"}

    def sections(self, blocks: list[Block]) -> str:
        """Blocks in sections, one for every heading of level 2."""
        parts, is_open = [], False
        for block in blocks:
            if isinstance(block, Heading) and block.level == 2:
                name = self._name(block.text)
                self.contents.append((name, block.text))
                parts.append("</section>\n" if is_open else "")
                parts.append(f'<section aria-labelledby="{name}">\n')
                parts.append(f'<h2 id="{name}">{escape(block.text)}</h2>\n')
                is_open = True
            else:
                parts.append(self._block(block))
        return "".join(parts) + ("</section>\n" if is_open else "")

    def _name(self, text: str) -> str:
        plain = re.sub(r"[^a-z0-9]+", "-", text.lower()).strip("-")[:40] or "part"
        if not plain[0].isalpha():
            plain = f"part-{plain}"
        name, number = plain, 1
        while name in self._taken:
            number += 1
            name = f"{plain}-{number}"
        self._taken.add(name)
        return name

    def _block(self, block: Block) -> str:
        if isinstance(block, Heading):
            return f"<h3>{escape(block.text)}</h3>\n"
        if isinstance(block, Words):
            kind = ' class="strong"' if block.strong else ""
            return f"<p{kind}>{escape(block.text)}</p>\n"
        if isinstance(block, Bullets):
            items = "".join(f"<li>{escape(item)}</li>\n" for item in block.items)
            return f"<ul>\n{items}</ul>\n" if items else ""
        if isinstance(block, Facts):
            pairs = "".join(
                f"<div><dt>{escape(name)}</dt><dd>{escape(words)}</dd></div>\n"
                for name, words in block.pairs
            )
            return f"<dl>\n{pairs}</dl>\n" if pairs else ""
        if isinstance(block, Code):
            return f'<pre tabindex="0"><code>{escape(block.text)}</code></pre>\n'
        if isinstance(block, Chart):
            caption = escape(block.caption)
            return f"<figure>\n{block.svg}\n<figcaption>{caption}</figcaption>\n</figure>\n"
        return self._table(block)

    def _table(self, table: Table) -> str:
        name = self._name(f"table {table.caption}")
        heads = "".join(
            f'<th scope="col"{_side(column.align)}>{escape(column.title)}</th>'
            for column in table.columns
        )
        sides = {id(column): _side(column.align, column.cells) for column in table.columns}
        rows = []
        for row in range(len(table.columns[0].cells)):
            cells = "".join(
                f'<th scope="row"{sides[id(column)]}>{escape(column.cells[row])}</th>'
                if column.head
                else f"<td{sides[id(column)]}>{escape(column.cells[row])}</td>"
                for column in table.columns
            )
            kind = ' class="marked"' if row in table.marked else ""
            rows.append(f"<tr{kind}>{cells}</tr>\n")
        return (
            f'<div class="wide" role="region" aria-labelledby="{name}" tabindex="0">\n<table>\n'
            f'<caption id="{name}">{escape(table.caption)}</caption>\n'
            f"<thead><tr>{heads}</tr></thead>\n<tbody>\n{''.join(rows)}</tbody>\n</table>\n</div>\n"
        )


def _side(align: str, cells: list[str] | None = None) -> str:
    """The class of a cell: numbers to the right, and what is short on one line."""
    if align == RIGHT:
        return ' class="number"'
    brief = cells is not None and all(len(cell) <= _BRIEF for cell in cells)
    return ' class="brief"' if brief else ""
