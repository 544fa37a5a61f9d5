"""What can be asked of the node at hand and of the graph: one sheet of questions, each an action.

A helper of the application (see ``View.possible``): its ``do_`` methods carry out actions.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from kingpost.tui import actions

if TYPE_CHECKING:
    from kingpost.core.measures.base import Settings
    from kingpost.tui.app import KingpostApp

_NAMES = {
    "ask.why": "why",
    "ask.than": "against another",
    "ask.loss": "what if it were lost",
    "ask.walk": "walk from it",
    "ask.agreement": "agreement",
    "ask.along": "along a setting",
    "ask.losses": "losses one by one",
    "ask.peers": "among peers",
    "ask.drift": "drift",
}
_WRITTEN = "written"
_DAMPING = 0.85  # where the surfer has not been asked for yet


class Asking:
    """Questions: opens the view that answers each."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app

    def _node(self) -> int | None:
        view = self._app.view
        return None if view is None else view.node_at_hand()

    def _possible(self, id: str) -> bool:
        view = self._app.view
        if view is None or view.view not in actions.BY_ID[id].views:
            return False
        name = id.replace(".", "_")
        can = getattr(self, f"can_{name}", None)
        return can is None or bool(can())

    def can_ask_anything(self) -> bool:
        """Whether there is a graph with standings to ask about."""
        return self._app.can_start_open()

    def do_ask_anything(self) -> None:
        """List the questions that can be asked here."""
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        choices = [
            Choice(id, name, actions.BY_ID[id].means)
            for id, name in _NAMES.items()
            if self._possible(id)
        ]
        node = self._node()
        about = "" if node is None else f" of {self._app.sitting.graph.name(node, 40)} or the graph"

        def chosen(key: str | None) -> None:
            if key is not None:
                getattr(self, f"do_{key.replace('.', '_')}")()

        self._app.push_screen(ChoiceSheet(f"ask{about}", choices), chosen)

    # ---- of the node at hand -----------------------------------------------------------------

    def can_ask_why(self) -> bool:
        """Whether there is a node to ask about."""
        return self.can_ask_anything() and self._node() is not None

    def do_ask_why(self) -> None:
        """Take the score of the node apart."""
        from kingpost.tui.views.why import WhyView

        node = self._node()
        if node is not None:
            self._app.push_screen(WhyView(node))

    can_ask_than = can_ask_why

    def do_ask_than(self) -> None:
        """Compare the node with another, marked or named."""
        from kingpost.tui.views.why import ThanView

        node = self._node()
        if node is None:
            return

        def against(other: int) -> None:
            self._app.push_screen(ThanView(node, other))

        name = self._app.sitting.graph.name(node, 30)
        self._app.routes.choose(node, f"{name} against", against)

    can_ask_loss = can_ask_why

    def do_ask_loss(self) -> None:
        """Try the standings without the node."""
        from kingpost.tui.views.losses import LossView

        node = self._node()
        if node is not None:
            self._app.push_screen(LossView(node))

    can_ask_walk = can_ask_why

    def do_ask_walk(self) -> None:
        """Let a walker loose at the node, once it is said whether it jumps."""
        from kingpost.tui.views.sheets import Choice, ChoiceSheet
        from kingpost.tui.views.walk import WalkView

        node = self._node()
        if node is None:
            return
        surfer = self._app.sitting.settings.get("surfer")
        damping = float(getattr(surfer, "damping", _DAMPING))
        choices = [Choice("1", "follows edges", "and never jumps of itself: damping 1")]
        if damping < 1.0:
            words = f"as the surfer does: damping {damping:g}"
            choices.append(Choice(str(damping), "and jumps", words))

        def chosen(key: str | None) -> None:
            if key is not None:
                self._app.push_screen(WalkView(node, float(key)))

        name = self._app.sitting.graph.name(node, 40)
        self._app.push_screen(ChoiceSheet(f"a walker from {name}", choices), chosen)

    # ---- of the graph ------------------------------------------------------------------------

    can_ask_agreement = can_ask_anything

    def do_ask_agreement(self) -> None:
        """How far the solved measures agree."""
        from kingpost.tui.views.agreement import AgreementView

        self._app.push_screen(AgreementView())

    can_ask_losses = can_ask_anything

    def do_ask_losses(self) -> None:
        """Try the loss of each of the first nodes."""
        from kingpost.tui.views.losses import LossesView

        self._app.push_screen(LossesView())

    can_ask_along = can_ask_anything

    def do_ask_along(self) -> None:
        """Ask which setting of the measure shown to sweep."""
        from kingpost.tui.models.along import offered
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        sitting = self._app.sitting
        measure, settings = sitting.current, sitting.settings_of(sitting.current)
        choices = [Choice(text, words) for text, words in offered(settings)]
        if not choices:
            self._write_along(measure, settings, "", "")
            return
        choices.append(Choice(_WRITTEN, "another setting, or other values, written"))

        def chosen(key: str | None) -> None:
            if key == _WRITTEN:
                self._write_along(measure, settings, "", "")
            elif key is not None:
                self._along(measure, settings, key)

        self._app.push_screen(ChoiceSheet(f"along which setting of {measure}", choices), chosen)

    def _write_along(self, measure: str, settings: Settings, text: str, wrong: str) -> None:
        from kingpost.tui.models.along import FORMS
        from kingpost.tui.views.sheets import PromptSheet

        def written(answer: str | None) -> None:
            if answer:
                self._along(measure, settings, answer)

        hint = "" if wrong else f"such as {FORMS}"
        self._app.push_screen(
            PromptSheet(f"{measure} along", text, hint=hint, wrong=wrong), written
        )

    def _along(self, measure: str, settings: Settings, text: str) -> None:
        from kingpost.core.errors import KingpostError
        from kingpost.tui.models.along import checked
        from kingpost.tui.views.along import AlongView

        try:
            over = checked(text, settings)
        except KingpostError as error:
            self._write_along(measure, settings, text, error.sentence)
            return
        self._app.push_screen(AlongView(measure, settings, over))

    def can_ask_peers(self) -> bool:
        """Whether nodes have an attribute to be grouped by."""
        return self.can_ask_anything() and self._app.sitting.graph.attributes is not None

    def do_ask_peers(self) -> None:
        """Ask by which attribute scores are rescaled; shown as columns of the standings."""
        from kingpost.core.text import visible
        from kingpost.tui.models.peers import attributes_of
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        app = self._app
        desk, now = app.desk, app.sitting.peers
        choices = [
            Choice(f"={name}", visible(name, 40), words)
            for name, words in attributes_of(app.sitting.graph)
        ]
        if now:
            choices.append(Choice("", "none", "take the columns away"))

        def chosen(key: str | None) -> None:
            if key is not None and app.desk is desk:
                app.news("")
                desk.among_peers(key[1:])

        app.push_screen(ChoiceSheet("scores rescaled among peers by", choices, f"={now}"), chosen)

    def can_ask_drift(self) -> bool:
        """Whether this is a whole table, which another can be compared with."""
        return self.can_ask_anything() and not self._app.within.depth

    def do_ask_drift(self) -> None:
        """Ask for the other table, first among those in the same folder."""
        from kingpost.tui.models.drifts import beside

        app, paths = self._app, list(self._app.opener.paths)
        view = app.view

        def found(tables: list[str]) -> None:
            if app.view is view:  # whoever has gone elsewhere no longer asks
                self._choose_other(tables)

        app.background("drift", lambda job: beside(paths, job.watch), found, words="listing tables")

    def _choose_other(self, tables: list[str]) -> None:
        import os

        from kingpost.tui.models.folders import safe
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        if not tables:
            self._write_other("", "")
            return
        choices = [Choice(path, safe(os.path.basename(path)), "in the same folder")
                   for path in tables]  # fmt: skip
        choices.append(Choice(_WRITTEN, "another table", "by its path"))

        def chosen(key: str | None) -> None:
            if key == _WRITTEN:
                self._write_other("", "")
            elif key is not None:
                self._choose_order(key)

        self._app.push_screen(ChoiceSheet("drift against", choices), chosen)

    def _write_other(self, text: str, wrong: str) -> None:
        import os

        from kingpost.tui.views.sheets import PromptSheet

        def written(answer: str | None) -> None:
            if not answer:
                return
            path = os.path.abspath(os.path.expanduser(answer.strip()))
            if os.path.exists(path):
                self._choose_order(path)
            else:
                self._write_other(answer, f"there is no table at {path}; write another path")

        hint = "" if wrong else "the path of a table of edges, read by the same rules as this one"
        self._app.push_screen(PromptSheet("drift against", text, hint=hint, wrong=wrong), written)

    def _choose_order(self, path: str) -> None:
        import os

        from kingpost.tui.models.drifts import Other
        from kingpost.tui.models.folders import safe
        from kingpost.tui.views.drift import DriftView
        from kingpost.tui.views.sheets import Choice, ChoiceSheet

        name = safe(os.path.basename(path))
        choices = [
            Choice("later", "this one is before", f"{name} is after"),
            Choice("earlier", "this one is after", f"{name} is before"),
        ]

        def chosen(key: str | None) -> None:
            if key is not None:
                options = dict(self._app.resumer.options)
                self._app.push_screen(DriftView(Other(path, options, key == "later")))

        self._app.push_screen(ChoiceSheet("which of the two is earlier", choices), chosen)
