"""``kingpost report``: one file that a colleague can read without the tool."""

from __future__ import annotations

from pathlib import PurePath
from typing import TYPE_CHECKING, Any

import click

from kingpost.core.errors import OutputError
from kingpost.tui.commands import answering, options
from kingpost.tui.commands.front import Sectioned
from kingpost.tui.commands.session import Session, load_options

if TYPE_CHECKING:
    from kingpost.core.insight.over import Over
    from kingpost.core.measures.base import Measure

USUAL = "surfer,eigenvector,katz,degree"
ROWS = 20
_ENDINGS = {".html": "html", ".htm": "html", ".md": "markdown", ".markdown": "markdown"}


@click.command(cls=Sectioned)
@options.edges
@options.insight("--question", metavar="TEXT", help="what the report answers; its title")
@options.insight(
    "--measures",
    metavar="A,B,...",
    default=USUAL,
    help=f"measures to tell of; the first leads [{USUAL}]",
)
@options.insight(
    "--shortlist",
    multiple=True,
    metavar="FILE|NODE",
    help="nodes to tell more about: a file with columns node and note, or a node (repeatable)",
)
@options.insight(
    "--marked", is_flag=True, help="the shortlist is what was marked on the screen for EDGES"
)
@options.insight(
    "--along",
    metavar="NAME=FROM:TO:COUNT",
    help="follow the first nodes along a parameter, or none "
    "[damping=0.5:0.95:10 for surfer, alpha-fraction=0.1:0.95:10 for katz]",
)
@options.within
@options.loading
@options.settings
@options.top(f"rows of the standings [{ROWS}]")
@options.output("html", "markdown")
@click.pass_context
def report(context: click.Context, /, edges: tuple[str, ...], **given: Any) -> int:
    """Write a report on EDGES: answer, standings, agreement, shortlist, proof, how to repeat it.

    The file holds everything: no script, nothing from the network.  The kind is told by the name
    of --out (*.html, *.md) or by --format.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands import again, writing
    from kingpost.tui.commands.choices import build, check_takers, given_settings
    from kingpost.tui.commands.rank import build_early

    form, out = _form(given), given["out"]
    lists = _lists(given["shortlist"])
    read = [*edges, *writing.named_files(given), *lists[0]]
    writing.check_places(form, out, inputs=read)
    names = answering.names_of(given["measures"])
    if not names:
        raise click.UsageError("--measures names no measure")
    if given["window"] is not None and given["within"] is None:
        raise click.UsageError("--window goes with --within COLUMN")
    if given["marked"] and given["shortlist"]:
        raise click.UsageError("--marked and --shortlist exclude each other; give one")
    values = given_settings(given)
    measures = [measure(name) for name in names]
    check_takers(values, measures)
    for one in measures:
        build_early(one, values)
    over = _over(given["along"], measures[0], values)
    from kingpost.core.export.report.shortlist import read_shortlist

    listed = [entry for path in lists[0] for entry in read_shortlist(path)]
    listed += [(name, "") for name in lists[1]]
    if given["marked"]:
        listed = _marked(edges)

    with Session(given["threads"]) as session:
        graph, seconds = session.load(edges, load_options(given))
        from kingpost.core.export.report import material as stuff
        from kingpost.core.export.report import report_text
        from kingpost.core.export.report.shortlist import entries

        shortlist = tuple(entries(graph, listed))
        for entry in shortlist:  # names on the command line must exist; a file may be of before
            if entry.node < 0 and entry.name in lists[1]:
                graph.find(entry.name)
        results = answering.solve_all(session, graph, names, values, seconds)
        refused = answering.refusal({names[0]: results[names[0]]})
        if refused is not None:
            return refused
        agreement = None
        if sum(result.refusal is None for result in results.values()) > 1:
            from kingpost.core.insight.agree import agree

            agreement = agree(graph, results, watch=session.watch)
        within = None
        if given["within"] is not None:
            from kingpost.core.insight.cohorts import within as rescaled

            leading = results[names[0]]
            within = rescaled(graph, leading, given["within"], given["window"], session.watch)
        sweep = None
        if over is not None and not (over.name == "alpha_fraction" and graph.structure.acyclic):
            from kingpost.core.insight.sweep import sweep as follow

            settings = build(measures[0], values, graph).settings
            sweep = follow(graph, names[0], settings, over, watch=session.watch)
        files = [*graph.origin.files, *writing.named_files(given), *lists[0]]
        material = stuff.Material(
            graph,
            results,
            question=given["question"] or "",
            agreement=agreement,
            shortlist=shortlist,
            within=within,
            sweep=sweep,
            top=options.limit_of(given["top"], ROWS) or ROWS,
            command=again.command_line(context),
            made=stuff.now(),
            versions=stuff.versions(),
            sources=stuff.sources(files, session.watch),
            remarks=build(measures[0], values, graph).remarks,
        )
        session.line.show("writing the report")
        text = report_text(material, form)
        session.release()
        session.line.clear()
        writing.write_text(text, out)
        return answering.status_of(session, results)


_USUAL = {"surfer": "damping=0.5:0.95:10", "katz": "alpha_fraction=0.1:0.95:10"}


def _over(words: str | None, leading: Measure, values: dict[str, Any]) -> Over | None:
    """The parameter to follow: as asked, else a usual one, else none.

    Raises:
        click.UsageError: for one that is no number, or given already.
        SettingsError: for one that the measure does not have, or values out of range.
    """
    from kingpost.core.insight.over import at, parse_over
    from kingpost.tui.commands.choices import build

    if words is None and leading.name == "katz" and "alpha" in values:
        return None
    words = _USUAL.get(leading.name, "none") if words is None else words
    if words == "none":
        return None
    over = parse_over(words)
    if not over.numeric:
        raise click.UsageError("--along of a report takes numbers; kingpost sweep takes words too")
    rest = {name: value for name, value in values.items() if name != over.name}
    for value in over.values:
        at(build(leading, rest, None).settings, over, value)
    return over


def _form(given: dict[str, Any]) -> str:
    """html or markdown, by --format or by the name of --out."""
    if given["form"] is not None:
        return str(given["form"])
    ending = PurePath(given["out"]).suffix.lower() if given["out"] else ".md"
    if ending not in _ENDINGS:
        raise OutputError(f"{given['out']} is no *.html or *.md; add --format html or markdown")
    return _ENDINGS[ending]


def _lists(words: tuple[str, ...]) -> tuple[list[str], list[str]]:
    """Files of names, and names themselves."""
    import os

    files = [word for word in words if os.path.isfile(word)]
    return files, [word for word in words if word not in files]


def _marked(edges: tuple[str, ...]) -> list[tuple[str, str]]:
    """What the screen keeps for these tables."""
    from kingpost.tui.models.marks import read

    marks = read(list(edges))
    if not marks:
        raise click.UsageError("nothing is marked for these tables; mark nodes on the screen first")
    return [(mark.name, mark.note) for mark in marks]
