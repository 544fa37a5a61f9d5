"""Every option of the command line, once: name, type, help and the heading it stands under.

This file must stay importable without numpy, so the fields of the measures' settings are named
here in words.  A measure added later works without a line here: ``--set`` reaches every field.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

from kingpost.core.measures import NAMES
from kingpost.tui.commands.front import SectionOption

F = TypeVar("F", bound=Callable[..., Any])

FORMATS = ("table", "json", "csv", "tsv", "markdown", "parquet")

LOADING, MEASURE, OUTPUT, QUESTION = "Loading", "Measure", "Output", "Question"
SCREEN = "Screen"

# Names of the options whose values are fields of a measure's settings.
SETTINGS = (
    "flow",
    "damping",
    "dangling",
    "teleport",
    "alpha",
    "alpha_fraction",
    "beta",
    "role",
    "inverse_temperature",
    "scale",
    "link",
    "division",
    "diagonal",
    "unit",
    "counting",
    "attribute",
    "itself",
    "budget",
    "log2m",
    "seed",
    "component",
    "certificate",
    "tol",
    "stop",
    "max_sweeps",
)


class Count(click.ParamType):  # type: ignore[type-arg]
    """A whole number from 1, or one of a few words."""

    name = "N"

    def __init__(self, *words: str) -> None:
        self.words = words

    def convert(self, value: Any, param: Any, ctx: Any) -> Any:
        if isinstance(value, int) or value in self.words:
            return value
        if not (value.isascii() and value.isdigit() and int(value) > 0):
            words = " or ".join(["a number from 1", *self.words])
            self.fail(f"{value!r} is not {words}", param, ctx)
        return int(value)


def _option(section: str, *names: str, **about: Any) -> Callable[[F], F]:
    return click.option(*names, cls=SectionOption, section=section, **about)


def _stack(*decorators: Callable[[F], F]) -> Callable[[F], F]:
    def apply(command: F) -> F:
        for decorate in reversed(decorators):
            command = decorate(command)
        return command

    return apply


_NO_STORE = "kingpost.no_store"


def _without_store(ctx: click.Context, param: click.Parameter, given: bool) -> None:
    # Kept with the context, so that no command has to hand it on.
    if given:
        ctx.meta[_NO_STORE] = True


def store_wanted() -> bool:
    """Whether the command that runs now may use the store."""
    ctx = click.get_current_context(silent=True)
    return ctx is None or not ctx.meta.get(_NO_STORE, False)


no_store = _option(
    LOADING,
    "--no-store",
    is_flag=True,
    expose_value=False,
    callback=_without_store,
    help="read and solve anew, and keep nothing for next time",
)

edges = click.argument("edges", nargs=-1, required=True, metavar="EDGES...")
edges_if_any = click.argument("edges", nargs=-1, metavar="[EDGES...]")

loading = _stack(
    _option(LOADING, "--source", metavar="COLUMN", help="column an edge starts at [guessed]"),
    _option(LOADING, "--target", metavar="COLUMN", help="column an edge leads to [guessed]"),
    _option(LOADING, "--weight", metavar="COLUMN", help="column of strengths [guessed]"),
    _option(LOADING, "--nodes", metavar="FILE", help="table of node attributes"),
    _option(LOADING, "--node-id", metavar="COLUMN", help="id column of --nodes [guessed]"),
    _option(LOADING, "--undirected", is_flag=True, help="read every edge both ways"),
    _option(
        LOADING,
        "--parallel",
        type=click.Choice(["sum", "mean", "min", "max", "first", "count"]),
        default="sum",
        help="what repeated edges become [sum]",
    ),
    _option(
        LOADING,
        "--loops",
        type=click.Choice(["keep", "drop"]),
        default="keep",
        help="edges from a node to itself [keep]",
    ),
    _option(
        LOADING,
        "--bad-rows",
        type=click.Choice(["refuse", "skip"]),
        default="refuse",
        help="rows with null ids or negative, NaN or infinite weights [refuse]",
    ),
    _option(
        LOADING,
        "--weight-as",
        type=click.Choice(["asis", "log1p", "inverse", "none"]),
        default="asis",
        help="how a weight becomes a strength [asis]",
    ),
    _option(
        LOADING,
        "--where",
        metavar="SQL",
        help="read only the rows of EDGES for which this SQL expression is true",
    ),
    _option(
        LOADING,
        "--node-where",
        metavar="SQL",
        help="keep only the nodes for which this expression over --nodes is true",
    ),
    _option(
        LOADING,
        "--read-as",
        type=click.Choice(["guess", "parquet", "csv", "tsv", "arrow", "matrix-market", "graphml"]),
        default="guess",
        metavar="FORMAT",
        help="parquet, csv, tsv, arrow, matrix-market or graphml [by the file itself]",
    ),
    _option(LOADING, "--delimiter", metavar="C", help="what separates fields of text [guessed]"),
    _option(LOADING, "--encoding", metavar="NAME", help="of text [utf-8]"),
    _option(
        LOADING,
        "--header",
        type=click.Choice(["guess", "yes", "no"]),
        default="guess",
        help="whether the first line of text names the columns [yes, unless it holds numbers]",
    ),
    _option(
        LOADING,
        "--memory",
        type=click.Choice(["check", "ignore"]),
        default="check",
        help="refuse a table that is predicted not to fit in memory [check]",
    ),
    _option(
        LOADING,
        "--threads",
        type=Count(),
        metavar="N",
        help="threads to use [all this process may]",
    ),
    no_store,
)

settings = _stack(
    _option(
        MEASURE,
        "--flow",
        metavar="WAY",
        help="score flows along the edges or against them [along]",
    ),
    _option(
        MEASURE,
        "--damping",
        type=float,
        metavar="D",
        help="surfer: probability of following an edge [0.85]",
    ),
    _option(
        MEASURE,
        "--dangling",
        metavar="MODE",
        help="surfer: where nodes without out-edges send score: teleport, uniform or leak",
    ),
    _option(
        MEASURE,
        "--teleport",
        multiple=True,
        metavar="NODE|FILE",
        help="surfer: jump to this node (repeatable), or by the weights in a two-column file",
    ),
    _option(
        MEASURE,
        "--alpha",
        type=float,
        metavar="A",
        help="katz: attenuation per edge, below 1/rho",
    ),
    _option(
        MEASURE,
        "--alpha-fraction",
        type=float,
        metavar="F",
        help="katz: attenuation as a fraction of 1/rho",
    ),
    _option(
        MEASURE,
        "--beta",
        metavar="B",
        help="katz: what every node has of itself: a number, a node attribute, or a file",
    ),
    _option(
        MEASURE,
        "--role",
        metavar="WHAT",
        help="hits: score authorities (authority) or hubs (hub) [authority]",
    ),
    _option(
        MEASURE,
        "--inverse-temperature",
        type=float,
        metavar="T",
        help="communicability, subgraph: T in e^(T A/rho), how much long walks count [1]",
    ),
    _option(
        MEASURE,
        "--scale",
        metavar="WHAT",
        help="communicability, subgraph: divide A by rho (rho) or not (none) [rho]",
    ),
    _option(
        MEASURE,
        "--link",
        metavar="WHAT",
        help="votes: what an outcome earns: laplace, skew or logistic [laplace]",
    ),
    _option(
        MEASURE,
        "--division",
        metavar="WHAT",
        help="votes: each divides one vote (vote), or rows by opponents met (games) [vote]",
    ),
    _option(
        MEASURE,
        "--diagonal",
        type=float,
        metavar="X",
        help="votes: what a node earns with itself: 0, or 0.5 for a draw [0]",
    ),
    _option(
        MEASURE,
        "--unit",
        type=float,
        metavar="M",
        help="votes: margin that counts as one in the logistic link [the mean margin]",
    ),
    _option(
        MEASURE,
        "--counting",
        metavar="WHAT",
        help="degree: add the weights of a node's edges (strength) or count them (edges)",
    ),
    _option(
        MEASURE,
        "--attribute",
        metavar="COLUMN",
        help="reach: add up this node attribute instead of counting nodes",
    ),
    _option(
        MEASURE,
        "--itself",
        metavar="WHAT",
        help="reach: whether a node is part of its own reach: apart or counted [apart]",
    ),
    _option(
        MEASURE,
        "--budget",
        type=float,
        metavar="VISITS",
        help="reach, harmonic, subgraph: edge visits up to which the answer is exact",
    ),
    _option(
        MEASURE,
        "--log2m",
        type=int,
        metavar="M",
        help="reach, harmonic: 2^M random ranks or counters for an estimate",
    ),
    _option(
        MEASURE,
        "--seed",
        type=int,
        metavar="N",
        help="reach, harmonic: which random numbers an estimate draws [1]",
    ),
    _option(
        MEASURE,
        "--component",
        metavar="NODE",
        help="eigenvector, hits, votes: answer within the component of this node",
    ),
    _option(
        MEASURE,
        "--certificate",
        metavar="WHAT",
        help="eigenvector: bound every score (componentwise) or only rho (bracket)",
    ),
    _option(
        MEASURE,
        "--tol",
        type=float,
        metavar="E",
        help="proven error asked for, as a share of the sum of the scores [1e-10]",
    ),
    _option(
        MEASURE,
        "--stop",
        metavar="WHEN",
        help="bound: at --tol; order:K: once the order of the top K is proven [bound]",
    ),
    _option(MEASURE, "--max-sweeps", type=int, metavar="N", help="give up after N sweeps [10000]"),
    _option(
        MEASURE,
        "--set",
        "also",
        multiple=True,
        metavar="NAME=VALUE",
        help="any setting of the measure by its name (repeatable)",
    ),
)

measure = _stack(
    _option(
        MEASURE,
        "--measure",
        default="surfer",
        metavar="NAME",
        help=f"{', '.join(NAMES)} [surfer]",
    ),
    settings,
)


showing = _stack(
    _option(SCREEN, "--fresh", is_flag=True, help="begin a new sitting without being asked"),
    _option(SCREEN, "--resume", is_flag=True, help="take up the sitting that was kept, unasked"),
    _option(
        SCREEN,
        "--slow-link",
        is_flag=True,
        help="fewer frames and less traffic, for a slow connection",
    ),
)


def insight(*names: str, **about: Any) -> Callable[[F], F]:
    """An option of one insight, under the heading of its question."""
    return _option(QUESTION, *names, **about)


def limit_of(top: int | str | None, default: int | None) -> int | None:
    """What ``--top`` asks for as a number of rows, None for all."""
    if top is None:
        return default
    return top if isinstance(top, int) else None


_spreadsheet = _option(
    OUTPUT,
    "--spreadsheet-safe",
    is_flag=True,
    help="csv, tsv: an apostrophe before text that a spreadsheet would run as a formula",
)

within = _stack(
    _option(
        QUESTION,
        "--within",
        metavar="COLUMN",
        help="rank by scores rescaled among peers: nodes of like value in this node attribute",
    ),
    _option(
        QUESTION,
        "--window",
        type=Count(),
        metavar="N",
        help="--within a number or date: compare with the N nodes nearest by it [1000]",
    ),
)


def output(*formats: str) -> Callable[[F], F]:
    """``--format`` with these choices, ``--out``, and what only delimited text needs."""
    more = [_spreadsheet] if "csv" in formats else []
    return _stack(
        _option(
            OUTPUT,
            "--format",
            "form",
            type=click.Choice(formats),
            help=f"{', '.join(formats)} [by the name of --out, else table]",
            metavar="FORMAT",
        ),
        _option(OUTPUT, "--out", metavar="FILE", help="write here, whole or not at all"),
        *more,
    )


def top(words: str) -> Callable[[F], F]:
    """``--top``."""
    return _option(OUTPUT, "--top", type=Count("all"), metavar="N", help=words)


log = _option(
    OUTPUT, "--log", metavar="FILE", help="write the sweeps to FILE (*.csv, *.json, *.parquet)"
)
