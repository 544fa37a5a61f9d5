"""Which columns are source, target and weight: as named, else guessed, and then said so."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterator
from dataclasses import dataclass

import pyarrow as pa
from pyarrow import types as pt

from kingpost.core.errors import InputError, RowsError, UnclearColumns
from kingpost.core.ingest.idtypes import common, family, plain, require_id
from kingpost.core.ingest.options import LoadOptions
from kingpost.core.ingest.parts import Part, columns_listed
from kingpost.core.text import listed

# Pairs of words that name the two ends of an edge u -> v; the likeliest first.
PAIRS = (
    ("source", "target"),
    ("source", "destination"),
    ("src", "dst"),
    ("src", "dest"),
    ("from", "to"),
    ("caller", "callee"),
    ("citing", "cited"),
    ("loser", "winner"),
    ("follower", "followee"),
    ("follower", "followed"),
    ("sender", "receiver"),
    ("sender", "recipient"),
    ("origin", "destination"),
    ("dependent", "dependency"),
    ("client", "server"),
    ("consumer", "provider"),
    ("consumer", "producer"),
    ("referrer", "referred"),
    ("voter", "candidate"),
    ("payer", "payee"),
    ("buyer", "seller"),
    ("debtor", "creditor"),
    ("tail", "head"),
    ("start", "end"),
    ("u", "v"),
    ("a", "b"),
    ("i", "j"),
    ("row", "col"),
    ("left", "right"),
    ("node1", "node2"),
    ("n1", "n2"),
)
# Words for how strong an edge is; the likeliest first.
WEIGHTS = (
    "weight", "weights", "w", "strength", "calls", "requests", "count", "counts", "cnt",
    "freq", "frequency", "times", "messages", "hits", "trips", "votes", "margin", "amount",
    "volume", "value", "flow", "traffic", "bytes", "n",
)  # fmt: skip
_GUESSABLE = ("integer", "text", "binary", "decimal")


@dataclass(frozen=True)
class Roles:
    """The columns chosen, the common type of the ids, and the sentences that say why."""

    source: str
    target: str
    weight: str | None
    id_type: pa.DataType
    notes: tuple[str, ...] = ()


def choose(parts: list[Part], options: LoadOptions) -> Roles:
    """Find the columns that ``options`` names, or guess them.

    Raises:
        InputError: if a named column is missing or of a type that cannot serve.
        UnclearColumns: if nothing or more than one thing can be guessed.
    """
    first = parts[0]
    for name in (options.source, options.target, options.weight):
        if name is not None:
            require_column(first.schema, name, first.name)
    if len(first.schema) < 2:
        raise InputError(
            f"{first.name} has {_few(first.schema)}; an edge table needs two id columns"
        )
    source, target = _ends(first, options)
    weight, guessed_weight = options.weight, False
    if weight is None and options.reads_weight:
        weight = guess_weight(first.schema, {source, target})
        guessed_weight = weight is not None
    if not options.reads_weight:
        weight = None
    kind = _id_type(parts, source, target)
    remarks: list[str] = []
    if weight is not None:
        _require_weight(parts, weight)
        remarks = _spoiled(parts, weight, options)
    guessed = options.source is None or options.target is None
    notes = _notes(source, target, weight, guessed, guessed_weight)
    return Roles(source, target, weight, kind, (*notes, *remarks))


def _notes(
    source: str, target: str, weight: str | None, guessed: bool, guessed_weight: bool
) -> tuple[str, ...]:
    if guessed and guessed_weight:
        return (
            f"took {source} -> {target} as the edge, {weight} as its weight "
            "(name them with --source, --target, --weight)",
        )
    if guessed:
        return (f"took {source} -> {target} as the edge (name them with --source, --target)",)
    if guessed_weight:
        return (
            f"took {weight} as the weight (name it with --weight, or ignore it with "
            "--weight-as none)",
        )
    return ()


def require_column(schema: pa.Schema, name: str, where: str) -> None:
    """Refuse a column name that the table lacks or holds twice."""
    found = schema.names.count(name)
    if found == 1:
        return
    if found > 1:
        raise InputError(f"{where} has {found} columns called {name!r}; rename them apart")
    lower = {other.lower(): other for other in schema.names}
    near = difflib.get_close_matches(name.lower(), list(lower), 3, 0.6)
    advice = f"; did you mean {', '.join(lower[item] for item in near)}?" if near else ""
    raise InputError(
        f"{where} has no column {name!r}{advice or ';'} its columns are {columns_listed(schema)}"
    )


def _few(schema: pa.Schema) -> str:
    if len(schema) == 0:
        return "no columns"
    return f"one column only, {columns_listed(schema)}"


def word_of(name: str) -> str:
    """``Caller_ID`` -> ``caller``: a column name without case, marks and the word id."""
    words = re.split(r"[^0-9a-z]+", re.sub(r"(?<=[a-z])(?=[A-Z])", "_", name).lower())
    kept = [word for word in words if word not in ("id", "ids", "name", "node", "key", "")]
    return "".join(kept) or "".join(words)


def _ends(part: Part, options: LoadOptions) -> tuple[str, str]:
    if options.source is not None and options.target is not None:
        return options.source, options.target
    pair = guess_ends(part, options.source, options.target, options.weight)
    if pair is None:
        lacking = "--source and --target"
        if options.source is not None:
            lacking = "--target"
        elif options.target is not None:
            lacking = "--source"
        raise UnclearColumns(
            f"it is not clear which columns of {part.name} are the two ends of an edge; name them "
            f"with {lacking}; its columns are {columns_listed(part.schema)}"
        )
    return pair


def guess_ends(
    part: Part, source: str | None = None, target: str | None = None, weight: str | None = None
) -> tuple[str, str] | None:
    """The two ends of an edge by name, else the only two id-like columns of one sort."""
    names = [item.name for item in part.schema if family(item.type) is not None]
    names = [name for name in names if part.schema.names.count(name) == 1 and name != weight]
    named = list(_named_pairs(names, source, target))
    meeting = [pair for pair in named if _meet(part, *pair)]
    # A pair whose types do not meet comes last: it will be refused with both types named.
    return (
        next(iter(meeting), None)
        or _only_pair(part, names, source, target)
        or next(iter(named), None)
    )


def _named_pairs(
    names: list[str], source: str | None, target: str | None
) -> Iterator[tuple[str, str]]:
    words = {name: word_of(name) for name in names}
    for first, second in PAIRS:
        starts = [name for name in names if words[name] == first]
        ends = [name for name in names if words[name] == second]
        if source is not None:
            starts = [source] if word_of(source) == first else []
        if target is not None:
            ends = [target] if word_of(target) == second else []
        if len(starts) == len(ends) == 1:
            yield starts[0], ends[0]


def _meet(part: Part, source: str, target: str) -> bool:
    kinds = [part.schema.field(name).type for name in (source, target)]
    if {family(kind) for kind in kinds} == {"integer", "text"}:
        whole = source if family(kinds[0]) == "integer" else target
        return whole in part.textual
    return common(*kinds) is not None or family(kinds[0]) is None


def _only_pair(
    part: Part, names: list[str], source: str | None, target: str | None
) -> tuple[str, str] | None:
    likely = [
        name
        for name in names
        if family(part.schema.field(name).type) in _GUESSABLE
        and not weight_word(name)
        and name not in part.partitions
    ]
    groups: dict[str, list[str]] = {}
    for name in likely:
        groups.setdefault(str(family(part.schema.field(name).type)), []).append(name)
    given = source or target
    if given is not None:
        group = groups.get(str(family(part.schema.field(given).type)), [])
        others = [name for name in group if name != given]
        if len(others) != 1:
            return None
        return (given, others[0]) if source is not None else (others[0], given)
    pairs = [group for group in groups.values() if len(group) >= 2]
    if len(pairs) != 1 or len(pairs[0]) != 2:
        return None
    return pairs[0][0], pairs[0][1]


def weight_word(name: str) -> str | None:
    """The word of WEIGHTS that a column name is, or begins as a rate (``calls_per_min``)."""
    lower = name.lower()
    if lower in WEIGHTS:
        return lower
    match = re.fullmatch(r"([a-z]+)_?(per_?[a-z]+|count|total|sum)", lower)
    return match[1] if match and match[1] in WEIGHTS else None


def guess_weight(schema: pa.Schema, taken: set[str]) -> str | None:
    """The numeric column whose name says strength; the first in the order of WEIGHTS."""
    found: dict[str, list[str]] = {}
    for item in schema:
        word = weight_word(item.name)
        if word and item.name not in taken and is_numeric(item.type):
            found.setdefault(word, []).append(item.name)
    best = next((found[word] for word in WEIGHTS if word in found), [])
    return best[0] if len(best) == 1 else None


def is_numeric(kind: pa.DataType) -> bool:
    """Whether a column of this type can be read as numbers (truth values apart)."""
    kind = plain(kind)
    return bool(pt.is_integer(kind) or pt.is_floating(kind) or pt.is_decimal(kind))


def _id_type(parts: list[Part], source: str, target: str) -> pa.DataType:
    kind: pa.DataType | None = None
    for part in parts:
        for name in (source, target):
            if part is not parts[0]:
                _require_shared(parts[0], part, name)
            require_id(part.schema.field(name).type, name, part.name)
    texts = _read_as_text([(part, name) for part in parts for name in (source, target)])

    def type_of(part: Part, name: str) -> pa.DataType:
        given = part.schema.field(name).type
        return pa.string() if texts and name in part.textual else given

    seen = {source: parts[0], target: parts[0]}
    for part in parts:
        for name in (source, target):
            here = type_of(part, name)
            there = type_of(seen[name], name)
            if common(there, here) is None:
                raise InputError(
                    f"column {name!r} is of type {plain(there)} in {seen[name].name} and of type "
                    f"{plain(here)} in {part.name}, which do not go together; cast one of them"
                )
            kind = plain(here) if kind is None else common(kind, here)
            if kind is None:
                raise InputError(
                    f"columns {source!r} ({plain(type_of(parts[0], source))}) and "
                    f"{target!r} ({plain(here)}) of {part.name} hold ids of different sorts; "
                    "cast one of them"
                )
    assert kind is not None
    return kind


def _read_as_text(ends: list[tuple[Part, str]]) -> bool:
    """Whether whole numbers that were written as text have to be read as text again.

    They have beside text that is no number, and where no type holds them all.
    """
    kinds = [part.schema.field(name).type for part, name in ends]
    if any(family(kind) == "text" for kind in kinds):
        return True
    vast = any(pt.is_uint64(kind) for kind in kinds)
    below = any(name in part.negative for part, name in ends)
    return vast and below and all(name in part.textual for part, name in ends)


def _require_weight(parts: list[Part], name: str) -> None:
    for part in parts:
        if part is not parts[0]:
            _require_shared(parts[0], part, name)
        kind = plain(part.schema.field(name).type)
        if not (is_numeric(kind) or pt.is_boolean(kind) or pt.is_null(kind)):
            raise InputError(
                f"column {name!r} of {part.name} is of type {kind}, which is no weight; name a "
                f"numeric column with --weight, or ignore it with --weight-as none; its columns "
                f"are {columns_listed(part.schema)}"
            )


def _spoiled(parts: list[Part], weight: str, options: LoadOptions) -> list[str]:
    """What is to be said of weights that are no numbers, if such rows are to be skipped."""
    found = [part.spoiled[weight] for part in parts if weight in part.spoiled]
    if found and options.bad_rows == "refuse":
        raise RowsError(f"{found[0]}; mend it, or leave such rows out with --bad-rows skip")
    return [f"{words}; such cells count as null" for words in found]


def _require_shared(first: Part, part: Part, name: str) -> None:
    if part.schema.names.count(name) != 1:
        have = listed(list(part.schema.names), 12)
        raise InputError(
            f"column {name!r} of {first.name} is missing from {part.name}, whose columns are "
            f"{have}; load files of one kind together"
        )
