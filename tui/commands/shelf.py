"""``kingpost shelf``: what is kept between runs, how much it takes, and taking it away."""

from __future__ import annotations

import datetime as dt
from typing import TYPE_CHECKING, Any

import click

from kingpost.core.errors import InputError, OutputError
from kingpost.core.text import count, visible
from kingpost.tui.commands import options
from kingpost.tui.commands.front import ANSWERED, Sectioned, SectionOption

if TYPE_CHECKING:
    from kingpost.core.store.shelf import Entry, Shelf


@click.command(cls=Sectioned)
@click.argument("names", nargs=-1, metavar="[NAME]...")
@click.option(
    "--clear",
    cls=SectionOption,
    section=options.QUESTION,
    is_flag=True,
    help="take away the graphs called NAME with their results, or everything",
)
@options.output("table", "json")
def shelf(names: tuple[str, ...], **given: Any) -> int:
    """List what is kept between runs: compiled graphs and finished results.

    A graph is called like its edge table, or by the first characters of its key.  All of it can
    be made again from the tables.
    """
    from kingpost.core.store.sealed import StoreTrouble
    from kingpost.core.store.shelf import Shelf
    from kingpost.tui.commands import writing

    out = given["out"]
    form = given["form"] or ("json" if out and out.lower().endswith(".json") else "table")
    writing.check_places(form, out)
    kept = Shelf()
    try:
        gone = kept.clear(names) if given["clear"] else None
        chosen = gone if gone is not None else kept.chosen(names)
    except StoreTrouble as error:
        raise InputError(f"{error}; kingpost shelf lists what is there") from None
    except OSError as error:
        raise OutputError(f"the shelf cannot be cleared: {kept.why(error)}") from None
    if form == "json":
        from kingpost.core.export.jsonable import dumps

        ascii_only = out is None and writing.ascii_terminal()
        text = dumps(_facts(kept, chosen, gone), indent=2, ascii_only=ascii_only) + "\n"
    else:
        text = _text(kept, chosen, gone, writing.WIDE if out else writing.table_width())
        if out is None and writing.ascii_terminal():
            from kingpost.core.export.cells import plain_ascii

            text = plain_ascii(text)
    writing.write_text(text, out)
    return ANSWERED


def _facts(kept: Shelf, entries: list[Entry], gone: list[Entry] | None) -> dict[str, Any]:
    return {
        "folder": str(kept.root),
        "limit_bytes": kept.limit,
        "bytes": sum(entry.bytes for entry in entries),
        "cleared": gone is not None,
        "entries": [
            {
                "kind": entry.kind,
                "name": entry.name,
                "key": entry.place.name,
                "bytes": entry.bytes,
                "last_used": _when(entry.used),
                "made": entry.about.get("made") or entry.about.get("solved_on"),
                "nodes": entry.about.get("n"),
                "edges": entry.about.get("m"),
                "measure": entry.about.get("measure"),
                "settings": entry.about.get("settings"),
                "inputs": [pair[0] for pair in entry.about.get("inputs", ())],
            }
            for entry in entries
        ],
    }


def _text(kept: Shelf, entries: list[Entry], gone: list[Entry] | None, width: int) -> str:
    from kingpost.core.export.cells import wrap
    from kingpost.core.export.layout import Column, terminal_table
    from kingpost.core.store.shelf import in_bytes

    size = in_bytes(sum(entry.bytes for entry in entries))
    graphs = sum(entry.kind == "graph" for entry in entries)
    what = f"{count(graphs, 'graph')}, {count(len(entries) - graphs, 'result')}, {size}"
    place = visible(str(kept.root))
    if gone is not None:
        return "\n".join(wrap(f"taken away: {what}, from {place}", width, "  ")) + "\n"
    limit = f"at most {in_bytes(kept.limit)} are kept; what was used longest ago goes first"
    lines = wrap(f"{what} in {place}; {limit}", width, "  ")
    if entries:
        table = [
            Column("kept", [visible(entry.name, 60) for entry in entries], least=8),
            Column("what", [_what(entry) for entry in entries], least=10),
            Column("size", [in_bytes(entry.bytes) for entry in entries], ">"),
            Column("last used (UTC)", [_when(entry.used)[:16] for entry in entries]),
            Column("key", [entry.place.name[:8] for entry in entries]),
        ]
        lines += ["", *terminal_table(table, width)[0]]
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _what(entry: Entry) -> str:
    about = entry.about
    if not about:
        return f"{entry.kind}, damaged"
    if entry.kind == "graph":
        return f"{about['n']:,} nodes, {about['m']:,} edges"
    words = f"{about['measure']} {about['settings']}".rstrip()
    return visible(words, 80)


def _when(seconds: float) -> str:
    moment = dt.datetime.fromtimestamp(seconds, dt.UTC)
    return moment.isoformat(timespec="seconds").replace("+00:00", "Z").replace("T", " ")
