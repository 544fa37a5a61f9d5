"""Opening a graph, wherever it is: an edge table, its compiled copy on the shelf, or a pack."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

from kingpost.core.watch import Watch

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.ingest import LoadOptions
    from kingpost.core.ingest.about import TableAbout
    from kingpost.core.ingest.room import Prediction
    from kingpost.core.store.shelf import Shelf

Store = bool | str | os.PathLike[str]


def open_graph(
    paths: str | os.PathLike[str] | Sequence[str | os.PathLike[str]],
    *,
    options: LoadOptions | None = None,
    watch: Watch | None = None,
    store: Store = True,
    tell: Callable[[str], None] | None = None,
    **overrides: Any,
) -> Graph:
    """The graph of some edge tables, from the store where it is kept, or of a pack.

    Args:
        paths: edge tables, folders of them or patterns, as :func:`kingpost.core.ingest.load`
            takes them; or the folder of one pack.
        options: how rows become edges; keyword ``overrides`` replace single fields.
        watch: progress and cancelling.
        store: whether compiled graphs and results are kept and looked for: in the user's cache
            folder, not at all, or in the folder given.
        tell: called with a sentence where the store could not be used, or was not believed.

    Raises:
        InputError: for files or columns that cannot be used, or a damaged pack.
        SettingsError: for options outside their choices.
        Interrupted: if the watch was cancelled.
    """
    import dataclasses

    from kingpost.core import ingest
    from kingpost.core.store import pack

    given = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    named = [os.fspath(path) for path in given]
    chosen = dataclasses.replace(options or ingest.LoadOptions(), **overrides)
    watch, tell = watch or Watch(), tell or (lambda sentence: None)
    shelf = _shelf(store, tell)
    packed = pack.pack_among(named)
    if packed is not None:
        return pack.open_pack(packed, chosen, watch, shelf)
    if shelf is None:
        return ingest.load(named, chosen, watch)
    return _through(shelf, named, chosen, watch, tell)


def describe(
    paths: str | os.PathLike[str] | Sequence[str | os.PathLike[str]],
    options: LoadOptions | None = None,
    watch: Watch | None = None,
) -> TableAbout:
    """What the files of some edge tables, or of the table a pack was made from, hold.

    Of ``options`` those count that say how a text is to be read.

    Raises:
        InputError: for files that cannot be used, or a damaged pack.
    """
    from kingpost.core import ingest
    from kingpost.core.store import pack

    given = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    named = [os.fspath(path) for path in given]
    packed = pack.pack_among(named)
    if packed is not None:
        return pack.describe(packed)
    return ingest.describe(named, options, watch)


def predict(
    paths: str | os.PathLike[str] | Sequence[str | os.PathLike[str]],
    options: LoadOptions | None = None,
    watch: Watch | None = None,
) -> Prediction | None:
    """How much memory loading some edge tables takes; None for a pack, which is not loaded.

    Raises:
        InputError, SettingsError, Interrupted: as loading does.
    """
    from kingpost.core import ingest
    from kingpost.core.store import pack

    given = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    named = [os.fspath(path) for path in given]
    return ingest.predict(named, options, watch) if pack.pack_among(named) is None else None


def _shelf(store: Store, tell: Callable[[str], None]) -> Shelf | None:
    """The shelf to use, if it is to be used and can be trusted."""
    if store is False:
        return None
    from kingpost.core.store.sealed import StoreTrouble
    from kingpost.core.store.shelf import Shelf

    shelf = Shelf(None if store is True else store)
    try:
        shelf.check_owner()
    except (OSError, StoreTrouble) as error:
        tell(f"the store is not used: {shelf.why(error)}")
        return None
    return shelf


def _through(
    shelf: Shelf, named: list[str], options: Any, watch: Watch, tell: Callable[[str], None]
) -> Graph:
    from kingpost.core import ingest
    from kingpost.core.store.graphs import read_graph
    from kingpost.core.store.identity import identify
    from kingpost.core.store.results import Drawer
    from kingpost.core.store.sealed import Missing, StoreTrouble

    try:
        identity = identify(named, options)
    except OSError:
        identity = None  # loading will say what is wrong
    if identity is None:
        return ingest.load(named, options, watch)
    place = shelf.graphs / identity.key
    try:
        graph, about = read_graph(place, watch, identity.key)
        shelf.used(place)
        graph.__dict__["drawer"] = Drawer(str(about["content"]), shelf)
        return graph
    except Missing:
        pass
    except StoreTrouble as error:
        tell(f"the kept copy of this graph is not used, the table is read anew: {error}")
    graph = ingest.load(named, options, watch)
    try:
        if identify(named, options) != identity:
            return graph  # the table changed while it was read
        kept, content = shelf.keep_graph(graph, identity, options, watch)
    except (OSError, StoreTrouble) as error:
        tell(f"the graph is not kept for next time: {shelf.why(error)}")
        return graph
    kept.__dict__["drawer"] = Drawer(content, shelf)
    return kept
