"""The registry of measures.  Adding one takes a file in this folder and a line here."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

from kingpost.core.errors import SettingsError

if TYPE_CHECKING:
    from kingpost.core.measures.base import Measure

# name -> module that defines MEASURE; imported on first use, so that asking for one measure
# does not load the solvers of all.
_MODULES = {
    "surfer": "kingpost.core.measures.surfer",
    "eigenvector": "kingpost.core.measures.eigenvector",
    "katz": "kingpost.core.measures.katz",
    "hits": "kingpost.core.measures.hits",
    "communicability": "kingpost.core.measures.communicability",
    "subgraph": "kingpost.core.measures.subgraph",
    "votes": "kingpost.core.measures.votes",
    "degree": "kingpost.core.measures.degree",
    "reach": "kingpost.core.measures.reach",
    "harmonic": "kingpost.core.measures.harmonic",
}

NAMES = tuple(_MODULES)

# What is shown side by side without being asked for: the measures this tool is about, and the
# strength they are compared with.  The others are solved on request.
COMPANY = ("surfer", "eigenvector", "katz", "degree")


def measure(name: str) -> Measure:
    """The measure called ``name``.

    Raises:
        SettingsError: if there is none of that name.
    """
    if name not in _MODULES:
        raise SettingsError(f"no measure is called {name!r}; there are {', '.join(NAMES)}")
    found: Measure = import_module(_MODULES[name]).MEASURE
    return found
