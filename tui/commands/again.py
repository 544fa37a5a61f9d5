"""The command line that repeats a run, from what was given and nothing else."""

from __future__ import annotations

import shlex

import click
from click.core import ParameterSource


def command_line(context: click.Context) -> str:
    """``kingpost report calls.parquet --measures surfer,katz``: arguments first, then options."""
    words: list[str] = []
    options: list[str] = []
    for parameter in context.command.get_params(context):
        name = parameter.name or ""
        if context.get_parameter_source(name) is not ParameterSource.COMMANDLINE:
            continue
        value = context.params.get(name)  # what a callback takes care of has none
        if isinstance(parameter, click.Argument):
            words += map(str, value if isinstance(value, tuple) else [value])
            continue
        flag = max(parameter.opts, key=len)
        if getattr(parameter, "is_flag", False):
            options.append(flag)
            continue
        if value is None:
            continue
        for one in value if isinstance(value, tuple) else [value]:
            options += [flag, str(one)]
    dashed = ["--", *words] if any(word.startswith("-") for word in words) else words
    parts = [*options, *dashed] if dashed is not words else [*words, *options]
    return shlex.join(["kingpost", context.info_name or "", *parts])
