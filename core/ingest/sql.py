"""One SQL expression over the columns of a table, true or false for each row.

DuckDB reads the expression and evaluates it on Arrow batches; nothing else of DuckDB is within
reach.  The connection may touch no file, load no extension and change no setting, and the
expression is taken apart before it runs: one expression, of columns, constants, operators and
functions whose value depends on their arguments alone.
"""

from __future__ import annotations

import difflib
import functools
import json
import threading
from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from kingpost.core.errors import InputError, SettingsError
from kingpost.core.ingest.idtypes import unwrap
from kingpost.core.text import listed, visible
from kingpost.core.watch import Watch

Bools = NDArray[np.bool_]

_SELECT = "SELECT\n"
_EVALUATE = "SELECT CAST((\n{}\n) AS BOOLEAN) AS kept FROM edges"
_DESCRIBE = "SELECT (\n{}\n) AS kept FROM edges LIMIT 0"
_LOCKS = (
    "temp_directory = ''",
    "memory_limit = '2GB'",
    "enable_external_access = false",
    "autoinstall_known_extensions = false",
    "autoload_known_extensions = false",
    "allow_community_extensions = false",
    "python_enable_replacements = false",
    "TimeZone = 'UTC'",
    "errors_as_json = true",
    "lock_configuration = true",  # last: nothing can be changed after it
)
# Functions that give another value tomorrow, or on another machine.
_FLEETING = (
    "current_date", "current_time", "current_timestamp", "localtime", "localtimestamp", "now",
    "today", "get_current_time", "get_current_timestamp", "transaction_timestamp", "user",
    "current_user", "session_user", "current_role", "current_setting", "current_database",
    "current_schema", "current_schemas", "current_catalog", "current_query", "version", "age",
    "txid_current", "getvariable", "getenv", "in_search_path", "pg_typeof_oid",
)  # fmt: skip
# Functions that make values of any size out of a number: nothing could stop them in time.
_BOUNDLESS = ("range", "generate_series", "repeat", "lpad", "rpad", "list_resize", "array_resize")
_REFUSED = {
    "SUBQUERY": "a query within the expression",
    "WINDOW": "a window function",
    "STAR": "* or COLUMNS()",
    "PARAMETER": "a parameter (? or $)",
    "POSITIONAL_REFERENCE": "a column by its position (#)",
    "DEFAULT": "DEFAULT",
}


class Expression:
    """An SQL expression, read and found harmless; evaluated on batches of a table.

    Args:
        text: the expression.
        option: the option it was given by, for error messages.

    Raises:
        SettingsError: for anything but a single expression of the kind described above.
    """

    def __init__(self, text: str, option: str) -> None:
        self.text, self.option = text, option
        self._connection = _locked()
        tree = self._parsed()
        self.tree = tree
        self._bound_to: pa.Schema | None = None
        self._check(tree)

    def columns(self, schema: pa.Schema, where: str) -> list[str]:
        """The columns of a table that the expression names, in the table's spelling.

        Raises:
            InputError: for a column that the table lacks or holds twice.
        """
        found = self.columns_of(self.tree, schema, where)
        lower = [name.lower() for name in found]
        twins = [name for name in found if lower.count(name.lower()) > 1]
        if twins:
            raise InputError(
                f"{self.option} names columns of {where} that differ by case only, which SQL "
                f"cannot tell apart: {listed(twins)}; rename one of them"
            )
        return found

    def columns_of(self, tree: Any, schema: pa.Schema, where: str) -> list[str]:
        """Like :meth:`columns`, for a part of the syntax tree."""
        names = _column_names(tree, frozenset())
        return list(dict.fromkeys(self._resolve(path, schema, where) for path in names))

    def _resolve(self, names: Sequence[str], schema: pa.Schema, where: str) -> str:
        for name in names[:2] if len(names) > 1 and names[0].lower() == "edges" else names[:1]:
            same = [other for other in schema.names if other.lower() == name.lower()]
            exact = [other for other in same if other == name]
            if len(exact) > 1 or (len(same) > 1 and not exact):
                raise InputError(
                    f"{self.option} names column {name!r}, and {where} has {listed(same)}; "
                    "rename them apart"
                )
            if same:
                return str((exact or same)[0])
        name = names[0]
        if name.lower() in _FLEETING:
            raise self._fleeting(name)
        lower = {other.lower(): other for other in schema.names}
        near = difflib.get_close_matches(name.lower(), list(lower), 3, 0.6)
        advice = f"; did you mean {', '.join(lower[item] for item in near)}?" if near else ";"
        quotes = "" if near else " (text stands in single quotes)"
        told = ["" if pa.types.is_null(item.type) else f" ({item.type})" for item in schema]
        have = listed([f"{item.name}{kind}" for item, kind in zip(schema, told, strict=True)], 12)
        raise InputError(
            f"{self.option} names column {name!r}, which {where} lacks{quotes}{advice} its "
            f"columns are {have}"
        )

    def bind(self, schema: pa.Schema, where: str) -> None:
        """Check the expression against the columns it names, without any row.

        Raises:
            InputError: where types do not go together, or the value is not true or false.
        """
        if self._bound_to is not None and self._bound_to.equals(schema):
            return
        self._register(pa.RecordBatch.from_pylist([], schema), where)
        try:
            found = self._connection.execute(_DESCRIBE.format(self.text))
            kind = str(found.description[0][1])
            found.fetchall()
        except Exception as error:
            raise InputError(self._told(error, _DESCRIBE, where)) from None
        if "BOOL" not in kind.upper() and kind.upper() not in ("NULL", '"NULL"'):
            raise InputError(
                f"{self.option} is {visible(self.text, 80)!r}, which is a value of type {kind} "
                "for each row; it takes a condition that is true or false, such as calls > 10"
            )
        self._bound_to = schema

    def evaluate(self, batch: pa.RecordBatch, where: str, watch: Watch) -> tuple[Bools, int]:
        """Where the expression is true, and for how many rows it is neither true nor false.

        Raises:
            InputError: if it fails on a row.
            Interrupted: if the watch is cancelled; the engine is stopped at once.
        """
        self.bind(batch.schema, where)
        self._register(batch, where)
        with _Interrupter(self._connection, watch):
            try:
                found = self._connection.execute(_EVALUATE.format(self.text)).fetchnumpy()["kept"]
            except Exception as error:
                watch.check()
                raise InputError(self._told(error, _EVALUATE, where)) from None
        if len(found) != batch.num_rows:
            raise InputError(f"{self.option} gives {len(found)} values for {batch.num_rows} rows")
        hidden = np.ma.getmaskarray(found) if np.ma.isMaskedArray(found) else None
        values = np.asarray(np.ma.getdata(found), dtype=bool)
        if hidden is None:
            return values, 0
        return values & ~hidden, int(np.count_nonzero(hidden))

    def is_false(self, condition: dict[str, Any], row: pa.RecordBatch) -> Bools:
        """Where a part of the tree is false (not: unknown) on rows of other values.

        Raises:
            Exception: whatever the engine raises; the caller then knows nothing.
        """
        tree = json.loads(json.dumps(self._statement))
        tree["statements"][0]["node"]["select_list"] = [condition]
        connection = self._connection
        connection.register("edges", pa.Table.from_batches([row]))
        query = connection.execute("SELECT json_deserialize_sql(?)", [json.dumps(tree)]).fetchall()
        asked = str(query[0][0]).strip().rstrip(";") + " FROM edges"
        values = connection.execute(asked).fetchall()
        return np.array([value is False for (value,) in values], dtype=bool)

    def _register(self, batch: pa.RecordBatch, where: str) -> None:
        columns = [_known(column) for column in batch.columns]
        names = list(batch.schema.names)
        if not names:  # an expression of constants: rows alone cannot be handed over
            columns, names = [pa.nulls(batch.num_rows, pa.bool_())], ["row"]
        try:
            self._connection.register("edges", pa.Table.from_arrays(columns, names=names))
        except Exception as error:
            raise InputError(
                f"{self.option} cannot be evaluated on columns {listed(names)} of {where}: "
                f"{_message(error)[0]}"
            ) from None

    def _parsed(self) -> dict[str, Any]:
        if not self.text.strip():
            raise SettingsError(f"{self.option} is empty; it takes an SQL expression")
        if "\0" in self.text:
            raise SettingsError(f"{self.option} holds a null character; it takes an SQL expression")
        try:
            row = self._connection.execute(
                "SELECT json_serialize_sql(?)", [f"{_SELECT}{self.text}\n"]
            ).fetchall()[0]
            self._statement = json.loads(row[0])
        except Exception as error:
            raise SettingsError(self._unreadable(_message(error)[0], None)) from None
        if self._statement.get("error"):
            words = str(self._statement.get("error_message", "no expression"))
            at = self._statement.get("position")
            raise SettingsError(self._unreadable(words, None if at is None else int(at)))
        statements = self._statement["statements"]
        node = statements[0]["node"]
        whole = (
            len(statements) == 1
            and node.get("type") == "SELECT_NODE"
            and len(node.get("select_list", ())) == 1
            and (node.get("from_table") or {}).get("type", "EMPTY") == "EMPTY"
            and not any(node.get(key) for key in ("where_clause", "having", "qualify", "sample"))
            and not any(node.get(key) for key in ("group_expressions", "group_sets", "modifiers"))
            and not (node.get("cte_map") or {}).get("map")
            and not node["select_list"][0].get("alias")
        )
        if not whole:
            raise SettingsError(
                f"{self.option} takes one SQL expression and nothing around it: no query, no ; "
                "and no list"
            )
        tree: dict[str, Any] = node["select_list"][0]
        return tree

    def _unreadable(self, words: str, at: int | None) -> str:
        if "not implemented" in words.lower() or "Only SELECT" in words:
            words = "it holds a statement"
        place = ""
        if at is not None:
            offset = at - len(_SELECT)
            text = self.text.encode()
            shown = len(text[: max(offset, 0)].decode("utf-8", "replace")) + 1
            place = f" at position {shown}" if offset < len(text) else " at its end"
        words = " ".join(words.splitlines()[:1])
        return f"{self.option} does not read as one SQL expression{place}: {words}"

    def _check(self, tree: dict[str, Any]) -> None:
        known = _catalogue()
        allowed = {name for name, kind in known.items() if kind == "fine"}
        for node in _nodes(tree):
            kind = str(node.get("class", ""))
            if kind in _REFUSED:
                raise SettingsError(
                    f"{self.option} holds {_REFUSED[kind]}; it takes one expression of columns, "
                    "constants, operators and functions"
                )
            name = str(node.get("function_name", "")).lower()
            if not name or kind != "FUNCTION":
                continue
            if name in _FLEETING or (name in known and name not in allowed):
                if known.get(name) == "of many rows":
                    raise SettingsError(
                        f"{self.option} uses {name}, which is a value of many rows; it takes a "
                        "condition on each row by itself"
                    )
                raise self._fleeting(name)
            if name in _BOUNDLESS:
                raise SettingsError(
                    f"{self.option} uses {name}, which can make values of any size; leave it out"
                )
            if name == "unnest":
                raise SettingsError(
                    f"{self.option} uses unnest, which makes more rows; it takes a condition on "
                    "each row by itself"
                )
            if name not in known and name not in ("row", "struct_pack", "list_value"):
                near = difflib.get_close_matches(name, list(allowed), 3, 0.6)
                advice = f"; did you mean {', '.join(near)}?" if near else ""
                raise SettingsError(
                    f"{self.option} uses {visible(name, 40)}, which is no function{advice}"
                )

    def _fleeting(self, name: str) -> SettingsError:
        return SettingsError(
            f"{self.option} uses {visible(name, 40)}, whose value is another each time, so that "
            "the same command would give other answers; write the value itself"
        )

    def _told(self, error: BaseException, query: str, where: str) -> str:
        words, at = _message(error)
        place = ""
        if at is not None:
            offset = at - len(query.split("{}")[0].encode())
            text = self.text.encode()
            if 0 <= offset < len(text):
                place = f" at position {len(text[:offset].decode('utf-8', 'replace')) + 1}"
        return f"{self.option}{place} cannot be evaluated on {where}: {words}"


class _Interrupter:
    """While used as a context, stops the engine soon after the watch is cancelled."""

    def __init__(self, connection: Any, watch: Watch) -> None:
        self._connection, self._watch = connection, watch
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._look, daemon=True)

    def __enter__(self) -> None:
        self._watch.check()
        self._thread.start()

    def _look(self) -> None:
        while not self._done.wait(0.03):
            if self._watch.cancelled:
                self._connection.interrupt()

    def __exit__(self, *_: object) -> None:
        self._done.set()
        self._thread.join()


@functools.cache
def _catalogue() -> dict[str, str]:
    """The engine's functions: ``fine``, ``of many rows`` or ``fleeting``."""
    found: dict[str, str] = {}
    rows = _locked().execute(
        "SELECT DISTINCT function_name, function_type, stability FROM duckdb_functions()"
    )
    for name, kind, stability in rows.fetchall():
        word = "fleeting"
        if kind == "macro" or (kind == "scalar" and stability != "VOLATILE"):
            word = "fine"
        elif kind in ("aggregate", "window"):
            word = "of many rows"
        if found.get(name) != "fine":
            found[name] = word
    return found


def _locked() -> Any:
    try:
        import duckdb
    except ImportError:
        raise SettingsError(
            "filters by SQL need the package duckdb, which is not installed"
        ) from None
    # One thread, so that values come in the order of rows.
    connection = duckdb.connect(":memory:", config={"threads": 1})
    for lock in _LOCKS:
        try:
            connection.execute(f"SET {lock}")
        except duckdb.Error:
            # Settings that a version does not have lock nothing; those that matter must hold.
            if lock.startswith(("enable_external", "lock_conf")):
                raise
    return connection


def _known(column: pa.Array) -> pa.Array:
    """A column in a type that the engine reads; dictionaries stay."""
    if not pa.types.is_dictionary(column.type):
        column = unwrap(column)
    return column.cast(pa.float32()) if pa.types.is_float16(column.type) else column


def _message(error: BaseException) -> tuple[str, int | None]:
    """First line of the engine's message, and the byte of the query it points at."""
    text = str(error)
    start = text.find("{")
    at: int | None = None
    if start >= 0:
        try:
            about = json.loads(text[start:])
            text = str(about["exception_message"])
            at = int(about["position"]) if "position" in about else None
        except (ValueError, KeyError, TypeError):
            pass
    lines = text.strip().splitlines() or [type(error).__name__]
    return lines[0].rstrip(". "), at


def _nodes(tree: Any) -> Iterator[dict[str, Any]]:
    """Every node of a syntax tree."""
    if isinstance(tree, dict):
        yield tree
        for value in tree.values():
            yield from _nodes(value)
    elif isinstance(tree, list):
        for value in tree:
            yield from _nodes(value)


def _column_names(tree: Any, bound: frozenset[str]) -> Iterator[Sequence[str]]:
    """The names of every column reference, but not of a lambda's own variables."""
    if isinstance(tree, list):
        for value in tree:
            yield from _column_names(value, bound)
    if not isinstance(tree, dict):
        return
    if tree.get("class") == "LAMBDA":
        own = {n["column_names"][0] for n in _nodes(tree.get("lhs")) if n.get("column_names")}
        yield from _column_names(tree.get("expr"), bound | own)
        return
    names = tree.get("column_names")
    if tree.get("class") == "COLUMN_REF" and names:
        if names[0] not in bound:
            yield names
        return
    for value in tree.values():
        yield from _column_names(value, bound)
