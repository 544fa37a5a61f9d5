"""The names of an invented ferry-ticketing platform: teams, what they look after, and roles."""

from __future__ import annotations

# What each team looks after; its services are named <subject>-<role>.
TEAMS: dict[str, tuple[str, ...]] = {
    "berths": ("seat", "cabin", "berth", "deck", "lounge", "pet-corner", "recliner"),
    "fares": ("fare", "discount", "season-pass", "group-rate", "surcharge", "voucher", "islander"),
    "access": ("sign-in", "session", "consent", "passkey", "household", "guest", "badge"),
    "tides": ("tide-table", "swell", "fog", "current", "draught", "slack-water", "surge"),
    "manifest": (
        "passenger",
        "manifest",
        "infant",
        "crew-list",
        "headcount",
        "border-form",
        "roll",
    ),
    "crossings": ("crossing", "timetable", "delay", "sailing", "turnround", "diversion", "lane"),
    "vehicles": ("vehicle", "axle", "trailer", "bicycle", "car-deck", "charger", "plate"),
    "galley": ("menu", "tray", "supper", "allergen", "coffee-cart", "larder", "cutlery"),
    "parcels": ("parcel", "crate", "mailbag", "cold-box", "waybill", "pallet", "hatch"),
    "loyalty": (
        "nautical-mile",
        "reward",
        "tier-badge",
        "referral",
        "birthday",
        "stamp-card",
        "perk",
    ),
    "payments": ("till", "refund", "invoice", "instalment", "currency", "deposit", "chargeback"),
    "notices": ("notice", "text-message", "postcard", "deck-call", "alert", "pager", "leaflet"),
    "kiosks": ("kiosk", "receipt", "queue-ticket", "barcode", "turnstile", "lost-card", "screen"),
    "charts": ("chart", "harbour-map", "buoy", "route", "sandbank", "pilotage", "lighthouse"),
    "quayside": ("gangway", "mooring", "ramp", "tug", "fender", "quay-slot", "bollard"),
    "ledgerhouse": (
        "revenue",
        "tax",
        "settlement",
        "audit-sample",
        "forecast",
        "budget",
        "payroll",
    ),
}

# Roles by tier: 1 what people touch, 2 what decides, 3 what records, 4 what stores.
ROLES: dict[int, tuple[str, ...]] = {
    1: ("page", "desk", "panel", "form"),
    2: ("planner", "rules", "quoter", "allocator", "checker", "matcher"),
    3: ("ledger", "register", "lookup", "history", "calendar", "inventory"),
    4: ("cache", "store", "index", "archive", "mirror"),
}
SERVICES_PER_TEAM: dict[int, int] = {1: 4, 2: 8, 3: 7, 4: 4}

# These exist whatever the draw, because the story needs them.
NAMED: dict[str, tuple[str, int]] = {
    "seat-inventory": ("berths", 3),
    "price-rules": ("fares", 2),
    "tide-table-cache": ("tides", 4),
    "seat-inventory-standby": ("berths", 3),
    "lease-umpire": ("quartermaster", 3),
    "snapshot-replay": ("quartermaster", 4),
    "tide-gauge-poller": ("tides", 3),
    "tide-gauge-bridge": ("tides", 3),
    "fog-horn-east": ("quayside", 4),
    "fog-horn-west": ("quayside", 4),
    "night-tally": ("ledgerhouse", 4),
    "winter-timetable-import": ("crossings", 4),
}
GATES: tuple[str, ...] = ("web-gate", "mobile-gate", "kiosk-gate", "agent-gate", "partner-gate")
SHARED: tuple[str, ...] = (
    "identity",
    "audit-trail",
    "bell-relay",
    "flag-lamp",
    "config-loft",
    "trace-buoy",
    "key-chest",
    "rate-keeper",
    "clock-signal",
    "name-finder",
)
# A corner with no way to the rest: scanners on the quays that only ever call printers.
SCANNERS: tuple[str, ...] = ("gull-pier-scanner", "salt-pier-scanner", "heron-pier-scanner")
PRINTERS: tuple[str, ...] = ("gull-pier-printer", "salt-pier-printer")

RETIRED: tuple[str, ...] = (
    "paper-ticket-desk",
    "fax-bridge",
    "steam-schedule-store",
    "coupon-press",
    "telex-relay",
    "carbon-copy-archive",
)
# Running, but nobody wrote them into the service list.
UNLISTED: tuple[str, ...] = ("name-finder", "heron-pier-scanner", "night-tally", "fog-horn-west")

REGIONS: tuple[str, ...] = ("lagoon", "north-strait", "outer-isles", "river-mouth")
LANGUAGES: tuple[str, ...] = ("go", "java", "python", "rust", "kotlin", "typescript", "elixir")
