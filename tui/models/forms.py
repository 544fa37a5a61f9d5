"""A settings form made from a Settings type: fields, what they mean, what is wrong with a value."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from kingpost.core.errors import KingpostError
from kingpost.core.text import visible
from kingpost.tui.models.detail import on_screen

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings


@dataclass(frozen=True)
class Field:
    """One setting: its name, the text of its value, its meaning, its choices or its range.

    ``kind`` is choice, number, whole, text or fixed (given by file or list: shown, not edited).
    """

    name: str
    text: str
    words: str
    kind: str
    choices: tuple[str, ...] = ()
    reach: str = ""
    optional: bool = False

    @property
    def label(self) -> str:
        """The name as it is shown."""
        return self.name.replace("_", " ")


def fields_of(settings: Settings) -> list[Field]:
    """Every field of the settings, those of the measure itself before those all share."""
    own: list[Field] = []
    shared: list[Field] = []
    for item in dataclasses.fields(settings):
        found = _field(item, getattr(settings, item.name))
        (shared if item.name in ("tol", "stop", "max_sweeps") else own).append(found)
    return own + shared


def _field(item: dataclasses.Field[Any], value: Any) -> Field:
    about: Mapping[str, Any] = item.metadata
    annotation = str(item.type)
    if annotation == "Any" and value is not None:
        annotation = type(value).__name__
    choices = tuple(about.get("choices") or ())
    optional = "None" in annotation
    if choices and isinstance(value, (str, type(None))):
        kind = "choice" if "float" not in annotation and "Mapping" not in annotation else "text"
    elif isinstance(value, (Mapping, list, tuple)):
        kind = "fixed"
    elif "float" in annotation:
        kind = "number"
    elif "int" in annotation:
        kind = "whole"
    elif "str" in annotation:
        kind = "text"
    else:
        kind = "fixed"
    return Field(
        item.name,
        _text(value),
        str(about.get("words", "")),
        kind,
        choices,
        _reach(about),
        optional,
    )


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.12g}"
    if isinstance(value, Mapping):
        return f"{len(value):,} given"
    if isinstance(value, (list, tuple)):
        return visible(", ".join(map(str, value)), 200)
    return str(value)


def _reach(about: Mapping[str, Any]) -> str:
    low, high = about.get("low"), about.get("high")
    parts = []
    if low is not None:
        parts.append(f"{'above' if about.get('open_low') else 'from'} {low:g}")
    if high is not None:
        parts.append(f"{'below' if about.get('open_high') else 'to'} {high:g}")
    return " ".join(parts)


def validated(settings: Settings, texts: Mapping[str, str]) -> tuple[Settings | None, str]:
    """New settings from the texts of a form, or None and the sentence that says what is wrong."""
    values: dict[str, Any] = {}
    for found in fields_of(settings):
        text = texts.get(found.name, found.text).strip()
        if found.kind == "fixed" or text == found.text:
            continue
        if text == "" and found.optional:
            values[found.name] = None
            continue
        try:
            values[found.name] = _value(found, text)
        except (ValueError, OverflowError):
            wanted = "a whole number" if found.kind == "whole" else "a number"
            return (
                None,
                f"{found.label} is {visible(text, 40)!r}; it takes {wanted} {found.reach}".rstrip(),
            )
    try:
        return dataclasses.replace(settings, **values), ""
    except KingpostError as error:
        return None, on_screen(error.sentence)
    except (TypeError, ValueError) as error:
        return None, visible(str(error), 200)


def _value(found: Field, text: str) -> Any:
    if found.kind == "number":
        return float(text)
    if found.kind == "whole":
        return int(text.replace(",", "").replace("_", ""))
    return text
