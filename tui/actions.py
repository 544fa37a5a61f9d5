"""The registry of actions: what can be done, by which keys, in which views, in what words.

Key bindings, the line of keys at the foot of the screen and the help are all made from this
table; an action that is not here does not exist.  A key means the same wherever it works.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

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
_LISTS = (SHORTLIST, SOLVES, APART, WAY, PLATE, MAKEUP, *ANSWERS)  # views that are one table
_TABLES = (STANDINGS, NODE, LOG, CHOICE, HELP, COLUMNS, START, ROLES, *_LISTS)
_ROOMS = (STANDINGS, NODE, LOG, HELP, *_LISTS)
_NODES = (STANDINGS, NODE, SHORTLIST)  # views in which a node is at hand
_ASKED = (STANDINGS, NODE, LOG, SHORTLIST, *ANSWERS)  # views in which something can be asked
_TYPING = (FORM, PROMPT, DOING)
_LINES = (FORM, DOING)  # views of lines in which one types

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


@dataclass(frozen=True, slots=True)
class Action:
    """One thing the user can do.

    ``id`` is stable: settings files and tests refer to it.  ``words`` is what the key line says,
    empty for what needs no saying there; ``means`` is the sentence in the help.  ``order``
    sorts the key line, lowest first; what does not fit the width is left to the help.
    """

    id: str
    keys: tuple[str, ...]
    views: tuple[str, ...]
    means: str
    words: str = ""
    order: int = 50
    group: str = "Everywhere"


ACTIONS: tuple[Action, ...] = (
    Action("row.up", ("up",), (*_TABLES, *_LINES), "one row up (upstream in Node)", group="Moving"),
    Action(
        "row.down",
        ("down",),
        (*_TABLES, *_LINES),
        "one row down (downstream in Node)",
        group="Moving",
    ),
    Action("page.ahead", ("a", "pagedown"), _TABLES, "a page ahead", group="Moving"),
    Action("page.return", ("r", "pageup"), _TABLES, "return a page", group="Moving"),
    Action("row.first", ("t", "home"), _TABLES, "to the top row", group="Moving"),
    Action("row.last", ("e", "end"), _TABLES, "to the end row", group="Moving"),
    Action(
        "columns.left",
        ("left",),
        (STANDINGS, NODE, FORM, COLUMNS, ROLES, *_LISTS),
        "columns further left, or the choice before; moves a column that is being arranged",
        group="Moving",
    ),
    Action(
        "columns.right",
        ("right",),
        (STANDINGS, NODE, FORM, COLUMNS, ROLES, *_LISTS),
        "columns further right, or the next choice; moves a column that is being arranged",
        group="Moving",
    ),
    Action(
        "other.table",
        ("tab",),
        (NODE, WAY, MAKEUP, *ANSWERS),
        "to the other table, way or page",
        "other one",
        30,
        "Moving",
    ),
    Action("field.next", ("tab",), (FORM,), "to the next field", "next field", 30, "Moving"),
    Action(
        "node.open",
        ("enter",),
        (*_NODES, APART, WAY, PLATE, *ANSWERS),
        "open the node; in Node, make the neighbour the centre",
        "node",
        1,
        "Investigating",
    ),
    Action(
        "walk.back", ("b",), (NODE,), "walk back the way you came", "walk back", 2, "Investigating"
    ),
    Action(
        "walk.on", ("v",), (NODE,), "walk the way again, forth", "walk forth", 8, "Investigating"
    ),
    Action(
        "node.plate",
        ("d",),
        (STANDINGS, NODE, SHORTLIST, APART, WAY, *ANSWERS),
        "details: everything known of the node, its neighbourhood drawn",
        "details",
        9,
        "Investigating",
    ),
    Action(
        "way.find",
        ("u",),
        (STANDINGS, NODE, SHORTLIST),
        "shortest way from the node to another, marked or named",
        "way to",
        17,
        "Investigating",
    ),
    Action(
        "ask.anything",
        ("A",),
        _ASKED,
        "ask of the node or the graph: why, what if, how stable, how far measures agree",
        "ask",
        6,
        "Asking",
    ),
    *(
        Action(id, (), views, means, "", 70, "Asking")
        for id, views, means in (
            ("ask.why", _ASKED, "why the node scores what it scores, term by term"),
            ("ask.than", _ASKED, "why the node stands above or below another, term by term"),
            ("ask.loss", _ASKED, "what the loss of the node would do: who rises, who is cut off"),
            ("ask.along", _ASKED, "how ranks change along a setting, such as the damping"),
            ("ask.losses", _ASKED, "what the loss of each of the first nodes would do"),
            ("ask.walk", _ASKED, "where a walker from the node is after each step"),
            (
                "ask.peers",
                (STANDINGS,),
                "ranks and scores among peers, such as of one year or tier",
            ),
            ("ask.drift", _ASKED, "what has changed against another table"),
            ("ask.agreement", _ASKED, "how far the solved measures agree, and where not"),
        )
    ),
    Action(
        "pair.choose",
        ("m",),
        (AGREEMENT,),
        "choose the measures whose ranks are drawn against each other",
        "measures drawn",
        10,
        "Asking",
    ),
    Action(
        "measure.choose",
        ("m",),
        (STANDINGS, NODE, LOG),
        "choose the measure; it is solved if it has not been",
        "measure",
        10,
        "Investigating",
    ),
    Action(
        "settings.change",
        ("c",),
        (STANDINGS, NODE, LOG, CHOICE),
        "change the settings of the measure and solve again",
        "change settings",
        14,
        "Investigating",
    ),
    Action(
        "log.open",
        ("l",),
        (STANDINGS, NODE),
        "the solve log: residual, bound and proven order, sweep by sweep",
        "log",
        15,
        "Investigating",
    ),
    Action(
        "makeup.open",
        ("M",),
        (STANDINGS, NODE, LOG),
        "Makeup of the graph: shape, degrees, components, rows read, spectrum",
        "makeup",
        20,
        "Investigating",
    ),
    Action(
        "part.open",
        ("enter",),
        (MAKEUP,),
        "go into the component: rank inside it; Esc in its standings comes back",
        "go into it",
        1,
        "Investigating",
    ),
    Action(
        "solves.open",
        ("z",),
        (STANDINGS, NODE, LOG),
        "every solve of this sitting: at work, waiting, done; compare two",
        "all solves",
        19,
        "Investigating",
    ),
    Action(
        "solve.pick",
        ("enter",),
        (SOLVES,),
        "pick a solve to compare; on a second one, compare the two",
        "compare",
        1,
        "Investigating",
    ),
    Action(
        "log.keep",
        ("w",),
        (LOG,),
        "write the log out to a new file, CSV, JSON or Parquet",
        "write out",
        12,
        "Investigating",
    ),
    Action(
        "solve.halt",
        ("h",),
        (STANDINGS, NODE, LOG, SOLVES, LOADING),
        "halt the solve or loading; a solve keeps its best iterate, a waiting one is taken out",
        "halt",
        3,
        "Investigating",
    ),
    Action(
        "rows.sort",
        ("s",),
        (STANDINGS,),
        "sort by a column; the same column again turns the order round",
        "sort",
        11,
        "Looking",
    ),
    Action(
        "rows.filter",
        ("f",),
        (STANDINGS,),
        "keep only the rows that fulfil an SQL condition; empty for all",
        "filter",
        12,
        "Looking",
    ),
    Action(
        "find.ask",
        ("slash",),
        (STANDINGS, START),
        "find a name that contains a text; in Start, or write a path",
        "find",
        13,
        "Looking",
    ),
    Action(
        "mark.toggle",
        ("x",),
        (*_NODES, *ANSWERS),
        "mark the row's node (in Node, the centre) for the shortlist, or take the mark off",
        "mark",
        14,
        "Keeping",
    ),
    Action(
        "note.write",
        ("i",),
        (*_NODES, *ANSWERS),
        "write a note on the node, which marks it",
        "note",
        22,
        "Keeping",
    ),
    Action(
        "shortlist.open",
        ("o",),
        (STANDINGS, NODE, LOG, *ANSWERS),
        "the shortlist: the nodes marked, their notes and their ranks",
        "shortlist",
        21,
        "Keeping",
    ),
    Action(
        "shortlist.jump",
        ("j",),
        (SHORTLIST,),
        "jump to the node's row in the standings",
        "jump to it",
        2,
        "Keeping",
    ),
    Action(
        "shortlist.write",
        ("w",),
        (SHORTLIST,),
        "write the shortlist to a CSV file",
        "write CSV",
        13,
        "Keeping",
    ),
    Action(
        "text.copy",
        ("C",),
        (*_NODES, *ANSWERS),
        "copy the node's name to the terminal's clipboard; once more: the whole row",
        "copy",
        24,
        "Keeping",
    ),
    Action("find.next", ("n",), (STANDINGS,), "next row found", "next found", 16, "Looking"),
    Action("find.before", ("p",), (STANDINGS,), "row found before", "found before", 17, "Looking"),
    Action(
        "columns.choose",
        ("k",),
        (STANDINGS,),
        "columns to keep: which are shown, in which order",
        "columns",
        18,
        "Looking",
    ),
    Action(
        "column.switch",
        ("enter",),
        (COLUMNS,),
        "show or hide the highlighted column",
        "show or hide",
        1,
        "Asked something",
    ),
    Action(
        "choice.take",
        ("enter",),
        (CHOICE,),
        "take the highlighted row",
        "take",
        1,
        "Asked something",
    ),
    Action(
        "prompt.take",
        ("enter",),
        (PROMPT,),
        "go on with what is written",
        "go",
        1,
        "Asked something",
    ),
    Action(
        "form.solve",
        ("enter",),
        (FORM,),
        "solve with these settings",
        "solve",
        1,
        "Asked something",
    ),
    Action(
        "notice.close", ("enter",), (NOTICE,), "close the notice", "close", 1, "Asked something"
    ),
    Action(
        "roles.take",
        ("enter",),
        (ROLES,),
        "read the table with these columns",
        "read it",
        1,
        "Asked something",
    ),
    Action(
        "role.change",
        ("tab",),
        (ROLES,),
        "make the column source, target, weight or none of them (so do left and right)",
        "change role",
        2,
        "Asked something",
    ),
    Action(
        "table.open",
        ("enter",),
        (START,),
        "open the table, or go into the folder",
        "open",
        1,
        "Opening",
    ),
    Action(
        "table.columns",
        ("c",),
        (START,),
        "choose which column is what before the table is read",
        "choose columns",
        14,
        "Opening",
    ),
    Action("folder.up", ("left",), (START,), "to the folder above", "folder above", 15, "Opening"),
    Action(
        "start.open",
        ("S",),
        _ROOMS,
        "to Start, to open another table; this sitting is kept",
        "another table",
        60,
        "Opening",
    ),
    Action(
        "sitting.resume",
        ("enter",),
        (LOADING,),
        "take up the sitting that was kept: view, order, filter, settings",
        "take it up",
        1,
        "Asked something",
    ),
    Action(
        "sitting.fresh",
        ("F",),
        (LOADING,),
        "begin afresh: a new sitting (marks and notes stay)",
        "begin afresh",
        2,
        "Asked something",
    ),
    Action(
        "step.back",
        ("escape",),
        (*_ROOMS, *_TYPING, CHOICE, NOTICE, COLUMNS, START, ROLES, LOADING),
        "one step back; nothing is lost",
        "back",
        4,
    ),
    Action(
        "deed.take",
        ("enter",),
        (DOING,),
        "do the highlighted action",
        "do it",
        1,
        "Asked something",
    ),
    Action(
        "do.anything",
        ("g",),
        (*_ROOMS, LOADING, START, ROLES),
        "go to any action: all of them by name, found by a few letters",
        "go to any action",
        89,
    ),
    Action(
        "help.open",
        ("question_mark",),
        (STANDINGS, NODE, LOG, START, ROLES, *_LISTS),
        "every key, in words",
        "all keys",
        90,
    ),
    Action("quit", ("q",), (*_ROOMS, LOADING, START, ROLES), "quit", "quit", 91),
    Action(
        "quit.now",
        ("ctrl+c",),
        (*_ROOMS, *_TYPING, CHOICE, NOTICE, LOADING, START, ROLES, COLUMNS),
        "quit at once, from anywhere",
    ),
)

BY_ID: dict[str, Action] = {action.id: action for action in ACTIONS}

_KEY_WORDS = {
    "slash": "/",
    "question_mark": "?",
    "enter": "Enter",
    "escape": "Esc",
    "tab": "Tab",
    "up": "Up",
    "down": "Down",
    "left": "Left",
    "right": "Right",
    "pagedown": "PageDown",
    "pageup": "PageUp",
    "home": "Home",
    "end": "End",
    "ctrl+c": "Ctrl-C",
}


def key_words(key: str) -> str:
    """A key as it is written on the screen."""
    return _KEY_WORDS.get(key, key)


Bound = Mapping[str, tuple[str, ...]]  # action id -> keys given by the user


def keys_in(view: str, action: Action, bound: Bound | None = None) -> tuple[str, ...]:
    """The keys of an action in a view: letters are no keys where text is typed."""
    bound = bound or {}
    keys = bound.get(action.id, action.keys)
    if action.id not in bound:
        # A key that was given to something else is no longer its former owner's.
        taken = {key for one, given in bound.items() if view in BY_ID[one].views for key in given}
        keys = tuple(key for key in keys if key not in taken)
    if view in _TYPING:
        return tuple(key for key in keys if len(key) > 1 and key not in ("slash", "question_mark"))
    return keys


def keymap(view: str, bound: Bound | None = None) -> dict[str, str]:
    """Key -> action id for one view; ``bound`` gives other keys to some action ids."""
    found: dict[str, str] = {}
    for action in ACTIONS:
        if view in action.views:
            for key in keys_in(view, action, bound):
                found.setdefault(key, action.id)
    return found


def key_line(
    view: str, possible: Iterable[str], bound: Bound | None = None
) -> list[tuple[str, str]]:
    """(key, words) for the foot of a view, most useful first, of the actions possible now."""
    now = set(possible)
    chosen = [a for a in ACTIONS if view in a.views and a.words and a.id in now]
    return [
        (key_words(keys[0]), action.words)
        for action in sorted(chosen, key=lambda a: a.order)
        if (keys := keys_in(view, action, bound))
    ]


def help_rows(bound: Bound | None = None) -> list[tuple[str, str, str]]:
    """(group, keys, meaning) of every action, grouped, in the order of the registry."""
    groups: dict[str, list[Action]] = {}
    for action in ACTIONS:
        groups.setdefault(action.group, []).append(action)
    return [
        (
            group,
            " ".join(key_words(key) for key in (bound or {}).get(action.id, action.keys)),
            action.means,
        )
        for group, actions in groups.items()
        for action in actions
    ]
