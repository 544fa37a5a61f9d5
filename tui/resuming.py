"""Keeping the sitting when it ends, however it ends, and going on from there the next time.

A helper of the application; the offer itself stands on the loading view.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from kingpost.core.errors import KingpostError
from kingpost.core.text import id_text, visible
from kingpost.tui import actions, places, rooms
from kingpost.tui.models import resumption
from kingpost.tui.models.resumption import Kept

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.tui.app import KingpostApp

# Views that are opened again, and the action that opens each.
_OPENERS = {
    rooms.LOG: "log.open",
    rooms.SHORTLIST: "shortlist.open",
    "solves": "solves.open",
    "makeup": "makeup.open",
}


class Resumer:
    """One sitting's way into its file and out of it."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app
        self._paths: list[str] = []
        self._options: Mapping[str, Any] = {}
        self._began = False
        self._kept: Kept | None = None  # the sitting to be taken up
        self._nodes: dict[str, int] = {}
        self._filter = ""  # waits for the measures that it may ask about
        self._left_out: list[str] = []

    @property
    def options(self) -> Mapping[str, Any]:
        """How the tables were read, as far as it is not the default."""
        return self._options

    # ---- taking up -----------------------------------------------------------------------------

    @staticmethod
    def locate(graph: Graph, kept: Kept | None) -> dict[str, int]:
        """Numbers of the nodes that a kept sitting names; for the loading job."""
        from kingpost.core.labels import locate

        names = [] if kept is None else list(dict.fromkeys([kept.cursor, *kept.trail[-50:]]))
        found = {name: locate(graph.labels, name) for name in names if name}
        return {name: node for name, node in found.items() if node is not None}

    def begin(
        self,
        paths: list[str],
        options: Mapping[str, Any],
        kept: Kept | None,
        nodes: dict[str, int],
    ) -> None:
        """A sitting begins, taking up ``kept`` if there is one: settings and arrangement at once,
        cursor and view with the first table, the filter when its measures are solved.
        """
        self._paths, self._options, self._began = list(paths), dict(options), True
        self._kept, self._nodes, self._filter, self._left_out = kept, nodes, "", []
        if kept is None:
            return
        sitting = self._app.sitting
        for name, given in kept.settings.items():
            if name not in sitting.names:
                self._left_out.append(f"the measure {visible(name, 24)}")
                continue
            settings = resumption.settings_of(sitting.measure(name).settings, given)
            if settings is None:
                self._left_out.append(f"settings of {name}")
            else:
                sitting.settings[name] = settings
        for name, fields in kept.left_out.items():
            self._left_out.append(f"{visible(', '.join(map(str, fields)), 40)} of {name}")
        if kept.measure in sitting.names:
            sitting.current = kept.measure
        self._filter = str(kept.wanted.get("where", ""))
        wanted = {key: kept.wanted.get(key) for key in ("sort", "turned")}
        if isinstance(wanted["sort"], str) and isinstance(wanted["turned"], bool):
            self._app.desk.restore(wanted, list(kept.order), list(kept.hidden))

    def opened(self) -> None:
        """The first table is shown: put the cursor where it was, solve what was solved, open the
        view that was open.
        """
        kept, app = self._kept, self._app
        if kept is None:
            return
        node = self._nodes.get(kept.cursor)
        if node is not None:
            app.jump_to(node)
        elif kept.cursor:
            self._left_out.append(f"the node {visible(kept.cursor, 24)}")
        for name in kept.settings:
            if name in app.sitting.names and name not in app.sitting.results:
                app.desk.solve(name, None, company=True)
        told = f"took up the sitting of {resumption.clock(kept.when)}"
        if self._left_out:
            app.news(f"{told}, without {', '.join(self._left_out)}", "bad")
        elif not app.latest_news[0]:
            app.news(told)
        if kept.find:
            app.standings.find(kept.find)
        trail = [self._nodes[name] for name in kept.trail if name in self._nodes]
        if kept.view == rooms.NODE and trail:
            app.open_node(trail[-1], trail, kept.trail_at)
        elif kept.view in _OPENERS and _OPENERS[kept.view] in actions.BY_ID:
            app.standings.do(_OPENERS[kept.view])
        self.filtered()

    def filtered(self) -> None:
        """Called with every new table: filter as before, as soon as there are the results to."""
        if not self._filter:
            return
        wanted, last = self._filter, not self._app.runner.jobs("solve")

        def wrong(sentence: str) -> None:
            if last:
                self._filter = ""
                self._app.news(f"the filter is left out: {sentence}", "bad")

        arrangement = self._app.standings.model.arrangement
        if arrangement.where == wanted or last:
            self._filter = ""
        if arrangement.where != wanted:
            self._app.desk.arrange(wrong, where=wanted)

    # ---- keeping -------------------------------------------------------------------------------

    def close(self) -> str:
        """Keep the sitting; the sentence if that fails."""
        if not self._began or self._app.standings_shown is None or "-" in self._paths:
            return ""
        self._began = False
        try:
            kept = self.kept()
            if kept is None:
                resumption.forget(self._paths)
            else:
                resumption.write(self._paths, kept)
        except KingpostError as error:
            return f"the sitting is not kept: {error.sentence}"
        except Exception as error:
            # On the way out nothing may stand in the way.
            return visible(f"the sitting is not kept ({type(error).__name__}: {error})", 300)
        return ""

    def kept(self) -> Kept | None:
        """What is worth keeping of the sitting, None if it is as at the beginning."""
        app = self._app
        # Of one who left inside a part the sitting over the whole is kept.
        desk = app.within.home
        sitting, table = desk.sitting, desk.table
        assert table is not None
        view, trail, at = (rooms.STANDINGS, [], 0) if app.within.depth else self._place()
        settings: dict[str, dict[str, Any]] = {}
        left_out: dict[str, list[str]] = {}
        for name, result in sitting.results.items():
            if result.refusal is None:
                settings[name], lost = resumption.plain_settings(result.settings)
                if lost:
                    left_out[name] = lost
        wanted = desk.wanted
        if self._filter:  # taken up from the sitting before, but not applied yet
            wanted["where"] = self._filter
        node = table.node
        found = table.found
        begun = app.opener.first_measure
        unchanged = (
            view == rooms.STANDINGS
            and table.cursor == 0
            and sitting.current == begun
            and wanted == {"sort": "rank", "turned": False, "where": ""}
            and len(app.keeper.marks) == 0
            and not any(settings.values())
            and not sitting.columns.order
            and set(settings) <= {begun, *desk.company}
        )
        if unchanged:
            return None
        return Kept(
            when=places.now(),
            measure=sitting.current,
            settings=settings,
            left_out=left_out,
            wanted=wanted,
            order=sitting.columns.order,
            hidden=sorted(sitting.columns.hidden),
            cursor="" if node is None else self._name(node),
            view=view,
            trail=[self._name(one) for one in trail],
            trail_at=at,
            find=found.text if found is not None else "",
            marks=len(app.keeper.marks),
            tables=resumption.stamps(self._paths),
            options=self._options,
        )

    def _name(self, node: int) -> str:
        return id_text(self._app.within.home.sitting.graph.label(node))

    def _place(self) -> tuple[str, list[int], int]:
        """The highest view that is opened again, with the way walked if it is Node."""
        from kingpost.tui.views.node import NodeView

        for screen in reversed(self._app.screen_stack):
            if isinstance(screen, NodeView):
                first = max(screen.trail.at - 40, 0)
                return rooms.NODE, screen.trail.nodes[first : first + 50], screen.trail.at - first
            view = getattr(screen, "view", "")
            if view == rooms.STANDINGS or view in _OPENERS:
                return view, [], 0
        return rooms.STANDINGS, [], 0
