"""How the command line takes words apart and how it ends: help, errors, exit statuses."""

from __future__ import annotations

import contextlib
import os
import sys
import traceback
from collections.abc import Sequence
from typing import Any, NoReturn

import click

from kingpost.core.errors import Interrupted, KingpostError
from kingpost.core.text import visible

ANSWERED, SHORT_OF_ACCURACY, UNUSABLE, NO_SUCH_ANSWER, FAULT, INTERRUPTED = 0, 1, 2, 3, 70, 130

# The name of the command that a bare `kingpost EDGES...` runs; no table can be called so.
BARE = ""


class Sectioned(click.Command):
    """A command whose help lists its options under the headings they were given."""

    def format_options(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        write_sections(self, ctx, formatter)


class SectionOption(click.Option):
    """An option that knows the heading it stands under."""

    def __init__(self, *names: Any, section: str = "Options", **about: Any) -> None:
        self.section = section
        super().__init__(*names, **about)


def write_sections(
    command: click.Command, ctx: click.Context, formatter: click.HelpFormatter
) -> None:
    """Write a command's options in its help, by heading."""
    sections: dict[str, list[tuple[str, str]]] = {}
    for option in command.get_params(ctx):
        record = option.get_help_record(ctx)
        if record is not None and isinstance(option, click.Option):
            sections.setdefault(getattr(option, "section", "Other"), []).append(record)
    for heading, records in sections.items():
        with formatter.section(heading):
            formatter.write_dl(records)


class Front(click.Group):
    """A group of named commands that takes anything else for the tables of the bare command."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        if not args and not (sys.stdin.isatty() and sys.stdout.isatty()):
            raise click.UsageError("no edge table was named; kingpost --help shows how")
        own = {name for option in self.get_params(ctx) for name in option.opts}
        if not args or (args[0] not in self.commands and args[0] not in own):
            args = [BARE, *args]
        return super().parse_args(ctx, args)

    def format_usage(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        formatter.write_usage("kingpost", "EDGES... [OPTIONS]")
        formatter.write_usage("kingpost", "COMMAND EDGES... [OPTIONS]", prefix="       ")

    def format_options(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        self.format_commands(ctx, formatter)
        bare = self.commands[BARE]
        write_sections(bare, click.Context(bare, parent=ctx), formatter)

    def main(self, args: Sequence[str] | None = None, **extra: Any) -> NoReturn:  # type: ignore[override]
        """Run, and leave with the status of the answer; trouble is one sentence."""
        extra.pop("standalone_mode", None)
        sys.exit(self._status(args, extra))

    def _status(self, args: Sequence[str] | None, extra: dict[str, Any]) -> int:
        extra["prog_name"] = "kingpost"
        try:
            status = super().main(args, standalone_mode=False, **extra)
            sys.stdout.flush()
            return status if isinstance(status, int) else ANSWERED
        except click.exceptions.Exit as leave:
            return leave.exit_code
        except click.ClickException as trouble:
            complain(" ".join(trouble.format_message().split()))
            return UNUSABLE
        except (KeyboardInterrupt, click.Abort, Interrupted):
            complain("interrupted")
            return INTERRUPTED
        except KingpostError as trouble:
            complain(trouble.sentence)
            return trouble.exit_status
        except MemoryError:
            complain("there is not enough memory for this graph and these settings")
            return UNUSABLE
        except BrokenPipeError:
            silence_output()
            return ANSWERED
        except Exception:
            # Not an answer and not bad input: a status of its own keeps scripts from
            # mistaking a fault of the program for either.
            traceback.print_exc()
            complain("this is a fault of the program; please report the lines above")
            return FAULT


def complain(sentence: str) -> None:
    """One line on standard error, safe on any terminal and in any encoding."""
    text = f"kingpost: {visible(sentence)}"
    encoding = getattr(sys.stderr, "encoding", None) or "ascii"
    with contextlib.suppress(OSError, ValueError):
        print(text.encode(encoding, "backslashreplace").decode(encoding), file=sys.stderr)


def silence_output() -> None:
    """Whoever read our output has gone: let the interpreter flush into nothing on its way out."""
    with contextlib.suppress(OSError, ValueError):
        null = os.open(os.devnull, os.O_WRONLY)
        os.dup2(null, sys.stdout.fileno())
        os.close(null)
