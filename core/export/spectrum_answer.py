"""Leading eigenvalues and rates of convergence, for every format."""

from __future__ import annotations

import math

import pyarrow as pa

from kingpost.core.export.answer import Answer, Field, Sheet, graph_facts, reals, solve_facts, texts
from kingpost.core.export.heading import graph_line
from kingpost.core.graph import Graph
from kingpost.core.insight.rates import Rate
from kingpost.core.insight.spectrum import Eigenvalue, Spectrum
from kingpost.core.insight.terms import flow_of
from kingpost.core.result import Result
from kingpost.core.text import count


def spectrum_answer(graph: Graph, result: Result, found: Spectrum) -> Answer:
    """Sheets: ``values``, the leading ones; ``rates``, predicted and observed."""
    head = [graph_line(graph, flow_of(result)), f"spectrum of {found.matrix}", _extent(found)]
    head += [_gap(found), *_rates(found)]
    facts = {
        **graph_facts(graph),
        "measure": found.measure,
        "matrix": found.matrix,
        "size": found.size,
        "zeros": found.zeros,
        "complete": found.complete,
        "radius": found.radius,
        "gap": found.gap,
        "second": found.second,
        "products": found.products,
        "notes": list(found.notes),
        "solve": solve_facts(result),
    }
    tail = [*found.notes, *_reading(found)]
    if result.refusal is not None:
        tail.append(f"{result.measure} itself has no answer here: {result.refusal.sentence}")
    return Answer(head, [_values(found), _rate_sheet(found)], facts, tail)


def _extent(found: Spectrum) -> str:
    low, high = found.radius
    words = f"largest modulus in [{low:.12g}, {high:.12g}]"
    if found.about == "singular value":
        words = f"largest singular value in [{low:.12g}, {high:.12g}]"
    many = f"{found.size:,} by {found.size:,}"
    if found.zeros:
        nodes = count(found.zeros, "eigenvalue")
        many += f", {nodes} 0 by structure (nodes on no cycle)"
    how = (
        "decomposed whole"
        if found.complete
        else f"the head searched for with {count(found.products, 'product')}, which may miss values"
    )
    return f"{many}; {how}; {words}"


def _gap(found: Spectrum) -> str:
    low, high = found.second
    sure = f"second modulus is {low:.6g} to {high:.6g} of the first for certain"
    if found.gap is None:
        return f"no gap to speak of; {sure}"
    return f"gap 1 - |second| / |first| = {found.gap:.6g}; {sure}"


def _rates(found: Spectrum) -> list[str]:
    words = []
    for name, rate in (("predicted", found.predicted), ("observed", found.observed)):
        if rate is not None:
            words.append(f"{name} rate {_factor(rate)} {rate.words}")
    return words


def _factor(rate: Rate) -> str:
    if math.isinf(rate.digit):
        return "1 (no convergence):"
    return f"{rate.factor:.4g} a sweep, {rate.digit:.3g} sweeps a digit:"


def _reading(found: Spectrum) -> list[str]:
    if any(value.low is None for value in found.values):
        return [
            "residual: the value is exact for a matrix that differs from this one by no more "
            "(2-norm); low and high, where they stand, enclose it for certain"
        ]
    return ["low and high enclose each value for certain"] if found.values else []


def _values(found: Spectrum) -> Sheet:
    rows = found.values

    def ends(name: str) -> list[float]:
        values = [getattr(row, name) for row in rows]
        return [math.nan if value is None else value for value in values]

    fields = [
        Field("number", pa.array(range(1, len(rows) + 1), pa.int64()), "#"),
        Field("real", reals([row.real for row in rows])),
        Field("imaginary", reals([row.imaginary for row in rows])),
        Field("value", texts([_shown(row) for row in rows]), found.about, data=False, align=">"),
        Field(
            "modulus", reals([row.modulus for row in rows]), "modulus",
            [f"{row.modulus:.10g}" for row in rows],
        ),
        Field(
            "residual", reals([row.residual for row in rows]), "residual",
            [f"{row.residual:.1e}" for row in rows],
        ),
        *(
            Field(name, reals(ends(name)), name, [_end(value) for value in ends(name)])
            for name in ("low", "high")
        ),
    ]  # fmt: skip
    return Sheet("values", fields)


def _shown(row: Eigenvalue) -> str:
    if row.imaginary == 0.0:
        return f"{row.real:.10g}"
    sign = "+" if row.imaginary > 0 else "-"
    return f"{row.real:.6g} {sign} {abs(row.imaginary):.6g}i"


def _end(value: float) -> str:
    return "-" if math.isnan(value) else f"{value:.10g}"


def _rate_sheet(found: Spectrum) -> Sheet:
    pairs = [("predicted", found.predicted), ("observed", found.observed)]
    rows = [(name, rate) for name, rate in pairs if rate is not None]
    fields = [
        Field("rate", texts([name for name, _ in rows])),
        Field("factor", reals([rate.factor for _, rate in rows])),
        Field("sweeps_per_digit", reals([rate.digit for _, rate in rows])),
        Field("words", texts([rate.words for _, rate in rows])),
    ]
    return Sheet("rates", fields, read=False)
