"""``kingpost rank``: the standings as a table or as data."""

from __future__ import annotations

from pathlib import PurePath
from typing import Any

import click

from kingpost.core import warm
from kingpost.core.errors import OutputError
from kingpost.tui.commands import options
from kingpost.tui.commands.front import NO_SUCH_ANSWER, Sectioned, complain
from kingpost.tui.commands.session import Session, load_options

TABLE_ROWS = 20
_ENDINGS = {
    ".json": "json",
    ".csv": "csv",
    ".tsv": "tsv",
    ".md": "markdown",
    ".markdown": "markdown",
    ".parquet": "parquet",
}


@click.command(cls=Sectioned)
@options.edges
@options.loading
@options.measure
@options.within
@options.top(f"rows to give, or all [{TABLE_ROWS} in table and markdown, all in the others]")
@options.output(*options.FORMATS)
@options.log
def rank(edges: tuple[str, ...], **given: Any) -> int:
    """Print the standings of EDGES, the highest score first.

    Data formats (json, csv, tsv, parquet) are exact; what is meant to be read (table, markdown)
    writes control characters out.  rank is the place in the list, rank_low to rank_high the
    places that are possible within the error bound and ties.  With --within both are ranks by
    z, the score rescaled among peers, so that age or tier alone does not win.
    """
    return answer(edges, given)


def answer(edges: tuple[str, ...], given: dict[str, Any]) -> int:
    """Load, solve, print; returns the exit status."""
    from kingpost.core.measures import measure
    from kingpost.tui.commands import writing
    from kingpost.tui.commands.choices import build, check_takers, given_settings

    out, log = given.get("out"), given.get("log")
    form = format_of(given.get("form"), out)
    writing.check_places(form, out, log, [*edges, *writing.named_files(given)])
    chosen = measure(given["measure"])
    values = given_settings(given)
    check_takers(values, [chosen])
    build_early(chosen, values)
    formulas = writing.plain_text(given, form)
    within = given.get("within")
    if given.get("window") is not None and within is None:
        raise click.UsageError("--window goes with --within COLUMN")

    warm.expect(chosen.name)
    with Session(given["threads"]) as session:
        graph, load_seconds = session.load(edges, load_options(given))
        writing.check_places(form, out, log, graph.origin.files)
        choice = build(chosen, values, graph)
        result = session.solve(chosen, graph, choice.settings, load_seconds)
        if result.refusal is not None:
            session.check()
            complain(result.refusal.sentence)
            return NO_SUCH_ANSWER
        peers = None
        if within is not None:
            from kingpost.core.insight.cohorts import within as rescaled

            peers = rescaled(graph, result, within, given.get("window"), session.watch)
            session.line.clear()
        session.release()
        from kingpost.core.export.rows import Ranking

        usual = TABLE_ROWS if form in ("table", "markdown") else None
        limit = options.limit_of(given.get("top"), usual)
        ranking = Ranking(graph, result, limit, choice.remarks, peers)
        if log is not None:
            writing.write_log(result, log)
        writing.write_ranking(ranking, form, out, session.watch, formulas)
        status = session.status(result)
    session.tell_shortfall(result)
    return status


def build_early(chosen: Any, values: dict[str, Any]) -> None:
    """Refuse settings out of range before a large table is read for nothing."""
    from kingpost.tui.commands.choices import build

    build(chosen, values, None)


def format_of(form: str | None, out: str | None) -> str:
    """The format asked for, else what the name of the output file says, else a table."""
    if form is not None:
        return form
    ending = PurePath(out).suffix.lower() if out else ""
    if ending in _ENDINGS:
        return _ENDINGS[ending]
    if ending not in ("", ".txt"):
        raise OutputError(f"{out} does not tell a format by its name; add --format")
    return "table"
