"""The lines that say who a node is and why it stands where it does; pieces of styled text."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rich.cells import cell_len

from kingpost.core.text import visible
from kingpost.tui.models.drawing import bar, fit, ruler, tame
from kingpost.tui.models.numbers import ScoreFormat, percent, rank_range, small
from kingpost.tui.models.sitting import Sitting, flow_words, settings_words
from kingpost.tui.terminal import Glyphs

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.core.insight.contributions import Contributions
    from kingpost.core.result import Result
    from kingpost.tui.models.node import NodeModel

Piece = tuple[str, str]
_BAR = 8
# These lines are written anew at every key: their length is what a key costs on a slow link.
_TRACK = 44
_FILTER = 24
_SUPPORTS = 4
_SEPARATOR = "   "


def graph_line(graph: Graph, flow: str, shown: int, width: int, within: str = "") -> list[Piece]:
    """Graph, nodes, edges, flow; with how many rows a filter leaves, and which part it is."""
    rows = f"{graph.n:,} nodes" if shown == graph.n else f"{shown:,} of {graph.n:,} nodes"
    name = tame(graph.origin.name)
    if within:
        name = f"{within} of {name.removesuffix('.parquet')}"
    counts = f"   {rows}  {graph.m:,} edges   "
    words = flow_words(graph, flow)
    if 1 + cell_len(name) + len(counts) + cell_len(words) > width:
        counts, words = f"  {rows}  {graph.m:,} edges  ", words.removeprefix("score ")
    if 1 + cell_len(name) + len(counts) + cell_len(words) > width:
        name = name.removesuffix(".parquet")
    pieces: list[Piece] = [(f" {name}", "head"), (counts, "plain")]
    if (filters := graph.origin.where_words) is not None:
        # What was left out matters more than the way of the flow: that is cut off at the edge.
        room = width - 1 - cell_len(name) - len(counts) - cell_len(words) - 2
        told = tame(visible(filters))
        room = min(max(room, _FILTER), cell_len(told))
        pieces.append((fit(told, room) + "  ", "news"))
    return [*pieces, (words, "plain")]


def terms_line(graph: Graph, result: Result, width: int) -> list[Piece]:
    """Measure, settings, weights; what is proven.  The proof is kept where space is short."""
    if result.refusal is not None:
        return [(f" {result.measure}", "strong"), ("   no answer here: see below", "bad")]
    words = settings_words(result.settings, result.facts)
    words = f" {words}," if words else ""
    proof = f"order proven to {result.proven_order:,} of {graph.n:,}"
    if not result.stop.accurate:
        proof = f"{result.stop}, bound {small(result.bound.value)}, {proof}"
    if result.solved_on is not None and width >= 60:
        since = f", solved on {result.solved_on[:10]}" if width >= 100 else ""
        proof = f"from the store{since}; {proof}"
    room = max(width - len(result.measure) - cell_len(proof) - 3, 0)
    origin = graph.origin
    weighted = origin.weight is not None and origin.weight_as != "none"
    left = f"{words} weight {origin.weight_words}" if weighted else f"{words} no weights"
    if weighted and cell_len(left) > room:
        left = f"{words} by {origin.weight_words}"
    return [
        (f" {result.measure}", "strong"),
        (fit(left, room), "plain"),
        (f"  {proof}", "strong"),
    ]


def on_screen(sentence: str) -> str:
    """A sentence of the core for the screen, where options are settings and have no dashes."""
    return visible(sentence).replace("--", "")


def ruler_line(sitting: Sitting, node: int, width: int, glyphs: Glyphs) -> list[Piece]:
    """The node's name, its ruler, and the ranks in figures where there is room for them.

    Name and figures get the same room on every row, so that rulers can be compared.
    """
    n = sitting.graph.n
    found = sitting.ranks(node)
    end = f" {n:,}"
    named = min(max(width // 5, 8), 28)
    rest = width - named - len(end) - 6
    digits = len(f"{n:,}")
    words = {letter: f"{letter} {name}" for letter, (name, _, _) in found.items()}
    for wide in (True, False):
        heads = words if wide else {letter: letter for letter in words}
        room = sum(len(head) + digits + 3 for head in heads.values()) + 1
        legend = "  ".join(
            f"{head} {rank_range(*found[letter][1:]) if wide else f'{found[letter][1]:,}'}"
            for letter, head in heads.items()
        )
        if rest - room >= (48 if wide else 24):
            break
    else:
        room, legend = 0, ""
    name = tame(sitting.graph.name(node, 200), glyphs)
    marks = ruler(
        {letter: first for letter, (_, first, _) in found.items()},
        n,
        min(max(rest - room, 8), _TRACK),
        glyphs,
    )
    pieces: list[Piece] = [(f" {fit(name, named, glyphs=glyphs)}", "strong"), ("  1 ", "plain")]
    pieces += track_pieces(marks, glyphs)
    pieces.append((end, "plain"))
    if legend:
        pieces.append((f"   {legend}", "quiet"))
    return pieces


def track_pieces(marks: str, glyphs: Glyphs) -> list[Piece]:
    """A ruler with its letters standing out."""
    pieces: list[Piece] = []
    run = ""
    for char in marks:
        if char == glyphs.track:
            run += char
            continue
        if run:
            pieces.append((run, "quiet"))
            run = ""
        pieces.append((char, "letter"))
    if run:
        pieces.append((run, "quiet"))
    return pieces


def supports_line(graph: Graph, given: Contributions, width: int, glyphs: Glyphs) -> list[Piece]:
    """The strongest feeders with their shares; how many more there are."""
    count = len(given.neighbours)
    if count == 0:
        return [(" held up by  nothing: no neighbour gives score to it", "plain")]
    # Where a score is no sum over neighbours, only weights have shares.
    head = " held up by  " if given.of_score else " weight from  "
    pieces: list[Piece] = [(head, "plain")]
    used = len(head)
    for at in range(count):
        name = tame(graph.name(int(given.neighbours[at]), 120), glyphs)
        name = fit(name, min(cell_len(name), 24), glyphs=glyphs)
        share = percent(float(given.share[at]))
        drawn = bar(float(given.share[at]), _BAR, glyphs)
        size = cell_len(name) + len(share) + cell_len(drawn) + 4
        rest = len(f"+{count - at - 1:,} more")
        full = used + size + (rest if at < count - 1 else 0) > width
        if at == _SUPPORTS or (full and at > 0):
            pieces.append((f"+{count - at:,} more", "quiet"))
            return pieces
        pieces += [(f"{name} ", "plain"), (f"{share} ", "plain"), (drawn, "bar"), ("  ", "plain")]
        used += size
    return pieces


def parts_words(given: Contributions) -> str:
    """``feeders 83%  teleport 17%``."""
    if not given.of_score:
        return "shares are of weight, not of score"
    return "  ".join(f"{name} {percent(share)}" for name, share in given.parts.items())


def who_line(model: NodeModel, way: str, width: int, glyphs: Glyphs) -> list[Piece]:
    """Name and attributes of a node, and the way one came."""
    about = "   ".join(f"{name} {value}" for name, value in model.attributes if value)
    room = max(width - cell_len(way) - 3, 8)
    name = tame(model.name, glyphs)
    name = fit(name, min(cell_len(name), max(room // 2, 8)), glyphs=glyphs)
    left = fit(f"   {tame(about, glyphs)}", max(room - cell_len(name), 0), glyphs=glyphs)
    return [(f" {name}", "head"), (left, "plain"), (f" {way}", "quiet")]


def ranks_line(sitting: Sitting, node: int, width: int, glyphs: Glyphs) -> list[Piece]:
    """The node's rank in every measure, in figures; as many as fit, the rest counted."""
    pieces: list[Piece] = [(" ranks  ", "plain")]
    used, found = 8, sitting.ranks(node)
    for done, (letter, (name, first, last)) in enumerate(found.items()):
        text = f"{name} {rank_range(first, last)}   "
        more = f"+{len(found) - done:,} more"
        if used + 2 + cell_len(text) + (len(more) if done < len(found) - 1 else 0) > width:
            pieces.append((more, "quiet"))
            break
        pieces += [(f"{letter} ", "letter"), (text, "plain")]
        used += 2 + cell_len(text)
    return pieces


def what_line(
    sitting: Sitting,
    result: Result,
    model: NodeModel,
    score: ScoreFormat,
    width: int,
    glyphs: Glyphs,
) -> list[Piece]:
    """Score and rank of a node, where the score comes from, and its ruler where there is room."""
    n = sitting.graph.n
    first, last = result.standing.range_of(model.node)
    text = f" {result.measure} {score.text(float(result.scores[model.node]))}{score.unit}"
    text += f" ({rank_range(first, last)})   {parts_words(model.given)}"
    end = f" {n:,}"
    track = width - len(text) - len(end) - 7
    if track < 8:
        return [(text, "plain")]
    ranks = {letter: low for letter, (_, low, _) in sitting.ranks(model.node).items()}
    return [
        (text, "plain"),
        ("   1 ", "plain"),
        *track_pieces(ruler(ranks, n, track, glyphs), glyphs),
        (end, "plain"),
    ]
