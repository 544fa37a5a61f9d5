"""Journeys through the whole application over measures made for these tests, without a terminal.

Nothing waits for time: :func:`until` gives the application turns until a condition holds.
"""

from __future__ import annotations

import asyncio
import threading

import pytest

from kingpost.core.errors import InputError
from kingpost.tui import terminal
from kingpost.tui.app import KingpostApp
from kingpost.tui.models.sitting import Sitting
from kingpost.tui.views import standings
from kingpost.tui.views.loading import LoadingView
from kingpost.tui.views.standings import StandingsView
from kingpost.tui.widgets.lines import Line, Rule


class Kingpost(KingpostApp):
    """The application over a graph and measures at hand."""

    def __init__(self, graph, bench, measure="plain", load=None):
        looks = terminal.decide({"LANG": "C.UTF-8"})
        super().__init__(["ferry.parquet"], load or (lambda job: graph), measure, None, looks=looks)
        self.bench = bench

    def make_sitting(self, graph, measure):
        # Those that hold on or break are solved only when asked for.
        return Sitting(graph, measure, names=self.bench.names[:3], find=self.bench.find)

    def shown(self):
        return "\n".join(
            "".join(segment.text for segment in strip).rstrip()
            for strip in self.screen._compositor.render_strips()
        )


async def until(pilot, condition):
    async with asyncio.timeout(30):
        while not condition():
            await pilot.pause()


@pytest.fixture
def app(graph, bench):
    return Kingpost(graph, bench)


async def opened(pilot):
    app = pilot.app
    await until(pilot, lambda: app.screen.view == "standings" and not app.runner.jobs("solve"))
    await until(pilot, lambda: not app.runner.jobs("table"))
    await pilot.pause()


async def test_standings_name_what_they_show(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        lines = app.shown().splitlines()
        assert (
            "hand_made.parquet   6 nodes  8 edges   score flows along caller -> callee" in lines[0]
        )
        assert "plain pull 0.5" in lines[1]
        assert "order proven to 6 of 6" in lines[1]
        assert lines[3].split() == ["rank▴", "node", "plain", "mirror", "in", "out", "team", "tier"]
        assert lines[4].split() == ["┃▸", "1", "gate", "6.00", "6", "4", "1", "blue", "2"]
        assert "weight from  kiosk 50%" in app.screen.query_one("#supports", Line).plain


async def test_what_is_looked_for_while_another_table_comes_is_found_in_that(app, monkeypatch):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        replaced = threading.Event()
        asked = []  # arrangements that were searched

        def show(self, table, before=StandingsView.show):
            before(self, table)
            replaced.set()

        def look(model, arranged, text, before=standings.search):
            asked.append(arranged)
            if len(asked) == 1:
                app.call_from_thread(app.desk.arrange, sort="in")
                assert replaced.wait(30)
            return before(model, arranged, text)

        monkeypatch.setattr(StandingsView, "show", show)
        monkeypatch.setattr(standings, "search", look)
        await pilot.press("slash", *"QU", "enter")
        await until(pilot, lambda: "1 of 1 names with 'QU'" in app.shown())
        assert len(asked) == 2
        assert asked[1] is app.screen.model.arrangement is not asked[0]
        assert app.screen.model.graph.label(app.screen.model.node) == "quay"


async def test_sort_find_and_filter(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("s", "down", "down", "down", "down", "enter")
        await until(pilot, lambda: app.screen.view == "standings" and "in▾" in app.shown())
        await pilot.press("slash", *"QU", "enter")
        await until(pilot, lambda: "1 of 1 names with 'QU'" in app.shown())
        assert app.screen.model.graph.label(app.screen.model.node) == "quay"
        await pilot.press("f", *"tiers > 1", "enter")
        await until(pilot, lambda: "names column 'tiers', which this table lacks" in app.shown())
        assert "   6 nodes" in app.shown()  # the rows stay as they were
        await pilot.press(*["backspace"] * 5, *" > 1", "enter")
        await until(pilot, lambda: "3 of 6 nodes" in app.shown())
        assert "where tier > 1" in app.shown()
        await pilot.press("f", *" and false", "enter")
        await until(pilot, lambda: "no row fulfils the condition; f changes it" in app.shown())
        await pilot.press("escape", "escape")
        await until(pilot, lambda: "   6 nodes" in app.shown())
        assert "where" not in app.shown()


async def test_columns_are_shown_hidden_and_moved(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("k")
        await until(pilot, lambda: "columns in their order" in app.shown())
        await pilot.press("down", "enter", "e", "enter", *["left"] * 9)
        await until(pilot, lambda: "mirror score " in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        heads = app.shown().splitlines()[3].split()
        assert heads == ["rank▴", "node", "mirror", "score", "plain", "in", "out", "team", "tier"]
        # Another measure keeps the choice.
        await pilot.press("m", "down", "enter")
        await until(pilot, lambda: app.screen.model.result.measure == "mirror")
        heads = app.shown().splitlines()[3].split()
        assert heads == ["rank▴", "node", "mirror", "in", "out", "team", "tier", "plain"]


async def test_a_filter_that_new_results_cannot_answer_is_taken_off(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("f", *"plain_rank < 3", "enter")
        await until(pilot, lambda: "2 of 6 nodes" in app.shown())
        app.desk.sitting.results.pop("plain")
        app.desk.choose("mirror")
        await until(pilot, lambda: "the filter is taken off: the condition" in app.shown())
        assert "   6 nodes" in app.shown()


async def test_walking_the_load_path_and_back(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("enter")
        await until(pilot, lambda: "▼ gate" in app.shown())
        assert "▸kiosk" in app.shown()
        await pilot.press("down", "enter")
        await until(pilot, lambda: "▼ fare" in app.shown())
        assert "came by: gate" in app.shown()
        await pilot.press("b")
        await until(pilot, lambda: "▼ gate" in app.shown())
        await pilot.press("v")
        await until(pilot, lambda: "▼ fare" in app.shown())
        await pilot.press("tab", "enter")
        await until(pilot, lambda: "▼ gate" in app.shown())
        await pilot.press("b", "escape")
        await until(pilot, lambda: app.screen.view == "standings")
        # The cursor stands on the node where the walk ended.
        assert app.screen.model.graph.label(app.screen.model.node) == "fare"


async def test_downstream_of_the_last_feeder_is_the_first_receiver(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("enter", *["down"] * 4)
        await until(pilot, lambda: app.screen.view == "node")
        assert app.screen.panel.active is app.screen.panel.receivers
        await pilot.press("up")
        assert app.screen.panel.active is app.screen.panel.feeders


async def test_another_measure_keeps_the_cursor_on_its_node(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("down", "m", "down", "enter")
        await until(pilot, lambda: " mirror " in app.shown().splitlines()[1])
        await until(pilot, lambda: app.screen.model.result.measure == "mirror")
        assert app.screen.model.graph.label(app.screen.model.node) == "fare"


async def test_the_old_standings_stay_usable_while_solving_and_halting_keeps_the_best(app, bench):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        app.desk.solve("held", None)
        await until(pilot, lambda: "solving held: sweep" in app.shown())
        await pilot.press("down")
        assert app.screen.model.result.measure == "plain"
        assert "h halt" in app.shown()
        await pilot.press("l")
        await until(pilot, lambda: "solve log of held" in app.shown())
        await pilot.press("h")
        await until(pilot, lambda: not app.runner.jobs("solve"))
        await pilot.press("escape")
        await until(pilot, lambda: "cancelled" in app.shown().splitlines()[1])
        assert "held" in app.shown().splitlines()[1]


async def test_what_comes_in_the_background_leaves_the_walk_alone(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("enter", "down", "down")
        await until(pilot, lambda: "▸berth" in app.shown())
        app.desk.solve("mirror", None, company=True)
        await until(pilot, lambda: not app.runner.jobs("solve") and not app.runner.jobs("table"))
        await pilot.pause()
        assert "▸berth" in app.shown()


async def test_another_flow_is_another_flow_for_every_measure(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        assert "mirror" in app.shown()
        await pilot.press("c", "right", "enter")  # the flow is the first field
        await until(pilot, lambda: "against caller -> callee" in app.shown())
        await until(pilot, lambda: "mirror" in app.shown() and not app.runner.jobs("solve"))
        flows = {result.settings.flow for result in app.sitting.results.values()}
        assert flows == {"against"}


async def test_a_refusal_is_said_in_words_and_the_old_standings_stay(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("m", "down", "down", "enter")
        await until(pilot, lambda: "the graph has no such eigenvector; use plain" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        assert app.screen.model.result.measure == "plain"


async def test_a_refusal_at_the_start_still_opens_the_standings(graph, bench):
    app = Kingpost(graph, bench, "barren")
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        assert "no answer here" in app.shown()
        assert "use plain, which always answers" in app.shown()
        await pilot.press("enter")
        assert app.screen.view == "standings"


async def test_a_broken_solver_is_a_sentence(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        app.desk.solve("broken", None)
        await until(pilot, lambda: "RuntimeError: a \\e[31mbroken" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_settings_are_checked_while_typed_and_solved_in_the_background(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("c", "backspace", "backspace", "backspace", *"1.5")
        await until(pilot, lambda: app.screen.view == "form")
        # The flow is the first field and has choices; typing there changes nothing.
        assert "it takes" not in app.shown()
        await pilot.press("down", "backspace", "backspace", "backspace", *"7")
        await until(pilot, lambda: "pull is 7; it takes a number" in app.shown())
        await pilot.press("enter")
        assert app.screen.view == "form"
        await pilot.press("backspace", *"0.25", "tab", "right", "enter")
        await until(pilot, lambda: "pull 0.25, side far" in app.shown())


async def test_leaving_the_form_changes_nothing(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("c", "down", "backspace", "escape")
        await until(pilot, lambda: app.screen.view == "standings")
        assert app.sitting.settings_of("plain").pull == 0.5
        assert len(app.sitting.solves) == 3


async def test_a_megabyte_pasted_is_cut(app):
    from textual import events

    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("slash")
        app.post_message(events.Paste("\x1b[31m" + "x" * 1_000_000))
        await until(
            pilot, lambda: app.screen.view == "prompt" and len(app.screen.entry.writing.text) > 900
        )
        assert len(app.screen.entry.writing.text) <= 1_000
        assert "\x1b" not in app.screen.entry.writing.text
        await pilot.press("escape")


async def test_help_names_every_key(app):
    from kingpost.tui.keymaps import help_rows

    async with app.run_test(size=(100, len(help_rows()) + 20)) as pilot:
        await opened(pilot)
        await pilot.press("question_mark")
        await until(pilot, lambda: app.screen.view == "help")
        shown = app.shown()
        for _, keys, means in help_rows():
            assert all(key in shown for key in keys.split()[:1])
            assert means[:60] in shown


@pytest.mark.parametrize("size", [(40, 10), (20, 5), (80, 24), (200, 50)])
async def test_every_view_fits_any_terminal(graph, bench, size):
    app = Kingpost(graph, bench)
    async with app.run_test(size=size) as pilot:
        await opened(pilot)
        assert "gate" in app.shown()
        for keys in (("enter",), ("escape", "l"), ("escape", "c"), ("escape", "question_mark")):
            await pilot.press(*keys)
            await pilot.pause()
            assert len(app.shown().splitlines()) <= size[1]
        for width in (30, 120, 10, 80):
            await pilot.resize_terminal(width, 12)
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_the_first_frame_names_the_file_before_anything_is_loaded(graph, bench):
    app = Kingpost(graph, bench)
    app._begin = lambda: None
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.pause()
        assert isinstance(app.screen, LoadingView)
        assert "ferry.parquet" in app.shown()


async def test_what_cannot_be_loaded_ends_with_its_sentence(graph, bench):
    def load(job):
        raise InputError("ferry.parquet is no Parquet file; name one that is")

    app = Kingpost(graph, bench, load=load)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: app._exit)
    assert app.return_value == 2
    assert app.sentence == "ferry.parquet is no Parquet file; name one that is"


async def test_loading_can_be_cancelled(graph, bench):
    def load(job):
        job.watch.report("reading rows", 10, 100, "rows")
        while True:
            job.watch.check()
            bench.release.wait(0.005)

    app = Kingpost(graph, bench, load=load)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: "reading rows" in app.shown())
        assert "10 of 100 rows" in app.shown()
        await pilot.press("h")
        await until(pilot, lambda: app._exit)
    assert app.return_value == 130


async def test_hostile_names_are_inert(make_graph, bench):
    names = sorted(
        ["\x1b[31mred", "[bold]x[/bold]", "\u202egnp.exe", "n" * 5_000, "🚢", "a\nb", "日本"]
    )
    graph = make_graph(names, [(i, 0, 1.0) for i in range(len(names))])
    app = Kingpost(graph, bench)
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        shown = app.shown()
        assert "\\e[31mred" in shown
        assert "[bold]x[/bold]" in shown
        assert "\\u{202e}gnp.exe" in shown
        assert "a\\nb" in shown
        assert "nnnnnnnn…" in shown
        assert not {"\x1b", "\u202e", "\r"} & set(shown)
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "node")
        assert not {"\x1b", "\u202e"} & set(app.shown())
        assert app.screen.query_one("#news", Rule) is not None


# ---- every solve of the sitting ----------------------------------------------------------------


async def test_two_solves_are_compared(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("z")
        await until(pilot, lambda: "solves of this sitting" in app.shown())
        assert "3 done, 0 at work or waiting" in app.shown()
        assert "the graph has no such eigenvector" in app.shown()  # why the newest stopped
        await pilot.press("down", "enter", "down", "enter")
        await until(pilot, lambda: app.screen.view == "apart")
        lines = app.shown().splitlines()
        assert lines[0].split() == ["first", "mirror"]
        assert lines[1].split() == ["second", "plain"]
        assert "Kendall's tau-b" in app.shown()
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "node")
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "apart")
        await pilot.press("escape", "escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_solves_queue_and_each_can_be_taken_out(app, bench):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        plain = app.bench.find("plain").settings
        app.desk.solve("held", None)
        app.desk.solve("plain", plain(pull=0.25))
        app.desk.solve("plain", plain(pull=0.125))
        await pilot.press("z")
        await until(pilot, lambda: "3 at work or waiting" in app.shown())
        await pilot.press("down")
        await until(pilot, lambda: "waits for its turn; h takes it out" in app.shown())
        assert "pull 0.25" in app.shown()
        await pilot.press("h")
        await until(pilot, lambda: "2 at work or waiting" in app.shown())
        await pilot.press("up", "h")  # the one at work keeps its best iterate
        await until(pilot, lambda: "0 at work or waiting" in app.shown())
        assert [solve.settings.pull for solve in app.sitting.solves][-2:] == [0.5, 0.125]
        assert app.sitting.results["plain"].settings.pull == 0.125


async def test_a_stale_solve_never_overwrites_a_newer_one(app, bench):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        held = app.bench.find("held").settings
        app.desk.solve("held", held(pull=0.25))
        await until(pilot, bench.sweeping.is_set)
        app.desk.solve("held", held(pull=0.25))  # the same again: the first is no longer wanted
        app.desk.solve("plain", app.bench.find("plain").settings(pull=0.75))
        bench.release.set()
        await until(pilot, lambda: not app.runner.jobs("solve") and not app.runner.jobs("table"))
        held_ones = [solve for solve in app.sitting.solves if solve.measure == "held"]
        assert len(held_ones) == 1
        assert str(held_ones[0].stop) == "converged"
        assert app.sitting.current == "plain"


async def test_a_log_is_written_to_a_file_that_is_new(app, tmp_path):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("l", "w")
        await until(pilot, lambda: "write the log to  plain_log.csv" in app.shown())
        name = tmp_path / "sweeps.csv"
        await pilot.press(*["backspace"] * 13)
        app.screen.pasted(str(name))
        await pilot.press("enter")
        await until(pilot, lambda: "written: " in app.shown())
        assert name.read_text().count("\n") == 4
        await pilot.press("w", *["backspace"] * 13)
        app.screen.pasted(str(name))
        await pilot.press("enter")
        await until(pilot, lambda: "choose another name" in app.shown().replace("\n ", " "))


async def test_the_form_says_what_a_solve_will_cost(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("c")
        await until(pilot, lambda: "cost: " in app.shown())


# ---- ways and plates -----------------------------------------------------------------------------


async def test_the_way_to_a_named_node_is_stepped_through(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("enter")
        await until(pilot, lambda: "▼ gate" in app.shown())
        assert "ranks  P plain 1" in app.shown()
        await pilot.press("u", *"zz", "enter")
        await until(pilot, lambda: "no name contains 'zz'; try another" in app.shown())
        await pilot.press("backspace", "backspace", *"quay", "enter")
        await until(pilot, lambda: "1 step against the edges" in app.shown())
        assert "(none along them)" in app.shown()
        await pilot.press("down")
        await until(pilot, lambda: "▸   1  quay" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: "▼ quay" in app.shown())
        assert "came by: gate" in app.shown()
        await pilot.press("b")
        await until(pilot, lambda: "forth: quay" in app.shown())


async def test_marked_nodes_are_offered_as_ends_of_a_way(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("down", "down", "x", "t", "u")
        await until(pilot, lambda: "another node, by its name" in app.shown())
        name = app.sitting.graph.label(app.screen_stack[-2].model.item(2))
        assert f"▸{name}" in app.shown()
        await pilot.press("enter")
        await until(pilot, lambda: f"way from gate to {name}" in app.shown())
        await until(pilot, lambda: "steps a" in app.shown() or "step a" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_a_plate_leads_on_to_a_neighbour(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("d")
        await until(pilot, lambda: "gives into a line" in app.shown())
        assert "team" in app.shown()
        assert "▼ gate" in app.shown()
        await pilot.press("e")
        await until(pilot, lambda: "Enter node" in app.shown())
        node = app.screen.node_at_hand()
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "node")
        assert app.screen.node_at_hand() == node
        await pilot.press("escape", "escape")
        await until(pilot, lambda: app.screen.view == "standings")


# ---- the makeup, and going into a part -----------------------------------------------------------


async def turn_to(pilot, page):
    await until(pilot, lambda: pilot.app.screen.view == "makeup")
    for _ in range(6):
        if pilot.app.screen.page != page:
            await pilot.press("tab")


async def test_the_pages_of_the_makeup(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("M")
        await until(pilot, lambda: "weak components    1, 6 nodes in the largest" in app.shown())
        assert "makeup of hand_made.parquet   6 nodes  8 edges" in app.shown()
        assert "[shape]" in app.shown()
        await turn_to(pilot, "degrees")
        await until(pilot, lambda: "nodes by neighbours, so many or more" in app.shown())
        assert "the highest 4" in app.shown()
        await turn_to(pilot, "rows read")
        await until(pilot, lambda: "how they were read" in app.shown())
        await turn_to(pilot, "spectrum")
        await until(pilot, lambda: "eigenvalue 1" in app.shown())
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")


async def test_going_into_a_component_and_back(app):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        whole = app.sitting
        await pilot.press("down", "x", "t", "x")  # fare, outside, and gate, inside
        await pilot.press("M")
        await turn_to(pilot, "strong components")
        await until(pilot, lambda: "5 strong components, 4 of one node" in app.shown())
        assert "gate" in app.shown()
        await pilot.press("enter")
        await until(pilot, lambda: app.screen.view == "standings" and app.within.depth == 1)
        await until(pilot, lambda: not app.runner.jobs("solve") and not app.runner.jobs("table"))
        lines = app.shown().splitlines()
        assert lines[0].startswith(" strong component 1 of hand_made")
        assert "2 nodes" in lines[0]
        assert {app.sitting.graph.label(i) for i in range(2)} == {"gate", "kiosk"}
        assert [mark.node for mark in app.keeper.marks] == [None, 0]
        await pilot.press("down", "x", "enter")
        await until(pilot, lambda: app.screen.view == "node")
        await pilot.press("escape", "escape", "escape")
        await until(pilot, lambda: app.within.depth == 0)
        assert app.sitting is whole
        assert app.screen.view == "makeup"
        await pilot.press("escape")
        await until(pilot, lambda: app.screen.view == "standings")
        await until(pilot, lambda: "   6 nodes  8 edges" in app.shown())
        marked = {mark.name: mark.node for mark in app.keeper.marks}
        inside = app.sitting.graph.find("kiosk")
        assert marked == {"fare": 1, "gate": 2, "kiosk": inside}


async def test_what_the_whole_solves_meanwhile_is_kept_for_the_return(app, bench):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        await pilot.press("M")
        await turn_to(pilot, "strong components")
        await until(pilot, lambda: "5 strong components" in app.shown())
        app.desk.solve("held", None)
        await until(pilot, bench.sweeping.is_set)
        await pilot.press("enter")
        await until(pilot, lambda: app.within.depth == 1)
        bench.release.set()
        await until(pilot, lambda: app.screen.view == "standings")
        assert app.screen.model.graph.n == 2
        await until(pilot, lambda: not app.runner.jobs("solve") and not app.runner.jobs("table"))
        assert app.screen.model.graph.n == 2
        await pilot.press("escape", "escape")
        await until(pilot, lambda: app.within.depth == 0)
        assert "held" in app.sitting.results


async def test_going_into_a_component_is_given_up_by_escape(app, bench):
    async with app.run_test(size=(80, 24)) as pilot:
        await opened(pilot)
        bench.release.set()
        app.desk.solve("held", None)
        await until(pilot, lambda: app.sitting.current == "held" and not app.runner.jobs("table"))
        bench.release.clear()
        await pilot.press("M")
        await turn_to(pilot, "strong components")
        await until(pilot, lambda: "5 strong components" in app.shown())
        await pilot.press("enter")
        await until(pilot, lambda: app.within.depth == 1 and app.screen.view == "loading")
        assert "strong component 1 of hand_made.parquet" in app.shown()
        await pilot.press("escape")
        await until(pilot, lambda: app.within.depth == 0 and app.screen.view == "makeup")
        await until(pilot, lambda: not app.runner.jobs("solve"))
        assert app.sitting.graph.n == 6
        assert "5 strong components" in app.shown()
