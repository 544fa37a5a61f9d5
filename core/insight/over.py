"""The parameter of a sweep and its values, as they are written: ``damping=0.5:0.99:12``."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from kingpost.core.errors import SettingsError
from kingpost.core.measures.base import Settings
from kingpost.core.text import visible

FORMS = "NAME=FROM:TO:COUNT, NAME=FROM:TO:COUNT:log or NAME=VALUE,VALUE,..."
MOST = 1_000

# Ways of reading the table that can be swept too: name -> choices.
READING: Mapping[str, tuple[str, ...]] = {
    "weight_as": ("asis", "log1p", "inverse", "none"),
    "parallel": ("sum", "mean", "min", "max", "first", "count"),
    "loops": ("keep", "drop"),
}


NODES = ("teleport", "component")  # settings that name nodes: whatever it looks like, a word


@dataclass(frozen=True)
class Over:
    """What is swept.

    Attributes:
        name: the setting, as in Settings (``alpha_fraction``) or :data:`READING`.
        values: numbers, ascending, or words in the order given; no value twice.
        log: whether numbers are spaced, and halved between, by ratio.
    """

    name: str
    values: tuple[float, ...] | tuple[str, ...]
    log: bool = False

    @property
    def numeric(self) -> bool:
        """Whether the values are numbers."""
        return not isinstance(self.values[0], str)

    @property
    def flag(self) -> str:
        """The setting as it is written."""
        return self.name.replace("_", "-")

    def middle(self, low: float, high: float) -> float:
        """The value half way."""
        return math.sqrt(low) * math.sqrt(high) if self.log else low + (high - low) / 2

    def width(self, low: float, high: float) -> float:
        """How far two values are apart: their difference, or the logarithm of their ratio."""
        return math.log(high / low) if self.log else high - low


def parse_over(text: str) -> Over:
    """Read what ``--over`` says.

    Raises:
        SettingsError: if it is of none of the forms in :data:`FORMS`, or repeats a value.
    """
    name, equals, rest = text.partition("=")
    name = name.strip().lstrip("-").replace("-", "_")
    if not equals or not name or not rest.strip():
        raise SettingsError(f"--over is {visible(text, 60)!r}; it takes {FORMS}")
    if ":" in rest and name not in NODES:
        return _range(name, rest, text)
    words = [word.strip() for word in rest.split(",")]
    if "" in words:
        raise SettingsError(f"--over {visible(text, 60)} has an empty value; it takes {FORMS}")
    numbers = [_number(word) for word in words]
    if name not in NODES and all(number is not None for number in numbers):
        values = tuple(sorted(number for number in numbers if number is not None))
        if len(set(values)) < len(values):
            raise SettingsError(f"--over {visible(text, 60)} names a value twice; name it once")
        return Over(name, values)
    if len(set(words)) < len(words):
        raise SettingsError(f"--over {visible(text, 60)} names a value twice; name it once")
    return Over(name, tuple(words))


def _number(word: str) -> float | None:
    try:
        value = float(word)
    except ValueError:
        return None
    return value if math.isfinite(value) else None


def _range(name: str, rest: str, text: str) -> Over:
    parts = [part.strip() for part in rest.split(":")]
    low, high = (_number(part) for part in (*parts, "", "")[:2])
    spacing = parts[3] if len(parts) == 4 else "lin"
    counts = parts[2] if len(parts) in (3, 4) else ""
    good = counts.isascii() and counts.isdigit() and spacing in ("lin", "log")
    if low is None or high is None or not good:
        raise SettingsError(f"--over is {visible(text, 60)!r}; it takes {FORMS}")
    if not low < high:
        raise SettingsError(f"--over goes from {low:g} to {high:g}; the first must be the smaller")
    if not 2 <= int(counts) <= MOST:
        raise SettingsError(f"--over asks for {int(counts):,} values; it takes 2 to {MOST:,}")
    if spacing == "log" and not low > 0:
        raise SettingsError(f"--over starts at {low:g}; spaced by ratio it starts above 0")
    space = np.geomspace if spacing == "log" else np.linspace
    values = space(low, high, int(counts)).tolist()
    values[0], values[-1] = low, high
    if len(set(values)) < len(values):
        raise SettingsError(
            f"--over asks for {len(values):,} values from {low!r} to {high!r}, more than there are"
        )
    return Over(name, tuple(values), spacing == "log")


def whole(settings: type[Settings], name: str) -> bool:
    """Whether a setting takes whole numbers only."""
    default = next(item.default for item in dataclasses.fields(settings) if item.name == name)
    return isinstance(default, int) and not isinstance(default, bool)


def at(settings: Settings, over: Over, value: float | str) -> Settings:
    """The settings with one value of the parameter in place.

    Raises:
        SettingsError: for a setting the measure does not have, or a value out of its range.
    """
    fields = {item.name: item for item in dataclasses.fields(settings)}
    if over.name not in fields:
        flags = ", ".join(name.replace("_", "-") for name in fields)
        raise SettingsError(
            f"there is no setting {visible(over.flag, 40)} to sweep; there are {flags}"
        )
    field = fields[over.name]
    words = bool(field.metadata.get("choices")) or isinstance(field.default, str)
    if (words or over.name in NODES) != isinstance(value, str):
        told = f"{value:g}" if not isinstance(value, str) else repr(visible(value, 40))
        raise SettingsError(f"--{over.flag} takes {'words' if words else 'numbers'}, not {told}")
    changes: dict[str, Any] = {over.name: {value: 1.0} if over.name == "teleport" else value}
    if whole(type(settings), over.name) and not isinstance(value, str):
        if value != int(value):
            raise SettingsError(f"--{over.flag} takes whole numbers, not {value:g}")
        changes[over.name] = int(value)
    other = {"alpha": "alpha_fraction", "alpha_fraction": "alpha"}.get(over.name)
    if other in fields:
        changes[other] = None
    return dataclasses.replace(settings, **changes)
