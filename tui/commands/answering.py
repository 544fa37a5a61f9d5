"""What the commands of the insights share: formats, solving several measures, delivering."""

from __future__ import annotations

import sys
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING, Any, BinaryIO, TypeVar

import click

from kingpost.tui.commands import options
from kingpost.tui.commands.front import (
    ANSWERED,
    NO_SUCH_ANSWER,
    SectionOption,
    complain,
)

if TYPE_CHECKING:
    from kingpost.core.export.answer import Answer
    from kingpost.core.graph import Graph
    from kingpost.core.result import Result
    from kingpost.tui.commands.session import Session

F = TypeVar("F", bound=Callable[..., Any])


def output(sheets: str) -> Callable[[F], F]:
    """``--format``, ``--out`` and ``--sheet``; ``sheets`` lists the names it takes."""
    listed = [name.strip() for name in sheets.split(",")]

    def apply(command: F) -> F:
        command = click.option(
            "--sheet",
            cls=SectionOption,
            section=options.OUTPUT,
            type=click.Choice(listed),
            metavar="NAME",
            help=f"what csv, tsv and parquet hold: {sheets} [{listed[0]}]",
        )(command)
        return options.output(*options.FORMATS)(command)

    return apply


def prepared(edges: tuple[str, ...], given: dict[str, Any], *more: str | None) -> str:
    """The format wanted, after checking that the answer will find a place.

    Raises:
        OutputError: for what could not be written.
    """
    from kingpost.tui.commands import writing
    from kingpost.tui.commands.rank import format_of

    form = format_of(given.get("form"), given.get("out"))
    read = [*edges, *writing.named_files(given), *(name for name in more if name)]
    writing.check_places(form, given.get("out"), inputs=read)
    writing.plain_text(given, form)
    return form


def names_of(words: str) -> list[str]:
    """The measures of ``a,b,c``.

    Raises:
        click.UsageError: for one named twice.
        SettingsError: for one that does not exist.
    """
    from kingpost.core.measures import measure

    names = [word.strip() for word in words.split(",") if word.strip()]
    for name in names:
        measure(name)
        if names.count(name) > 1:
            raise click.UsageError(f"{name} is named twice; name every measure once")
    return names


def solve_all(
    session: Session,
    graph: Graph,
    names: list[str],
    values: Mapping[str, Any],
    load_seconds: float = 0.0,
) -> dict[str, Result]:
    """The results of several measures, each with the options it takes.

    Raises:
        Interrupted: if it was cancelled, for an insight needs whole answers.
    """
    from kingpost.core.measures import measure
    from kingpost.tui.commands.choices import build

    found = {}
    for name in names:
        one = measure(name)
        found[name] = session.solve(one, graph, build(one, values, graph).settings, load_seconds)
        session.check()
    return found


def refusal(results: Mapping[str, Result]) -> int | None:
    """Say why a measure has no answer here and the status for it; None where all have one."""
    for result in results.values():
        if result.refusal is not None:
            complain(result.refusal.sentence)
            return NO_SUCH_ANSWER
    return None


def status_of(session: Session, results: Mapping[str, Result]) -> int:
    """The worst status of the results that are no refusals; says which fell short."""
    status = ANSWERED
    for result in results.values():
        if result.refusal is None:
            status = max(status, session.status(result))
            if not result.stop.accurate:
                complain(f"{result.measure}: {result.stop.value}: {result.reason}")
    return status


def deliver(answer: Answer, form: str, given: Mapping[str, Any]) -> None:
    """Write an answer where and how the options say."""
    from kingpost.core.export.answer import write_answer
    from kingpost.tui.commands import writing

    out = given.get("out")
    formulas = writing.plain_text(given, form)
    answer.sheet(given.get("sheet"))

    def write(sink: BinaryIO) -> None:
        write_answer(
            answer,
            sink,
            form,
            sheet=given.get("sheet"),
            width=writing.WIDE if out is not None else writing.table_width(),
            ascii_only=out is None and writing.ascii_terminal(),
            safe=out is None and sys.stdout.isatty(),
            formulas=formulas,
        )

    writing.deliver(write, out)
    writing.tell_changed(formulas)
