"""Rows that an SQL condition keeps, over columns held in memory.

DuckDB evaluates the condition over Arrow arrays.  Its instance lives for one question, reads no
file, loads no extension, and its configuration is locked before the condition is looked at: what
is typed can compare columns and nothing else.
"""

from __future__ import annotations

import difflib
import re
import threading
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import SettingsError
from kingpost.core.text import visible
from kingpost.core.watch import Watch

_ROW = "row number of this condition"  # cannot be met by chance
_POLL = 0.05  # seconds between two looks at whether to stop
_MEMORY = "2GB"
_SHOWN = 60

Columns = Mapping[str, Callable[[], Any]]


def matching(columns: Columns, n: int, text: str, watch: Watch | None = None) -> NDArray[np.int64]:
    """Row numbers 0..n-1, ascending, for which the SQL condition ``text`` is true.

    ``columns`` maps each name to a function that gives its Arrow array of n values; only those
    the text names are made.  Null is not true.

    Raises:
        SettingsError: if the text is not one condition over these columns; the sentence names
            the column or the place.
        Interrupted: if ``watch`` was cancelled.
    """
    import duckdb
    import pyarrow as pa

    watch = watch or Watch()
    watch.check()
    words = {word.lower() for word in re.findall(r"[^\W\d]\w*", text)}
    words |= {name.lower() for name in columns if name.lower() in text.lower()}
    used = {name: make() for name, make in columns.items() if name.lower() in words}
    table = pa.table({_ROW: pa.array(np.arange(n, dtype=np.int64)), **used})
    with duckdb.connect(":memory:", config=_closed(watch.threads)) as base:
        base.register("nodes", table)
        base.execute("SET lock_configuration = true")
        over = threading.Event()
        guard = threading.Thread(target=_stop_when_asked, args=(base, watch, over), daemon=True)
        guard.start()
        try:
            condition = duckdb.SQLExpression(text)
            rows = base.view("nodes")
            kind = str(rows.select(condition).types[0])
            if kind not in ("BOOLEAN", '"NULL"', "NULL"):
                raise SettingsError(
                    f"{_quoted(text)} gives {_article(kind)} for each row, not true or false; "
                    f"compare it with something"
                )
            found = rows.filter(condition).select(duckdb.ColumnExpression(_ROW)).fetchnumpy()
        except duckdb.Error as trouble:
            watch.check()
            raise SettingsError(_explained(str(trouble), text, list(columns))) from trouble
        except UnicodeError as trouble:
            raise SettingsError("the condition holds characters that are no text") from trouble
        finally:
            over.set()
            guard.join()
    watch.check()
    return np.sort(np.asarray(found[_ROW], dtype=np.int64))


def _closed(threads: int) -> dict[str, Any]:
    return {
        "enable_external_access": "false",
        "autoinstall_known_extensions": "false",
        "autoload_known_extensions": "false",
        "allow_unsigned_extensions": "false",
        "memory_limit": _MEMORY,
        "threads": str(max(1, threads)),
    }


def _stop_when_asked(base: Any, watch: Watch, over: threading.Event) -> None:
    while not over.wait(_POLL):
        if watch.cancelled:
            base.interrupt()


def _quoted(text: str) -> str:
    return repr(visible(text, _SHOWN))


def _article(kind: str) -> str:
    kind = kind.upper()
    if kind in ("VARCHAR", "BLOB"):
        return "a text"
    if "INT" in kind or kind.startswith(("DECIMAL", "DOUBLE", "FLOAT")):
        return "a number"
    return "a value"


def _explained(message: str, text: str, names: list[str]) -> str:
    """DuckDB's message as one sentence about the text as it was typed."""
    first = message.strip().split("\n", 1)[0]
    first = re.sub(r"^[A-Z][A-Za-z ]* Error: ", "", first)
    missing = re.search(r'Referenced (?:column|table) "([^"]*)"', first)
    if missing:
        return _no_column(missing[1], text, names)
    token = re.search(r'at or near "(.*)"', first)
    if token and re.match("syntax error", first):
        return f"the condition does not read as SQL {_place(token[1], text)}"
    if token or "unterminated" in first:
        return f"the condition is not finished: {visible(first, 120)}"
    if "more than one statement" in first or "single expression" in first or "modifier" in first:
        return "one condition is taken, nothing before, behind or beside it"
    if "without selection list" in first:
        return "no condition is written"
    if "aggregates" in first or "window functions" in first:
        return (
            "a condition looks at one row at a time; sums, counts and windows over rows need "
            "a query of their own: (select ... from nodes)"
        )
    function = re.search(r"Function with name (\S+) does not exist", first)
    if function:
        near = re.search(r'Did you mean "([^"]*)"', message)
        advice = f"; the nearest is {visible(near[1], 40)}" if near else ""
        return f"there is no function {_quoted(function[1])} {_place(function[1], text)}{advice}"
    if "disabled by configuration" in message or "does not exist" in first:
        return "a condition can read nothing but the columns of this table, called nodes"
    return f"the condition cannot be worked out: {visible(first, 200)}"


def _no_column(name: str, text: str, names: list[str]) -> str:
    by_lower = {each.lower(): each for each in names}
    near = difflib.get_close_matches(name.lower(), list(by_lower), 2, 0.6)
    advice = f"; did you mean {' or '.join(visible(by_lower[n], 40) for n in near)}?"
    if not near:
        shown = ", ".join(visible(each, 40) for each in names[:12])
        advice = f"; there are {shown}{' and others' if len(names) > 12 else ''}"
    return f"no column is called {_quoted(name)} {_place(name, text)}{advice}"


def _place(token: str, text: str) -> str:
    at = text.lower().find(token.lower())
    if at < 0:
        return ""
    if text.lower().count(token.lower()) > 1:
        return f"near {_quoted(token)}"
    return f"at character {at + 1}, near {_quoted(token)}"
