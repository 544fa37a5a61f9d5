"""Service calls of an invented ferry-ticketing platform: an ordinary hour and a failover hour."""

from __future__ import annotations

from dataclasses import dataclass, field

import harbour_names as names
import numpy as np
import pyarrow as pa
from dice import Dice, Floats

SEED = 20_417
PRIMARY, STANDBY, UMPIRE = "seat-inventory", "seat-inventory-standby", "lease-umpire"
Calls = dict[tuple[str, str], float]


@dataclass
class Fleet:
    """All services: name -> (team, tier), and how popular each is inside its tier."""

    services: dict[str, tuple[str, int]] = field(default_factory=dict)
    popularity: dict[str, float] = field(default_factory=dict)

    def of(self, tier: int, team: str | None = None) -> list[str]:
        """Ordinary services of a tier, of one team or of all."""
        return [
            name
            for name, (own, level) in self.services.items()
            if level == tier
            and own in names.TEAMS
            and team in (None, own)
            and name in self.popularity
        ]


def recruit(dice: Dice) -> Fleet:
    """Name the services and give each a heavy-tailed popularity."""
    fleet = Fleet()
    for gate in names.GATES:
        fleet.services[gate] = ("front-door", 1)
    for shared in names.SHARED:
        fleet.services[shared] = ("quartermaster", 0)
    for pier in names.SCANNERS + names.PRINTERS:
        fleet.services[pier] = ("quayside", 4)
    fleet.services.update(names.NAMED)
    for team, subjects in names.TEAMS.items():
        for tier, wanted in names.SERVICES_PER_TEAM.items():
            grid = [f"{subject}-{role}" for subject in subjects for role in names.ROLES[tier]]
            grid = [name for name in grid if name not in fleet.services]
            for place in sorted(dice.sample(np.ones(len(grid)), wanted)):
                fleet.services[grid[place]] = (team, tier)
    story = set(names.NAMED) - {"price-rules", "tide-table-cache"}
    ordinary = [
        name
        for name, (team, tier) in fleet.services.items()
        if team in names.TEAMS
        and tier > 0
        and name not in story
        and name not in names.SCANNERS + names.PRINTERS
    ]
    for name, weight in zip(ordinary, dice.lognormal(1.0, 1.2, len(ordinary)), strict=True):
        fleet.popularity[name] = float(weight)
    fleet.popularity["price-rules"] = 30.0
    return fleet


def choose(
    dice: Dice, fleet: Fleet, pool: list[str], count: int, *, home: str, pull: float
) -> list[str]:
    """Callees from a pool: popular ones more often, ``pull`` times more from the own team."""
    weights: Floats = np.array(
        [
            fleet.popularity[name] * (pull if fleet.services[name][0] == home else 1.0)
            for name in pool
        ]
    )
    return [pool[place] for place in dice.sample(weights, count)]


def ordinary_hour(dice: Dice, fleet: Fleet) -> Calls:
    """Calls a minute between services, propagated from the gates down the tiers."""
    calls: Calls = {}
    rate: dict[str, float] = {}

    def call(caller: str, callee: str, volume: float) -> None:
        if caller != callee:
            calls[caller, callee] = calls.get((caller, callee), 0.0) + volume
            rate[callee] = rate.get(callee, 0.0) + volume

    fronts = fleet.of(1)
    for gate, volume in zip(names.GATES, (2_600.0, 3_100.0, 420.0, 160.0, 240.0), strict=True):
        rate[gate] = volume
        chosen = choose(dice, fleet, fronts, dice.between(24, 52), home="", pull=1.0)
        shares = np.array([fleet.popularity[name] for name in chosen])
        for name, share in zip(chosen, shares / shares.sum(), strict=True):
            call(gate, name, 1.1 * volume * float(share))
    # (from tier, to tier, fewest, most, how strongly the own team is preferred, median fan-out)
    for here, there, fewest, most, pull, fan in (
        (1, 2, 6, 13, 22.0, 0.30),
        (2, 3, 4, 10, 22.0, 0.35),
        (3, 4, 1, 4, 60.0, 0.30),
    ):
        pool = fleet.of(there)
        for caller in fleet.of(here):
            chosen = choose(
                dice,
                fleet,
                pool,
                dice.between(fewest, most),
                home=fleet.services[caller][0],
                pull=pull,
            )
            for callee, part in zip(chosen, dice.lognormal(fan, 1.0, len(chosen)), strict=True):
                call(caller, callee, rate.get(caller, 0.4) * min(float(part), 3.0))
            if here == 1 and dice.one() < 0.45:
                call(
                    caller,
                    "price-rules",
                    rate.get(caller, 0.4) * float(dice.lognormal(0.8, 0.6, 1)[0]),
                )
            if here == 2 and dice.one() < (0.95 if fleet.services[caller][0] == "berths" else 0.40):
                call(caller, PRIMARY, rate.get(caller, 0.4) * float(dice.lognormal(1.1, 0.6, 1)[0]))
    for callee in ("berth-archive", "deck-index", "seat-cache", "cabin-store"):
        keep = (
            callee
            if callee in fleet.services
            else choose(dice, fleet, fleet.of(4, "berths"), 1, home="berths", pull=1.0)[0]
        )
        call(PRIMARY, keep, 0.2 * rate[PRIMARY])
    sideways(dice, fleet, rate, call)
    infrastructure(dice, fleet, rate, call)
    corners(dice, fleet, call)
    return calls


def sideways(dice: Dice, fleet: Fleet, rate: dict[str, float], call) -> None:
    """Calls between peers: they close the cycles of a platform that grew for years."""
    for tier, most, fan in ((2, 4, 0.06), (3, 2, 0.08)):
        pool = fleet.of(tier)
        for caller in pool:
            for callee in choose(
                dice, fleet, pool, dice.between(0, most), home=fleet.services[caller][0], pull=2.0
            ):
                call(caller, callee, rate.get(caller, 0.4) * float(dice.lognormal(fan, 0.9, 1)[0]))


def infrastructure(dice: Dice, fleet: Fleet, rate: dict[str, float], call) -> None:
    """Shared services that nearly everybody leans on, and the relay that calls everybody back."""
    # Chance that a service of tier 1, 2, 3, 4 calls it; median calls for each call served.
    habits = {
        "identity": ((0.95, 0.75, 0.45, 0.05), 0.50),
        "audit-trail": ((0.30, 0.65, 0.85, 0.30), 0.04),
        "flag-lamp": ((0.90, 0.70, 0.35, 0.02), 0.30),
        "config-loft": ((0.40, 0.40, 0.40, 0.30), 0.01),
        "trace-buoy": ((0.80, 0.60, 0.45, 0.20), 0.12),
        "rate-keeper": ((0.70, 0.15, 0.02, 0.00), 0.60),
        "key-chest": ((0.00, 0.10, 0.25, 0.30), 0.02),
        "clock-signal": ((0.00, 0.15, 0.15, 0.15), 0.01),
        "name-finder": ((0.25, 0.25, 0.15, 0.00), 0.03),
    }
    callers = [*names.GATES, PRIMARY, *fleet.popularity]
    for callee, (chances, fan) in habits.items():
        for caller in callers:
            tier = fleet.services[caller][1]
            if dice.one() < chances[tier - 1]:
                call(caller, callee, rate.get(caller, 0.4) * float(dice.lognormal(fan, 0.7, 1)[0]))
    for caller in (PRIMARY, *fleet.of(3)):
        if dice.one() < 0.7:
            call(
                caller, "bell-relay", rate.get(caller, 0.4) * float(dice.lognormal(0.10, 0.8, 1)[0])
            )
    for callee in choose(dice, fleet, fleet.of(1) + fleet.of(2), 70, home="notices", pull=5.0):
        call("bell-relay", callee, rate["bell-relay"] * float(dice.lognormal(0.006, 1.1, 1)[0]))
    for caller, callee, fan in (
        ("identity", "key-chest", 0.55),
        ("identity", "audit-trail", 0.30),
        ("identity", "session-store", 0.80),
        ("identity", "household-ledger", 0.05),
        ("rate-keeper", "config-loft", 0.01),
        ("rate-keeper", "clock-signal", 0.20),
        ("key-chest", "audit-trail", 0.20),
        ("key-chest", "clock-signal", 0.10),
        ("audit-trail", "bell-relay", 0.02),
        ("audit-trail", "clock-signal", 0.05),
        ("flag-lamp", "config-loft", 0.02),
        ("name-finder", "config-loft", 0.05),
    ):
        if callee not in fleet.services:
            callee = choose(dice, fleet, fleet.of(4, "access"), 1, home="", pull=1.0)[0]
        call(caller, callee, fan * rate[caller])


def corners(dice: Dice, fleet: Fleet, call) -> None:
    """What makes a real call graph awkward: a chattering pair, islands, a batch that only calls."""
    # Two services that poll each other all day: volume without anybody leaning on them.
    call("tide-gauge-poller", "tide-gauge-bridge", 31_000.0)
    call("tide-gauge-bridge", "tide-gauge-poller", 29_500.0)
    call("bell-relay", "tide-gauge-poller", 2.0)
    call("tide-gauge-bridge", "tide-table-cache", 45.0)
    call("tide-gauge-bridge", "audit-trail", 1.5)
    call("tide-gauge-poller", "trace-buoy", 60.0)
    call("fog-horn-east", "fog-horn-west", 60.0)
    call("fog-horn-west", "fog-horn-east", 60.0)
    for scanner, printer, volume in zip(
        names.SCANNERS + names.SCANNERS,
        names.PRINTERS * 3,
        (9.0, 4.5, 7.2, 1.1, 0.6, 2.4),
        strict=True,
    ):
        call(scanner, printer, volume)
    for callee in choose(dice, fleet, fleet.of(4), 26, home="", pull=1.0):
        call("night-tally", callee, 3.0 * dice.one() + 0.1)
    call(
        "winter-timetable-import",
        "timetable-ledger"
        if "timetable-ledger" in fleet.services
        else choose(dice, fleet, fleet.of(3, "crossings"), 1, home="", pull=1.0)[0],
        1.4,
    )
    # The standby lives on a trickle until the day it is needed, and so does its umpire.
    call(PRIMARY, STANDBY, 0.8)
    call(STANDBY, UMPIRE, 0.1)
    call(STANDBY, "trace-buoy", 2.4)
    call(choose(dice, fleet, fleet.of(3, "berths"), 1, home="", pull=1.0)[0], UMPIRE, 0.2)
    call(UMPIRE, "key-chest", 0.3)
    call(UMPIRE, "clock-signal", 0.2)


def failover_hour(dice: Dice, before: Calls) -> Calls:
    """The same platform while the primary seat inventory is down and its standby serves.

    A tenth of the calls still reaches the primary; the rest goes to the standby, with retries.
    Callers of the primary are themselves retried.  For nearly every call the standby has to ask
    the lease umpire whether it may write, which is how a service hardly anybody knew gets busy.
    """
    waiting = {caller for caller, callee in before if callee == PRIMARY}
    jitter = np.exp(0.05 * dice.normal(len(before)))
    after: Calls = {}
    for ((caller, callee), volume), wobble in zip(before.items(), jitter, strict=True):
        now = volume * float(wobble)
        if caller == "winter-timetable-import":
            continue  # the nightly import is on hold for the hour
        if callee == PRIMARY:
            after[caller, PRIMARY] = 0.10 * now
            after[caller, STANDBY] = (1.5 + 0.4 * dice.one()) * now
        elif caller == PRIMARY:
            after[caller, callee] = now if callee == STANDBY else 0.10 * now
        else:
            after[caller, callee] = now * (1.25 if callee in waiting and caller != STANDBY else 1.0)
    served = sum(volume for (_, callee), volume in after.items() if callee == STANDBY)
    after[STANDBY, UMPIRE] = 0.92 * served
    after[STANDBY, "snapshot-replay"] = 0.03 * served
    after[STANDBY, "bell-relay"] = 0.05 * served
    after[STANDBY, "audit-trail"] = 0.04 * served
    for (caller, callee), volume in before.items():
        if caller == PRIMARY and callee not in (STANDBY, "bell-relay", "audit-trail"):
            after[STANDBY, callee] = 0.5 * volume
    after[UMPIRE, "key-chest"] = 0.05 * served
    after[UMPIRE, "clock-signal"] = 0.30 * served
    after["snapshot-replay", "config-loft"] = 0.4
    after["snapshot-replay", UMPIRE] = 0.01 * served
    return after


def table(dice: Dice, calls: Calls, *, failing: bool) -> pa.Table:
    """Split every pair over regions and add error rates; one row a caller, callee and region."""
    rows: list[tuple[str, str, float, float, str]] = []
    places = np.array([1.0, 0.6, 0.35, 0.5])
    for (caller, callee), volume in sorted(calls.items()):
        count = 1 + int((dice.uniform(3) < (0.33, 0.16, 0.08)).sum())
        if volume > 2_000:
            count = max(count, 3)
        spread = dice.sample(places, count)
        shares = -np.log(1.0 - dice.uniform(count)) + 0.05
        errors = np.minimum(dice.lognormal(0.0015, 1.1, count), 0.04)
        if failing and callee == PRIMARY:
            errors = 0.55 + 0.4 * dice.uniform(count)
        elif failing and callee in (STANDBY, UMPIRE, "snapshot-replay"):
            errors = 0.03 + 0.12 * dice.uniform(count)
        for region, share, error in sorted(zip(spread, shares / shares.sum(), errors, strict=True)):
            busy = max(round(float(volume * share), 2), 0.01)
            rows.append((caller, callee, busy, round(float(error), 5), names.REGIONS[region]))
    columns = list(zip(*rows, strict=True))
    return pa.table(
        {
            "caller": pa.array(columns[0], pa.string()),
            "callee": pa.array(columns[1], pa.string()),
            "calls_per_min": pa.array(columns[2], pa.float64()),
            "error_rate": pa.array(columns[3], pa.float64()),
            "region": pa.array(columns[4], pa.string()),
        }
    )


def services(dice: Dice, fleet: Fleet) -> pa.Table:
    """The service list as somebody keeps it by hand: a few are missing, a few are long gone."""
    listed = {name: home for name, home in fleet.services.items() if name not in names.UNLISTED}
    listed.update(dict.fromkeys(names.RETIRED, ("quartermaster", 4)))
    spoken = dict.fromkeys([home for home, _ in listed.values()])
    habit = {team: dice.sample(np.array([5.0, 4.0, 3.0, 2.0, 2.0, 2.0, 1.0]), 3) for team in spoken}
    order = sorted(listed)
    return pa.table(
        {
            "service": pa.array(order, pa.string()),
            "team": pa.array([listed[name][0] for name in order], pa.string()),
            "tier": pa.array([listed[name][1] for name in order], pa.int8()),
            "language": pa.array(
                [
                    names.LANGUAGES[
                        habit[listed[name][0]][dice.pick(np.array([6.0, 3.0, 1.0]), 1)[0]]
                    ]
                    for name in order
                ],
                pa.string(),
            ),
        }
    )


def tables() -> dict[str, pa.Table]:
    """File stem -> table."""
    dice = Dice(SEED)
    fleet = recruit(dice)
    before = ordinary_hour(dice, fleet)
    after = failover_hour(dice, before)
    return {
        "harbour_calls": table(dice, before, failing=False),
        "harbour_calls_failover": table(dice, after, failing=True),
        "harbour_services": services(dice, fleet),
    }
