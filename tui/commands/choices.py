"""From the words of the command line to the settings of a measure.

An option applies to every measure whose settings have a field of its name; nothing here knows a
measure by name.
"""

from __future__ import annotations

import dataclasses
import math
import os
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import click

from kingpost.core.text import id_text, visible
from kingpost.tui.commands.options import SETTINGS

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.measures.base import Measure, Settings


_VECTORS = ("teleport", "beta")  # what they mean depends on the graph


@dataclasses.dataclass(frozen=True)
class Choice:
    """Settings of one measure, and a sentence for each value that came from elsewhere."""

    settings: Settings
    remarks: dict[str, str] = dataclasses.field(default_factory=dict)


def given_settings(given: Mapping[str, Any]) -> dict[str, Any]:
    """The measure options that were actually given, by the names of their fields."""
    values = {name: given[name] for name in SETTINGS if given.get(name) not in (None, ())}
    for words in given.get("also") or ():
        name, equals, text = words.partition("=")
        name = name.strip().replace("-", "_")
        if not equals or not name:
            raise click.UsageError(f"--set {visible(words, 60)} is not of the form NAME=VALUE")
        values[name] = Word(text)
    return values


class Word(str):
    """A value of ``--set``: what it means depends on the field it is for."""

    __slots__ = ()

    def as_field(self, name: str, default: Any) -> Any:
        """The value in the type of a field's default; text where the default is None."""
        if isinstance(default, str) or default is None:
            return str(self)
        try:
            return int(self) if isinstance(default, int) else float(self)
        except ValueError:
            kind = "a whole number" if isinstance(default, int) else "a number"
            raise click.UsageError(
                f"--set {name}={visible(self, 40)}: {name} takes {kind}"
            ) from None


def check_takers(values: Mapping[str, Any], measures: list[Measure]) -> None:
    """Refuse an option that none of ``measures`` takes.

    Raises:
        click.UsageError: naming the measures that do take it.
    """
    for name in values:
        if any(name in field_names(measure) for measure in measures):
            continue
        from kingpost.core.measures import NAMES, measure

        takers = [other for other in NAMES if name in field_names(measure(other))]
        flag = "--" + name.replace("_", "-")
        whom = f"it belongs to {' and '.join(takers)}" if takers else "no measure takes it"
        names = " or ".join(measure.name for measure in measures)
        raise click.UsageError(f"{names} takes no {flag}; {whom}")


def field_names(measure: Measure) -> set[str]:
    """Names of a measure's settings."""
    return {item.name for item in dataclasses.fields(measure.settings)}


def build(measure: Measure, values: Mapping[str, Any], graph: Graph | None) -> Choice:
    """Settings of ``measure`` from the options it takes; the others are passed over.

    Vectors may name nodes, attributes and files; without a ``graph`` they are passed over, and
    only the ranges of the other values are checked.

    Raises:
        SettingsError: for a value out of range.
        NodeNotFound: for a teleport that names neither a node nor a file.
    """
    names = field_names(measure)
    defaults = {item.name: item.default for item in dataclasses.fields(measure.settings)}
    mine = {
        name: value.as_field(name, defaults[name]) if isinstance(value, Word) else value
        for name, value in values.items()
        if name in names and not (graph is None and name in _VECTORS)
    }
    remarks: dict[str, str] = {}
    if graph is None:
        return Choice(measure.settings(**mine))
    if "teleport" in mine:
        mine["teleport"], remarks["teleport"] = _teleport(mine["teleport"], graph)
    if "beta" in mine:
        mine["beta"], words = _beta(mine["beta"], graph)
        if words:
            remarks["beta"] = words
    return Choice(measure.settings(**mine), remarks)


def _teleport(words: tuple[str, ...], graph: Graph) -> tuple[Any, str]:
    """Nodes by name first, a file only where no node is called so."""
    from kingpost.core.errors import NodeNotFound

    try:
        nodes = [graph.find(word) for word in words]
    except NodeNotFound:
        if len(words) == 1 and os.path.isfile(words[0]):
            from kingpost.core.ingest import read_node_values

            return (
                read_node_values(words[0], graph),
                f"jumps by the weights in {visible(words[0], 80)}",
            )
        raise
    labels = [id_text(graph.label(node)) for node in nodes]
    return dict.fromkeys(labels, 1.0), f"jumps go in equal parts to {_few(words)}"


def _few(words: tuple[str, ...]) -> str:
    from kingpost.core.text import listed

    return listed([visible(word, 40) for word in words], 5)


def _beta(word: str, graph: Graph) -> tuple[Any, str]:
    """A number, else the name of a node attribute, else a file."""
    try:
        number = float(word)
    except ValueError:
        pass
    else:
        if math.isfinite(number):
            return number, ""
        raise click.UsageError(f"--beta is {word}; it takes a finite number")
    if graph.attributes is not None and word in graph.attributes.column_names:
        return _numbers(graph, word), f"by the node attribute {visible(word, 60)}"
    if os.path.isfile(word):
        from kingpost.core.ingest import read_node_values

        return read_node_values(
            word, graph
        ), f"by the values in {visible(os.path.basename(word), 80)}"
    raise click.UsageError(f"--beta {word} is neither a number, nor a node attribute, nor a file")


def _numbers(graph: Graph, name: str) -> Any:
    import pyarrow as pa
    import pyarrow.compute as pc

    from kingpost.core.errors import SettingsError

    assert graph.attributes is not None
    column = graph.attributes.column(name)
    try:
        values = pc.cast(column, pa.float64())
    except pa.ArrowException:
        raise SettingsError(
            f"--beta {name}: that attribute is {column.type}, not a number"
        ) from None
    if values.null_count:
        raise SettingsError(
            f"--beta {name}: that attribute is empty for {values.null_count:,} of {graph.n:,} "
            "nodes; fill them in a file of two columns and name the file"
        )
    return values.to_numpy()
