"""Kingpost's solvers against other libraries, at the same true error, in one run.

    python tests/bench/graphs.py .bench
    python tests/bench/solvers.py [--graphs .bench] [--only NAME ...] [--measure M ...]
                                  [--write-readme]
    python tests/bench/solvers.py --small

Every contestant is run at the loosest setting whose scores, scaled to sum 1, differ from the
reference by at most 1e-9 in the L1 norm.  The reference is other code (:mod:`truth`): scipy in
double precision, refined in extended precision, with an error of its own below 1e-13 where
rounding allows.  Seconds are those of the solve alone, the best of 3 (of 1 beyond 10 s); building
is told apart.  Each contestant is a process of its own.  A last table times whole processes, from
the Parquet file to the first twenty names.

``--small`` does the same with graphs of thousands of edges made on the spot, in one process.
"""

from __future__ import annotations

import argparse
import importlib.util
import json
import os
import sys
import tempfile
import time
from pathlib import Path
from typing import Any

import race
import tables
import truth
import wholeway
from clean import Spec, prepare
from contestants import ALL

GRAPHS = ("rmat20", "citation", "citation_errors", "layered", "powerlaw")
MEASURES = ("surfer", "katz", "eigenvector")
WAY_ONLY = ("rmat20_text",)  # graphs for the way from the file to the names alone


def small_graphs(folder: Path, edges: int) -> list[Path]:
    """The same five kinds of graph, small."""
    import graphs

    from kingpost.core.gallery import recipe

    made = {
        "rmat20": recipe("rmat", edges, seed=graphs.SEED, nodes=1 << 13),
        "citation": recipe("citation", edges, seed=graphs.SEED),
        "citation_errors": recipe("citation", edges, seed=graphs.SEED, errors=0.001),
        "layered": recipe("layered", edges, seed=graphs.SEED),
        "powerlaw": recipe("powerlaw", edges, seed=graphs.SEED),
    }
    for name, graph in made.items():
        graphs.write(folder / f"{name}.parquet", graph)
    return [folder / f"{name}.parquet" for name in made]


def contest(
    raw: Path, folder: Path, measures: list[str], names: list[str], limit: float | None
) -> dict[str, Any]:
    """All contestants on one graph; in this process where ``limit`` is None."""
    tables.say(f"\n{raw.stem}: cleaning, and solving the reference ...")
    spec = prepare(raw, folder)
    facts = truth.references(spec, folder, measures)
    found: dict[str, Any] = {"spec": spec.__dict__, "facts": facts, "measures": {}}
    for measure in measures:
        tables.say(tables.heading(spec, measure, facts))
        rows = []
        if measure == "eigenvector" and spec.acyclic:
            tables.say("  none: " + refusal(spec))
            continue
        for name in names:
            row = one(name, spec, measure, facts, folder, limit)
            if row is not None:
                rows.append(row)
                tables.say(tables.brief(row))
        found["measures"][measure] = rows
    return found


def refusal(spec: Spec) -> str:
    """What Kingpost says where there is no eigenvector centrality."""
    from kingpost.core.ingest import load
    from kingpost.core.measures import measure

    result = measure("eigenvector").rank(load(spec.path, directed=spec.directed))
    assert result.refusal is not None, "an acyclic graph was given an eigenvector"
    return result.refusal.sentence


def one(
    name: str, spec: Spec, measure: str, facts: dict[str, Any], folder: Path, limit: float | None
) -> race.Row | None:
    """One contestant; None where it makes no sense to speak of it."""
    from contestants import contestant

    entry = contestant(name)
    why = entry.skip(spec, measure)
    if why is not None:
        # Solvers of a library that has others for this measure go without saying.
        return {"name": name, "reached": False, "why": why} if why else None
    if race.missing(entry):
        return {"name": name, "reached": False, "why": "not installed"}
    if limit is None:
        return race.run(name, spec, measure, facts, folder)
    return race.run_apart(name, spec, measure, facts, folder, limit)


def ways(raw: Path, found: dict[str, Any], limit: float) -> list[dict[str, Any]]:
    """Whole processes: Kingpost's command against the three likeliest peers, by measure."""
    lines = []
    for measure, rows in found["measures"].items():
        peers = [row for row in tables.right(rows) if not tables.ours(row)]
        peers.sort(key=lambda row: row["build"] + row["seconds"])
        if not peers:
            continue
        facts = found["facts"]
        command = wholeway.kingpost_command(str(raw), measure, facts)
        seconds, _ = wholeway.timed(command, race.RUNS, race.SLOW, limit)
        ids = wholeway.kingpost_ids(command) if seconds < float("inf") else []
        line = {"graph": raw.stem, "measure": measure, "kingpost": seconds, "peers": []}
        for row in peers[:3]:
            theirs = wholeway.peer_command(row["name"], str(raw), measure, row["value"], facts)
            taken, out = wholeway.timed(theirs, race.RUNS, race.SLOW, limit)
            agree = sum(a == b for a, b in zip(ids, out.split(), strict=False))
            line["peers"].append({"name": row["name"], "seconds": taken, "agree": agree})
        lines.append(line)
        tables.say(tables.way(line))
    return lines


def main() -> None:
    """Run what was asked for, print it, keep it as JSON, write the README if asked to."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("--graphs", type=Path, default=Path(".bench"), metavar="FOLDER")
    parser.add_argument("--only", nargs="+", metavar="NAME", help=f"of {', '.join(GRAPHS)}")
    parser.add_argument("--measure", nargs="+", choices=MEASURES, default=list(MEASURES))
    parser.add_argument("--contestants", nargs="+", metavar="WORD", help="names that hold a word")
    parser.add_argument("--limit", type=float, default=600.0, help="seconds for a contestant")
    parser.add_argument("--small", action="store_true", help="small graphs, in this process")
    parser.add_argument("--edges", type=int, default=30_000, help="of the small graphs")
    parser.add_argument("--no-way", action="store_true", help="leave out the whole processes")
    parser.add_argument("--write-readme", action="store_true")
    asked = parser.parse_args()
    if importlib.util.find_spec("kingpost") is None:
        parser.error("kingpost is not installed in this environment")
    words = asked.contestants or [""]
    names = [kind.name for kind in ALL if any(word.lower() in kind.name.lower() for word in words)]
    began, load = time.time(), os.getloadavg()[0]
    report: dict[str, Any] = {"graphs": {}, "ways": []}
    with tempfile.TemporaryDirectory() as scratch:
        if asked.small:
            raws, folder = small_graphs(Path(scratch), asked.edges), Path(scratch) / "prepared"
        else:
            raws = [asked.graphs / f"{name}.parquet" for name in GRAPHS]
            folder = asked.graphs / "prepared"
        for raw in raws:
            if asked.only and raw.stem not in asked.only:
                continue
            if not raw.exists():
                parser.error(f"{raw} is missing; python tests/bench/graphs.py {asked.graphs}")
            limit = None if asked.small else asked.limit
            found = contest(raw, folder, asked.measure, names, limit)
            report["graphs"][raw.stem] = found
            if asked.small or asked.no_way:
                continue
            for other in (raw, *(asked.graphs / f"{name}.parquet" for name in WAY_ONLY)):
                if other.exists() and other.stem.startswith(raw.stem):
                    some = found if other == raw else tables.only(found, "surfer")
                    report["ways"] += ways(other, some, asked.limit)
    report["about"] = tables.about(began, load, asked.small)
    tables.say("\n" + tables.markdown(report) + "\n")
    for line in tables.verdicts(report):
        tables.say(line)
    if not asked.small:
        (asked.graphs / "solvers.json").write_text(json.dumps(report, indent=1))
    if asked.write_readme:
        command = "python tests/bench/solvers.py " + " ".join(sys.argv[1:])
        tables.write_readme(report, command)


if __name__ == "__main__":
    main()
