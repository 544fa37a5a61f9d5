"""The views by their names, and which of them have what in common."""

from __future__ import annotations

STANDINGS, NODE, LOG, FORM, CHOICE, PROMPT, NOTICE, HELP, LOADING, SHORTLIST = (
    "standings",
    "node",
    "log",
    "form",
    "choice",
    "prompt",
    "notice",
    "help",
    "loading",
    "shortlist",
)
COLUMNS = "columns"  # sheet that chooses them
SOLVES, APART = "solves", "apart"  # every solve; how two of them differ
WAY, PLATE = "way", "plate"  # from one node to another; everything known of one
START = "start"  # tables to choose from
ROLES = "roles"  # which column of a table is what
DOING = "doing"  # sheet that lists every action
MAKEUP = "makeup"
# Answers to what is asked of the graph; each is one table too.
AGREEMENT, WHY, THAN, LOSS, LOSSES, ALONG, WALK, DRIFT = (
    "agreement",
    "why",
    "than",
    "loss",
    "losses",
    "along",
    "walk",
    "drift",
)
ANSWERS = (AGREEMENT, WHY, THAN, LOSS, LOSSES, ALONG, WALK, DRIFT)
LISTS = (SHORTLIST, SOLVES, APART, WAY, PLATE, MAKEUP, *ANSWERS)  # views that are one table
TABLES = (STANDINGS, NODE, LOG, CHOICE, HELP, COLUMNS, START, ROLES, *LISTS)
ROOMS = (STANDINGS, NODE, LOG, HELP, *LISTS)
NODES = (STANDINGS, NODE, SHORTLIST)  # views in which a node is at hand
ASKED = (STANDINGS, NODE, LOG, SHORTLIST, *ANSWERS)  # views in which something can be asked
TYPING = (FORM, PROMPT, DOING)
LINES = (FORM, DOING)  # views of lines in which one types

# Views as they are named in a sentence.
VIEW_WORDS = {
    STANDINGS: "Standings",
    NODE: "Node",
    LOG: "Solve log",
    FORM: "Settings",
    CHOICE: "a choice",
    PROMPT: "a question",
    NOTICE: "a notice",
    HELP: "Help",
    LOADING: "Loading",
    SHORTLIST: "Shortlist",
    COLUMNS: "Columns",
    SOLVES: "All solves",
    APART: "Two solves",
    WAY: "Way",
    PLATE: "Name plate",
    MAKEUP: "Makeup",
    START: "Start",
    ROLES: "Column roles",
    DOING: "Any action",
    AGREEMENT: "Agreement",
    WHY: "Why",
    THAN: "Why one stands above another",
    LOSS: "Loss of a node",
    LOSSES: "Losses",
    ALONG: "Along a setting",
    WALK: "Walk",
    DRIFT: "Drift",
}
