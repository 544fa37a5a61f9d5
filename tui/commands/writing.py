"""Where answers go: standard output or a file, in which encoding, and what is refused."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Callable, Iterable, Mapping
from typing import TYPE_CHECKING, Any, BinaryIO

import click

from kingpost.core.errors import OutputError
from kingpost.tui.commands.front import complain, silence_output

if TYPE_CHECKING:
    from kingpost.core.export.formulas import Plain
    from kingpost.core.export.rows import Ranking
    from kingpost.core.result import Result
    from kingpost.core.watch import Watch

WIDE = 100  # columns of a table that no terminal limits


def check_places(
    form: str, out: str | None, log: str | None = None, inputs: Iterable[str] = ()
) -> None:
    """Refuse, before any work, what could not be written after it.

    Raises:
        OutputError: Parquet to a terminal, a folder that is missing, a log without a known
            ending, a file that is being read.
    """
    if form == "parquet" and out is None and sys.stdout.isatty():
        raise OutputError("parquet is no text for a terminal; add --out FILE, or use a pipe")
    if out is None and log is None:
        return
    from kingpost.core.export.files import check_target
    from kingpost.core.export.log import kind_of

    inputs = list(inputs)
    if out is not None:
        check_target(out, inputs)
    if log is not None:
        kind_of(log)
        check_target(log, inputs)
        if out is not None and os.path.realpath(log) == os.path.realpath(out):
            raise OutputError(f"--out and --log both name {out}; they need two files")


def named_files(given: Mapping[str, Any]) -> list[str]:
    """What options may name as files to be read: never to be written over."""
    words = [given.get("nodes"), given.get("beta"), *(given.get("teleport") or ())]
    return [word for word in words if word]


def ascii_terminal() -> bool:
    """Whether standard output cannot be trusted with more than ASCII.

    An explicit C or POSIX locale counts, although Python itself would write UTF-8 there.
    """
    encoding = (getattr(sys.stdout, "encoding", None) or "ascii").lower().replace("-", "")
    chosen = next((v for n in ("LC_ALL", "LC_CTYPE", "LANG") if (v := os.environ.get(n))), "")
    return encoding not in ("utf8", "utf8sig") or chosen in ("C", "POSIX")


def table_width() -> int:
    """Columns for a table on standard output."""
    return max(40, shutil.get_terminal_size((WIDE, 24)).columns)


def plain_text(given: Mapping[str, Any], form: str) -> Plain | None:
    """What ``--spreadsheet-safe`` asks for.

    Raises:
        click.UsageError: for a format that no spreadsheet takes formulas from.
    """
    if not given.get("spreadsheet_safe"):
        return None
    if form not in ("csv", "tsv"):
        raise click.UsageError(f"--spreadsheet-safe is for csv and tsv, not for {form}")
    from kingpost.core.export.formulas import Plain

    return Plain()


def tell_changed(formulas: Plain | None) -> None:
    """Say that exported text is not exact."""
    if formulas is not None and formulas.changed:
        complain(f"note: {formulas.sentence}")


def write_ranking(
    ranking: Ranking, form: str, out: str | None, watch: Watch, formulas: Plain | None = None
) -> None:
    """Write a ranking in a format, to a file or to standard output."""
    from kingpost.core.export import data, table

    ascii_only = out is None and ascii_terminal()
    on_terminal = out is None and sys.stdout.isatty()

    progress = None if on_terminal else watch  # two writers on one terminal garble each other

    def write(sink: BinaryIO) -> None:
        if form == "json":
            data.write_json(ranking, sink, progress, ascii_only=ascii_only)
        elif form == "parquet":
            data.write_parquet(ranking, sink, progress)
        elif form in ("csv", "tsv"):
            mark = "," if form == "csv" else "\t"
            data.write_delimited(
                ranking, sink, progress, delimiter=mark, safe=on_terminal, formulas=formulas
            )
        elif form == "markdown":
            sink.write(table.markdown(ranking, ascii_only=ascii_only).encode())
        else:
            width = WIDE if out is not None else table_width()
            sink.write(table.table(ranking, width, ascii_only=ascii_only).encode())

    deliver(write, out)
    tell_changed(formulas)


def write_log(result: Result, path: str) -> None:
    """Write the iterations of a solve to a file."""
    from kingpost.core.export.log import kind_of, write_log

    deliver(lambda sink: write_log(result, sink, kind_of(path)), path)


def write_text(text: str, out: str | None) -> None:
    """Write a finished text."""
    deliver(lambda sink: sink.write(text.encode()), out)


def deliver(write: Callable[[BinaryIO], Any], out: str | None) -> None:
    """Let ``write`` fill a file that appears whole, or standard output.

    A reader that has seen enough and closed the pipe is no trouble worth a word.

    Raises:
        OutputError: if the system refuses the bytes.
    """
    if out is not None:
        from kingpost.core.export.files import replacing

        with replacing(out) as sink:
            write(sink)
        return
    try:
        sys.stdout.flush()
        write(sys.stdout.buffer)
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        silence_output()
    except OSError as trouble:
        raise OutputError(f"standard output: {trouble.strerror or trouble}") from trouble
