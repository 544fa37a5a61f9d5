"""``kingpost audit``: what a table holds, what became of its rows, how the graph is built."""

from __future__ import annotations

from typing import Any

import click

from kingpost.tui.commands import options
from kingpost.tui.commands.front import ANSWERED, Sectioned
from kingpost.tui.commands.session import Session, load_options


@click.command(cls=Sectioned)
@options.edges
@options.loading
@options.output("table", "json")
def audit(edges: tuple[str, ...], **given: Any) -> int:
    """Say what EDGES holds, what became of its rows, and how the graph is built."""
    from kingpost.tui.commands import writing

    out = given["out"]
    form = given["form"] or ("json" if out and out.lower().endswith(".json") else "table")
    writing.check_places(form, out, inputs=[*edges, *writing.named_files(given)])
    with Session(given["threads"]) as session:
        from kingpost.core.open import describe, predict

        described = describe(list(edges), load_options(given), session.watch)
        memory = predict(list(edges), load_options(given), session.watch)
        graph, _ = session.load(edges, load_options(given))
        from kingpost.core.export.audit_report import audit_json, audit_text
        from kingpost.core.export.jsonable import dumps
        from kingpost.core.insight.audit import examine

        answer = examine(graph, session.watch)
        session.release()
        ascii_only = out is None and writing.ascii_terminal()
        if form == "json":
            found = audit_json(graph, answer, described, memory)
            text = dumps(found, indent=2, ascii_only=ascii_only) + "\n"
        else:
            width = writing.WIDE if out else writing.table_width()
            text = audit_text(graph, answer, described, width, memory=memory, ascii_only=ascii_only)
        writing.write_text(text, out)
    return ANSWERED
