"""Blind pairwise tastings at an invented cheese fair: a juror says which of two is better."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
from dice import Dice, Floats, Ints

SEED = 606
ROUNDS = 16  # in each, cheeses of like standing are set beside each other
VALLEYS: tuple[str, ...] = ("Upper Orrin", "Lower Orrin", "Vell", "Sarrow", "Tammas Edge")
STYLES: tuple[str, ...] = ("washed rind", "blue", "hard", "bloomy rind", "fresh", "smoked")
MILKS: tuple[str, ...] = ("cow", "goat", "ewe")
CHEESES: tuple[str, ...] = (
    "Old Barnaby",
    "Saltmarsh Plum",
    "Quarry Blue",
    "Widow's Button",
    "Hollow Lane",
    "Tansy Drum",
    "Brindle Wheel",
    "Clapper Gate",
    "Mossy Ewe",
    "Pike and Thistle",
    "Lantern Fell",
    "Nettle Coin",
    "Underhill Grey",
    "Foxglove Log",
    "Parson's Doorstop",
    "Ember Smoke",
    "Little Orrin",
    "Vell Crown",
    "Sarrow Ash",
    "Tammas Cobble",
    "Juniper Loaf",
    "Heron Curd",
    "Bracken Slab",
    "Cider Moon",
    "Dairymaid's Secret",
    "Flint Crumbly",
    "Grumbling Goat",
    "Hayloft Gold",
    "Ironbark",
    "Kettle Blue",
    "Larkspur Round",
    "Millrace",
    "North Byre",
    "Oatcake's Friend",
    "Peppered Jenny",
    "Quince Hollow",
    "Russet Band",
    "Shepherd's Nap",
    "Thunder Rind",
    "Upland Feather",
    "Velvet Cow",
    "Wicker Tom",
    "Yarrow Press",
    "Amber Stile",
    "Bellfounder",
    "Copper Ewe",
    "Drover's Pocket",
    "Elderflower Disc",
    "Fiddler's Heel",
    "Goose Green",
    "Harvest Mouse",
    "Ivy Cellar",
    "Jackdaw",
    "Kestrel White",
    "Limekiln",
    "Marrow Lane",
    "Nine Acre",
    "Orchard Brick",
    "Plough Blue",
    "Ropewalk",
)
QUIET_BEST = "Lantern Fell"  # few tastings, but against the best, and won
LUCKY = "Parson's Doorstop"  # the crowd's darling: drawn against weak cheeses again and again
EVERYWHERE = "Nine Acre"  # the sponsor's cheese, on nearly every plate, and middling
NEVER_WON = "Ropewalk"
NEVER_LOST = "Little Orrin"  # came late, tasted three times


def meet(dice: Dice, quality: Floats) -> list[tuple[int, int]]:
    """Who is set beside whom: like with like in the rounds, then the story's extra tastings."""
    count = len(CHEESES)
    number = {name: place for place, name in enumerate(CHEESES)}
    shy = {number[QUIET_BEST], number[NEVER_LOST], number[NEVER_WON]}
    pairs: list[tuple[int, int]] = []
    for turn in range(ROUNDS):
        standing = np.argsort(quality + (2.4 - 0.15 * turn) * dice.normal(count), kind="stable")
        present = [int(c) for c in standing if c not in shy and dice.one() < 0.9]
        pairs += list(zip(present[0::2], present[1::2], strict=False))
    order = [int(c) for c in np.argsort(-quality, kind="stable")]
    best = [c for c in order if c not in shy][:9]
    weak = [c for c in order if c not in shy and c != number[LUCKY]][-22:]
    middling = [c for c in order if c not in shy and c != number[EVERYWHERE]]
    pairs += [(number[QUIET_BEST], c) for c in best]
    pairs += [(number[LUCKY], weak[i]) for i in dice.sample(np.ones(len(weak)), 22)]
    pairs += [(number[LUCKY], weak[i]) for i in dice.sample(np.ones(len(weak)), 12)]
    pairs += [(number[EVERYWHERE], middling[i]) for i in dice.sample(np.ones(len(middling)), 48)]
    pairs += [(number[EVERYWHERE], middling[i]) for i in dice.sample(np.ones(len(middling)), 24)]
    pairs += [(number[NEVER_LOST], order[i]) for i in (27, 33, 41)]
    pairs += [(number[NEVER_WON], order[i]) for i in (20, 30, 36, 44, 50)]
    return [(a, b) for a, b in pairs if a != b]


def judge(dice: Dice, quality: Floats, pairs: list[tuple[int, int]]) -> tuple[Ints, Ints, Floats]:
    """Winner, loser and margin (half points, 0.5 to 10) of every tasting."""
    number = {name: place for place, name in enumerate(CHEESES)}
    first, second = np.array(pairs).T
    gap = quality[first] - quality[second] + 0.75 * dice.normal(len(pairs))
    gap[(first == number[NEVER_LOST])] = np.abs(gap[first == number[NEVER_LOST]])
    gap[(first == number[NEVER_WON])] = -np.abs(gap[first == number[NEVER_WON]])
    winner = np.where(gap > 0, first, second)
    loser = np.where(gap > 0, second, first)
    margin = np.clip(np.round(2 * (0.5 + 1.6 * np.abs(gap))) / 2, 0.5, 10.0)
    return winner, loser, margin


def tables() -> dict[str, pa.Table]:
    """File stem -> table."""
    dice = Dice(SEED)
    quality = dice.normal(len(CHEESES))
    for name, value in (
        (QUIET_BEST, 2.9),
        (LUCKY, 0.35),
        (EVERYWHERE, 0.0),
        (NEVER_WON, -2.2),
        (NEVER_LOST, 0.6),
    ):
        quality[CHEESES.index(name)] = value
    pairs = meet(dice, quality)
    winner, loser, margin = judge(dice, quality, pairs)
    names = pa.array(CHEESES, pa.string())
    order = dice.sample(np.ones(len(pairs)), len(pairs))  # the order in which slips were handed in
    return {
        "cheese_tastings": pa.table(
            {
                "loser": names.take(loser[order]),
                "winner": names.take(winner[order]),
                "margin": pa.array(margin[order], pa.float64()),
            }
        ),
        "cheese_list": pa.table(
            {
                "cheese": names,
                "valley": pa.array([VALLEYS[i] for i in dice.pick(np.ones(5), len(CHEESES))]),
                "style": pa.array([STYLES[i] for i in dice.pick(np.ones(6), len(CHEESES))]),
                "milk": pa.array(
                    [MILKS[i] for i in dice.pick(np.array([5.0, 3.0, 2.0]), len(CHEESES))]
                ),
                "months": pa.array(
                    np.clip(dice.lognormal(6.0, 0.9, len(CHEESES)), 0, 60).astype(np.int16)
                ),
            }
        ),
    }
