"""Citations of an invented field, reef kinetics: the study of reefs that walk.  1984 to 2023."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from dice import Dice, Floats, Ints

SEED = 1_984
PAPERS = 20_000
FIRST, LAST = 1984, 2023
FORWARD = 60  # citations that point to a later year: errors of the index
MEDIAN_REFERENCES = 9.65
COPIED = 0.30  # share of references taken over from the list of a paper already cited

# topic -> year of its height, years around it in which it is worked on, weight
TOPICS: dict[str, tuple[int, int, float]] = {
    "polyp gait": (1988, 12, 0.9),
    "shoal tides": (1990, 30, 1.2),
    "lattice drift": (1994, 14, 1.3),
    "kelp harmonics": (1998, 12, 0.9),
    "brine memory": (2003, 12, 1.1),
    "spur phasing": (2009, 9, 0.9),
    "atoll migration": (2014, 10, 1.2),
    "tidal lensing": (2020, 7, 1.3),
}
VENUES: tuple[tuple[str, float], ...] = (
    ("Annals of Wandering Reefs", 3.0),
    ("Brine and Lattice Reports", 2.5),
    ("Shoal Society Proceedings", 2.0),
    ("Journal of Slow Currents", 1.6),
    ("Spur and Groove", 1.0),
    ("Low Water Letters", 0.8),
    ("Tidewrack Quarterly", 0.6),
)
SURVEYS = "Reviews of Walking Reefs"  # long reference lists, much cited


@dataclass
class Library:
    """Papers in the order of publication, and whom each cites."""

    year: Ints
    topic: Ints
    fitness: Floats
    length: Ints
    survey: Ints
    cites: list[list[int]] = field(default_factory=list)
    hidden: set[int] = field(default_factory=set)

    def first_of(self, year: int) -> int:
        """Number of the first paper of a year."""
        return int(np.searchsorted(self.year, year))


def publish(dice: Dice) -> Library:
    """Give every paper a year, a topic, a fitness and a length of its reference list."""
    years = np.arange(FIRST, LAST + 1)
    counts = np.floor(PAPERS * (share := 1.058 ** (years - FIRST)) / share.sum()).astype(np.int64)
    counts[-1] += PAPERS - counts.sum()
    year = np.repeat(years, counts)
    height = np.array([spec[0] for spec in TOPICS.values()])
    width = np.array([spec[1] for spec in TOPICS.values()])
    weight = np.array([spec[2] for spec in TOPICS.values()])
    topic = np.empty(PAPERS, np.int64)
    start = 0
    for now, count in zip(years, counts, strict=True):
        chances = weight * np.exp(-0.5 * ((now - height) / width) ** 2)
        topic[start : start + count] = dice.pick(chances, int(count))
        start += count
    length = np.clip(dice.lognormal(MEDIAN_REFERENCES, 0.65, PAPERS), 1, 60).astype(np.int64)
    length[dice.uniform(PAPERS) < 0.03] = 0  # the index never saw their reference lists
    library = Library(
        year, topic, dice.lognormal(1.0, 1.15, PAPERS), length, np.zeros(PAPERS, np.int64)
    )
    for now in range(FIRST + 4, LAST + 1):  # one survey a year, early in the year
        paper = library.first_of(now) + 3
        library.survey[paper] = 1
        library.length[paper] = 95
        library.fitness[paper] = 45.0
    return library


def plant(library: Library) -> dict[str, int]:
    """The papers of the story, by role; see README.md."""
    lantern = library.first_of(1989) + 11  # the field's best-known paper; cites two papers only
    quiet = library.first_of(1985) + 6  # the one idea the lantern rests on; hardly cited otherwise
    primer = library.first_of(1987) + 20  # cited by every survey, and by little else
    library.fitness[lantern] = 420.0
    library.length[lantern] = 2
    for paper in (quiet, primer):  # nobody comes upon them, nor copies them from a list
        library.fitness[paper] = 0.0
        library.hidden.add(paper)
    return {"lantern": lantern, "quiet": quiet, "primer": primer}


def cite(dice: Dice, library: Library, story: dict[str, int]) -> None:
    """Write the reference lists, year by year.

    A reference is taken over from the list of a paper already cited (the copy model), else drawn
    from earlier years in proportion to fitness, attention gained so far and freshness, mostly
    within the topic; now and then from earlier in the same year.
    """
    cited = np.zeros(PAPERS)
    for now in range(FIRST, LAST + 1):
        start, stop = library.first_of(now), library.first_of(now + 1)
        appeal = library.fitness[:start] * (1.0 + np.log1p(cited[:start]))
        appeal = appeal * np.exp((library.year[:start] - now) / 9.0)
        shelves = [np.cumsum(appeal)]
        shelves += [np.cumsum(np.where(library.topic[:start] == t, appeal, 0.0)) for t in range(8)]
        for paper in range(start, stop):
            chosen = references(dice, library, paper, start, shelves)
            if library.survey[paper]:
                chosen = sorted({*chosen, story["primer"]})
            if paper == story["lantern"]:
                chosen = sorted([story["quiet"], library.first_of(1986) + 2])
            if paper in (start + 5, start + 9) and now in (1990, 1997):
                chosen = sorted({*chosen, story["quiet"]})
            library.cites.append(chosen)
        for chosen in library.cites[start:stop]:
            cited[chosen] += 1.0


def references(
    dice: Dice, library: Library, paper: int, start: int, shelves: list[Floats]
) -> list[int]:
    """The reference list of one paper: different earlier papers, ascending."""
    wanted = int(library.length[paper])
    draws = dice.uniform(4 * wanted).reshape(-1, 4)
    chosen: set[int] = set()
    order: list[int] = []
    for kind, within, place, slot in draws.tolist():
        pick = -1
        if kind < COPIED and order:
            shelf = library.cites[order[int(place * len(order))]]
            pick = shelf[int(slot * len(shelf))] if shelf else -1
        elif kind > 0.985 and paper > start:
            pick = start + int(place * (paper - start))
        else:
            own = within < 0.78 and not library.survey[paper]
            ends = shelves[1 + int(library.topic[paper])] if own else shelves[0]
            if len(ends) and ends[-1] > 0:
                pick = min(int(np.searchsorted(ends, place * ends[-1], side="right")), start - 1)
        if pick >= 0 and pick not in chosen and pick not in library.hidden:
            chosen.add(pick)
            order.append(pick)
    return sorted(chosen)


def misprint(dice: Dice, library: Library, story: dict[str, int]) -> None:
    """Add the errors of the index: citations from a paper to one of a later year."""
    spared = {story["lantern"], story["quiet"], story["primer"]}
    cited = np.bincount([p for chosen in library.cites for p in chosen], minlength=PAPERS)
    added = 0
    while added < FORWARD:
        citing = int(dice.pick(cited[: library.first_of(2012)] + 0.2, 1)[0])
        later = library.first_of(int(library.year[citing]) + dice.between(1, 11))
        wrong = later + dice.between(0, 200)
        if wrong < PAPERS and citing not in spared and wrong not in library.cites[citing]:
            library.cites[citing] = sorted({*library.cites[citing], wrong})
            added += 1


def tables() -> dict[str, pa.Table]:
    """File stem -> table."""
    dice = Dice(SEED)
    library = publish(dice)
    story = plant(library)
    cite(dice, library, story)
    misprint(dice, library, story)
    serial = np.arange(PAPERS) - np.searchsorted(library.year, library.year) + 1
    ids = [f"rk-{y}-{s:04}" for y, s in zip(library.year.tolist(), serial.tolist(), strict=True)]
    citing = np.repeat(np.arange(PAPERS), [len(chosen) for chosen in library.cites])
    cited = np.array([p for chosen in library.cites for p in chosen])
    names, weights = zip(*VENUES, strict=True)
    venue = dice.pick(np.array(weights), PAPERS)
    label = pa.array(ids, pa.string())
    return {
        "reef_citations": pa.table({"citing": label.take(citing), "cited": label.take(cited)}),
        "reef_papers": pa.table(
            {
                "paper": label,
                "year": pa.array(library.year, pa.int16()),
                "venue": pa.array(
                    [
                        SURVEYS if s else names[v]
                        for s, v in zip(library.survey, venue, strict=True)
                    ],
                    pa.string(),
                ),
                "topic": pa.array([list(TOPICS)[t] for t in library.topic], pa.string()),
            }
        ),
    }
