"""``kingpost synth``: a made-up edge table of any size, the same for the same seed."""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from typing import Any, TypeVar

import click

from kingpost.tui.commands.front import ANSWERED, Sectioned, SectionOption
from kingpost.tui.commands.session import Session

F = TypeVar("F", bound=Callable[..., Any])

GRAPH, TABLE, OUTPUT = "Graph", "Table", "Output"

# As kingpost.core.gallery has them, in words, because this file loads without numpy.
KINDS = ("rmat", "citation", "layered", "powerlaw", "pairwise")
NAMES = ("number", "text")
WEIGHTS = ("own", "none", "pareto")
_SUFFIXES = {"k": 10**3, "K": 10**3, "M": 10**6, "G": 10**9}
_MOST = 10**12


class Size(click.ParamType):  # type: ignore[type-arg]
    """A whole number from 1, with k, M or G for thousands, millions or thousands of millions."""

    name = "N"

    def convert(self, value: Any, param: Any, ctx: Any) -> Any:
        if isinstance(value, int):
            return value
        factor = _SUFFIXES.get(value[-1:], 1)
        digits = (value[:-1] if factor > 1 else value).replace("_", "").replace(",", "")
        size = int(digits) * factor if digits.isascii() and digits.isdigit() else 0
        if not 1 <= size <= _MOST:
            self.fail(f"{value!r} is not a number from 1 to 1000G, such as 200M", param, ctx)
        return size


def _option(section: str, *names: str, **about: Any) -> Callable[[F], F]:
    return click.option(*names, cls=SectionOption, section=section, **about)


@click.command(cls=Sectioned)
@click.argument("kind", type=click.Choice(KINDS), metavar="KIND")
@_option(GRAPH, "--edges", type=Size(), required=True, metavar="N", help="rows, such as 200M")
@_option(GRAPH, "--nodes", type=Size(), metavar="N", help="ids to draw from [by --edges]")
@_option(
    GRAPH,
    "--seed",
    type=click.IntRange(0, 2**63 - 1),
    default=0,
    metavar="S",
    help="which random numbers are drawn [0]",
)
@_option(
    GRAPH,
    "--errors",
    type=click.FloatRange(0, 1),
    default=0.0,
    metavar="P",
    help="citation: share of references that point forward in time [0]",
)
@_option(
    TABLE,
    "--names",
    type=click.Choice(NAMES),
    default="number",
    help="ids: number (64 bits), or text (25 characters) [number]",
)
@_option(
    TABLE,
    "--weights",
    type=click.Choice(WEIGHTS),
    default="own",
    help="own (the kind's, if it has any), none, or pareto (drawn) [own]",
)
@_option(
    TABLE,
    "--time",
    "timed",
    is_flag=True,
    help="citation, layered, pairwise: a column of when each row happened",
)
@_option(OUTPUT, "--out", required=True, metavar="FILE", help="the Parquet file to write")
def synth(kind: str, **given: Any) -> int:
    """Write a made-up edge table of a KIND, the same for the same options and seed.

    \b
    rmat       R-MAT: skewed in- and out-degrees, a power of two of ids
    citation   papers that cite earlier ones and copy references; acyclic without --errors
    layered    calls between services in eight layers, some back up; weighted
    powerlaw   undirected, each edge once, degrees by a power law
    pairwise   contests: loser, winner and the margin

    Rows are written as drawn: rmat, layered and powerlaw may repeat an edge, rmat and layered may
    hold an edge from a node to itself.
    """
    from kingpost.core.export.files import check_target, replacing
    from kingpost.core.gallery import recipe
    from kingpost.core.gallery.tables import TableForm, write_parquet

    out = given["out"]
    check_target(out)
    form = TableForm(
        kind=kind,
        names=given["names"],
        weights=given["weights"],
        time=given["timed"],
        seed=given["seed"],
    )
    graph = recipe(
        kind, given["edges"], seed=given["seed"], nodes=given["nodes"], errors=given["errors"]
    )
    began = time.perf_counter()
    with Session() as session, replacing(out) as sink:
        write_parquet(graph, form, sink, session.watch)
    seconds = time.perf_counter() - began
    columns = ", ".join(form.schema(graph).names)
    hint = "" if graph.directed else "; each edge once: read it with --undirected"
    size = os.stat(out).st_size
    click.echo(
        f"{graph.edges:,} edges over {graph.n:,} ids ({columns}), {size:,} bytes, "
        f"{seconds:.1f} s{hint}"
    )
    return ANSWERED
