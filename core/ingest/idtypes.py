"""Which Arrow types can identify a node, how two of them meet, and how they are worked on.

A column of ids is first brought to the type that source, target and all files have in common
(:func:`common`), which becomes the type of ``Graph.labels``.  Types that are integers
underneath (dates, times, bool) are numbered as integers.
"""

from __future__ import annotations

import pyarrow as pa
import pyarrow.compute as pc
from pyarrow import types as pt

from kingpost.core.errors import InputError

_UNITS = ("s", "ms", "us", "ns")


def plain(kind: pa.DataType) -> pa.DataType:
    """The type without dictionary, extension, run-end or view wrapping."""
    while True:
        if pt.is_dictionary(kind) or pt.is_run_end_encoded(kind):
            kind = kind.value_type
        elif isinstance(kind, pa.BaseExtensionType):
            kind = kind.storage_type
        elif pt.is_string_view(kind):
            return pa.string()
        elif pt.is_binary_view(kind):
            return pa.binary()
        else:
            return kind


def family(kind: pa.DataType) -> str | None:
    """``integer``, ``text``, ``binary``, ... or None for a type that cannot identify a node."""
    kind = plain(kind)
    if pt.is_integer(kind):
        return "integer"
    if pt.is_string(kind) or pt.is_large_string(kind):
        return "text"
    if pt.is_binary(kind) or pt.is_large_binary(kind) or pt.is_fixed_size_binary(kind):
        return "binary"
    tests = {
        "decimal": pt.is_decimal,
        "bool": pt.is_boolean,
        "date": pt.is_date,
        "timestamp": pt.is_timestamp,
        "time": pt.is_time,
    }
    return next((name for name, test in tests.items() if test(kind)), None)


def require_id(kind: pa.DataType, column: str, where: str) -> None:
    """Refuse a column that cannot hold ids, with advice."""
    if family(kind) is not None:
        return
    kind = plain(kind)
    head = f"column {column!r} of {where} is of type {kind}"
    if pt.is_floating(kind):
        raise InputError(
            f"{head}, and floating-point numbers do not identify nodes (they round); "
            "cast the column to an integer or text type"
        )
    if pt.is_null(kind):
        raise InputError(f"column {column!r} of {where} holds only nulls, so it names no node")
    if pt.is_nested(kind):
        raise InputError(f"{head}, a nested type, which cannot identify nodes; name a flat column")
    raise InputError(f"{head}, which cannot identify nodes; cast it to an integer or text type")


def common(left: pa.DataType, right: pa.DataType) -> pa.DataType | None:
    """The type that holds the ids of both, or None where they are of different sorts.

    uint64 and a signed type meet in uint64: a negative id is then refused when it is met.
    """
    left, right = plain(left), plain(right)
    if left == right:
        return left
    sort = family(left)
    if sort is None or sort != family(right):
        return None
    if sort == "integer":
        return _integers(left, right)
    if sort == "text":
        return pa.large_string()
    if sort == "binary":
        large = pt.is_large_binary(left) or pt.is_large_binary(right)
        return pa.large_binary() if large else pa.binary()
    if sort == "decimal":
        return _decimals(left, right)
    if sort == "date":
        return pa.date64()
    if sort == "timestamp":
        if (left.tz is None) != (right.tz is None):
            return None
        return pa.timestamp(_finer(left, right), left.tz if left.tz == right.tz else "UTC")
    unit = _finer(left, right)
    return pa.time32(unit) if unit in ("s", "ms") else pa.time64(unit)


def _integers(left: pa.DataType, right: pa.DataType) -> pa.DataType:
    signed, other = (left, right) if pt.is_signed_integer(left) else (right, left)
    width = max(left.bit_width, right.bit_width)
    if pt.is_signed_integer(left) != pt.is_signed_integer(right):
        if other.bit_width >= signed.bit_width:
            width = 2 * other.bit_width
        if width > 64:
            return pa.uint64()
        return {16: pa.int16(), 32: pa.int32(), 64: pa.int64()}[width]
    return left if left.bit_width == width else right


def _decimals(left: pa.DataType, right: pa.DataType) -> pa.DataType | None:
    scale = max(left.scale, right.scale)
    digits = scale + max(left.precision - left.scale, right.precision - right.scale)
    if digits > 76:
        return None
    return pa.decimal128(digits, scale) if digits <= 38 else pa.decimal256(digits, scale)


def _finer(left: pa.DataType, right: pa.DataType) -> str:
    return str(max(left.unit, right.unit, key=_UNITS.index))


def integer_type(kind: pa.DataType) -> pa.DataType | None:
    """The integer type that orders as ``kind`` does, or None for text, binary and decimals."""
    if pt.is_integer(kind):
        return kind
    if pt.is_boolean(kind):
        return pa.uint8()
    if pt.is_date32(kind) or pt.is_time32(kind):
        return pa.int32()
    if pt.is_date64(kind) or pt.is_time64(kind) or pt.is_timestamp(kind):
        return pa.int64()
    return None


def convert(values: pa.Array, kind: pa.DataType, column: str, where: str) -> pa.Array:
    """Values in the common type ``kind``, unwrapped.

    Raises:
        InputError: for a value that does not fit, such as a negative id beside uint64 ones.
    """
    values = unwrap(values)
    if values.type == kind:
        return values
    try:
        return values.cast(kind)
    except (pa.ArrowException, ValueError, OverflowError) as error:
        raise InputError(
            f"column {column!r} of {where} holds an id that does not fit the common type {kind} "
            f"({first_line(error)}); cast the id columns to one type"
        ) from None


def convert_ids(values: pa.Array, kind: pa.DataType, column: str, where: str) -> pa.Array:
    """Like :func:`convert`, but text and binary in a dictionary stay in it if it has no nulls."""
    if pt.is_dictionary(values.type) and family(kind) in ("text", "binary"):
        words = convert(values.dictionary, kind, column, where)
        if words.null_count == 0 and not pt.is_fixed_size_binary(kind):
            return pa.DictionaryArray.from_arrays(values.indices, words)
    return convert(values, kind, column, where)


def unwrap(values: pa.Array) -> pa.Array:
    """Values without dictionary, extension, run-end or view wrapping."""
    while True:
        kind = values.type
        if isinstance(kind, pa.BaseExtensionType):
            values = values.storage
        elif pt.is_dictionary(kind):
            values = values.dictionary_decode()
        elif pt.is_run_end_encoded(kind):
            values = pc.run_end_decode(values)
        elif pt.is_string_view(kind) or pt.is_binary_view(kind):
            small = values.nbytes < 2**31 - 1
            if pt.is_string_view(kind):
                values = values.cast(pa.string() if small else pa.large_string())
            else:
                values = values.cast(pa.binary() if small else pa.large_binary())
        else:
            return values


def to_integers(values: pa.Array, kind: pa.DataType) -> pa.Array:
    """Dates, times and truth values as the integers beneath; ``kind`` from integer_type."""
    if values.type == kind:
        return values
    return values.cast(kind) if pt.is_boolean(values.type) else values.view(kind)


def from_integers(values: pa.Array, kind: pa.DataType) -> pa.Array:
    """The inverse of :func:`to_integers`."""
    if values.type == kind:
        return values
    return values.cast(kind) if pt.is_boolean(kind) else values.view(kind)


def first_line(error: BaseException) -> str:
    """The first line of a library's message, for use inside a sentence."""
    lines = str(error).strip().splitlines()
    return lines[0].rstrip(". ") if lines else type(error).__name__
