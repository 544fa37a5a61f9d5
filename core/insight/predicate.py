"""Rows that an SQL condition keeps, over columns held in memory."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kingpost.core.errors import InputError, SettingsError
from kingpost.core.watch import Watch

_PIECE = 500_000  # rows looked at between two looks at whether to stop

Columns = Mapping[str, Callable[[], Any]]


def matching(columns: Columns, n: int, text: str, watch: Watch | None = None) -> NDArray[np.int64]:
    """Row numbers 0..n-1, ascending, for which the SQL condition ``text`` is true.

    ``columns`` maps each name to a function that gives its Arrow array of n values; only those
    the text names are made.  Null is not true.  What a condition may hold is said in
    :mod:`kingpost.core.ingest.sql`.

    Raises:
        SettingsError: if the text is not one condition over these columns; the sentence names
            the column or the place.
        Interrupted: if ``watch`` was cancelled.
    """
    import pyarrow as pa

    from kingpost.core.ingest.sql import Expression

    watch = watch or Watch()
    watch.check()
    condition = Expression(text, "the condition")
    place = "this table"
    try:
        # Their types are not known before they are made.
        used = condition.columns(pa.schema([(name, pa.null()) for name in columns]), place)
        arrays = []
        for name in used:
            watch.check()
            made = columns[name]()
            whole = made.combine_chunks() if isinstance(made, pa.ChunkedArray) else made
            arrays.append(whole)
        condition.bind(pa.schema([(u, a.type) for u, a in zip(used, arrays, strict=True)]), place)
        found = [np.empty(0, dtype=np.int64)]
        for low in range(0, n, _PIECE):
            size = min(_PIECE, n - low)
            if used:
                batch = pa.RecordBatch.from_arrays([a.slice(low, size) for a in arrays], used)
            else:
                batch = pa.RecordBatch.from_arrays([pa.nulls(size)], ["row"])
            kept, _ = condition.evaluate(batch, place, watch)
            found.append(np.flatnonzero(kept) + low)
    except InputError as trouble:
        raise SettingsError(trouble.sentence) from trouble
    return np.concatenate(found)
