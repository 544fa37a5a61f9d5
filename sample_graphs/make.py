"""Write the sample graphs as Parquet: ``python sample_graphs/make.py [FOLDER]``.

Needs numpy and pyarrow only.  The values are the same on every run; the files go beside this
script unless a folder is named.  What the graphs show is told in README.md.
"""

from __future__ import annotations

import sys
from pathlib import Path

import cheese
import harbour
import pyarrow.parquet as pq
import reef


def main(folder: Path) -> None:
    """Write every table and say what was written."""
    folder.mkdir(parents=True, exist_ok=True)
    total = 0
    for stem, table in {**harbour.tables(), **reef.tables(), **cheese.tables()}.items():
        path = folder / f"{stem}.parquet"
        pq.write_table(table, path, compression="zstd", compression_level=9)
        total += path.stat().st_size
        print(f"{path.name:34} {table.num_rows:>8,} rows {path.stat().st_size:>10,} bytes")
    print(f"{'all':34} {total:>24,} bytes")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent)
