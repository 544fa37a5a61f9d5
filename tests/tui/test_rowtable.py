"""The table by row window, on a screen without a terminal."""

from __future__ import annotations

import itertools

import pytest
from rich.cells import cell_len
from textual.app import App

from kingpost.core.standing import OPEN, PROVEN
from kingpost.tui.models.columns import Column
from kingpost.tui.terminal import decide
from kingpost.tui.widgets.rowtable import RowTable


class Millions:
    """A source of any number of rows that counts how many it is asked for."""

    def __init__(self, count, columns=6):
        self.count = count
        self.asked = set()
        self.head = [
            Column("rank", "rank", 9, lambda i: f"{i + 1:,}", right=True, frozen=True),
            Column("node", "node", 10, self.name, frozen=True, stretch=24),
            *(self.more(at) for at in range(columns)),
        ]

    def name(self, item):
        self.asked.add(item)
        return ("日本の港" if item % 5 == 3 else "berth") + f" {item}"

    def more(self, at):
        return Column(f"c{at}", f"col{at}", 7, lambda i: f"{at}:{i % 1000}", right=True)

    def item(self, row):
        assert 0 <= row < self.count
        return row

    def rail(self, row):
        return PROVEN if row < 10 else OPEN

    def marked(self, row):
        return row == 4


class Bench(App):
    def __init__(self, source):
        super().__init__(ansi_color=True)
        self.looks = decide({"LANG": "C.UTF-8"})
        self.source = source

    def compose(self):
        yield RowTable(id="rows")

    def on_mount(self):
        self.query_one(RowTable).show(self.source)


@pytest.mark.parametrize("size", [(80, 24), (120, 40), (40, 10), (12, 3)])
async def test_five_million_rows_ask_only_for_what_is_seen(size):
    source = Millions(5_000_000)
    async with Bench(source).run_test(size=size) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        assert table.count == 5_000_000
        assert all(cell_len(line) <= size[0] for line in table.rows_shown)
        table.go(4_999_999)
        await pilot.pause()
        assert "5,000,000" in table.rows_shown[-1] or size[0] < 20
        assert len(source.asked) < 10 * size[1]


async def test_every_line_is_as_wide_as_the_screen_whatever_the_names():
    async with Bench(Millions(100)).run_test(size=(60, 20)) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        widths = {table.render_line(y).cell_length for y in range(20)}
        texts = {cell_len("".join(s.text for s in table.render_line(y))) for y in range(20)}
        assert widths == texts == {60}


async def test_the_window_jumps_half_a_page_at_its_edge():
    async with Bench(Millions(1_000)).run_test(size=(80, 21)) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        tops = []
        for _ in range(100):
            table.move(1)
            tops.append(table._top)
        steps = {b - a for a, b in itertools.pairwise(tops)}
        assert steps == {0, 10}
        for _ in range(100):
            table.move(-1)
        assert (table.row, table._top) == (0, 0)


async def test_columns_scroll_sideways_and_the_frozen_ones_stay():
    async with Bench(Millions(50, columns=12)).run_test(size=(60, 10)) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        first = table.rows_shown[0]
        assert "col0" in first
        assert "col11" not in first
        for _ in range(30):
            table.sideways(1)
        last = table.rows_shown[0]
        assert last.split()[:2] == ["rank", "node"]
        assert "col0 " not in last
        assert last.endswith("col11")
        for _ in range(30):
            table.sideways(-1)
        assert table.rows_shown[0] == first


async def test_the_cursor_is_a_glyph_too_and_leaves_the_old_row():
    async with Bench(Millions(50)).run_test(size=(60, 10)) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        table.move(3)
        marked = [line for line in table.rows_shown if "▸" in line]
        assert len(marked) == 1
        assert " 4  " in marked[0]
        table.activate(False)
        assert not [line for line in table.rows_shown if "▸" in line]


async def test_no_rows_say_so():
    async with Bench(Millions(0)).run_test(size=(60, 10)) as pilot:
        table = pilot.app.query_one(RowTable)
        table.show(Millions(0), empty="nothing here; f asks again")
        await pilot.pause()
        assert "nothing here" in table.rows_shown[1]
        assert not table.move(1)
        assert table.item() is None


async def test_a_line_is_drawn_under_the_last_settled_row():
    source = Millions(30)
    source.settled = 3
    async with Bench(source).run_test(size=(60, 12)) as pilot:
        await pilot.pause()
        table = pilot.app.query_one(RowTable)
        underlined = [
            y
            for y in range(table.size.height)
            if all(s.style is not None and s.style.underline for s in table.render_line(y))
        ]
        assert underlined == [4]  # below the headings
