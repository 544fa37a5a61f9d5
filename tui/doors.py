"""Doors to the views and sheets that are opened from anywhere.

A helper of the application (see ``View.possible``): its ``do_`` methods carry out actions.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from kingpost.tui.app import KingpostApp


class Doors:
    """Measures, settings, the log, the makeup, the solves, any action, the help."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app

    def do_measure_choose(self) -> None:
        """Ask for the measure."""
        from kingpost.tui.views.sheets import Choice, MeasureSheet

        choices = [Choice(*row) for row in self._app.desk.measures()]
        self._app.push_screen(
            MeasureSheet("measure", choices, self._app.sitting.current), self._chosen
        )

    def _chosen(self, measure: str | None) -> None:
        if measure is not None:
            self._app.desk.choose(measure)

    def do_settings_change(self) -> None:
        """Ask for the settings of the measure shown."""
        self._app.open_settings(self._app.sitting.current)

    def do_log_open(self) -> None:
        """Open the solve log."""
        from kingpost.tui.views.solvelog import SolveLogView

        self._app.push_screen(SolveLogView())

    def do_makeup_open(self) -> None:
        """Open what the graph is made of."""
        from kingpost.tui.views.makeup import MakeupView

        self._app.push_screen(MakeupView())

    def do_solves_open(self) -> None:
        """Open the list of all solves."""
        from kingpost.tui.views.solves import SolvesView

        self._app.push_screen(SolvesView())

    def do_do_anything(self) -> None:
        """List every action, to be found by name."""
        from kingpost.tui.views.doing import DoingSheet

        view = self._app.view
        if view is not None:
            self._app.push_screen(DoingSheet(view), lambda deed: view.do(deed) if deed else None)

    def do_help_open(self) -> None:
        """Open the help."""
        from kingpost.tui.views.help import HelpView

        self._app.push_screen(HelpView())
