"""A small table and a shelf of its own for every test."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from keeping import EDGES

from kingpost.core.measures import measure
from kingpost.core.measures.base import finish
from kingpost.core.open import open_graph
from kingpost.core.result import Result
from kingpost.core.store.results import keep_result, solve
from kingpost.core.watch import Watch


class Desk:
    """Opens and solves through one shelf, and hears what is told."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.told: list[str] = []

    def open(self, *paths: Any, **options: Any) -> Any:
        """A graph through the shelf."""
        self.told.clear()
        return open_graph(list(paths), store=self.folder, tell=self.told.append, **options)

    def rank(self, graph: Any, name: str = "surfer", **settings: Any) -> Result:
        """A result through the shelf."""
        chosen, watch = measure(name), Watch()
        result = finish(solve(chosen, graph, chosen.settings(**settings), watch))
        if result.refusal is None:
            _ = result.standing
        note = keep_result(chosen, graph, result, watch)
        self.told += [note] if note else []
        return result

    @property
    def graphs(self) -> list[Path]:
        """The folders of the graphs on the shelf."""
        return sorted((self.folder / "graphs").glob("[!.]*"))

    @property
    def results(self) -> list[Path]:
        """The folders of the results on the shelf."""
        return sorted((self.folder / "results").glob("*/[!.]*"))


@pytest.fixture
def desk(tmp_path: Path) -> Desk:
    return Desk(tmp_path / "shelf")


@pytest.fixture
def edges(tmp_path: Path) -> Path:
    path = tmp_path / "edges.parquet"
    pq.write_table(pa.table(EDGES), path)
    return path


@pytest.fixture
def nodes(tmp_path: Path) -> Path:
    path = tmp_path / "nodes.parquet"
    pq.write_table(pa.table({"id": ["a", "b", "d"], "team": ["pier", None, "boats"]}), path)
    return path
