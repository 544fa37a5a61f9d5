"""Marks, notes and copying: what is done with the node at hand in any view.

A helper of the application (see ``View.possible``): its ``do_`` methods carry out actions.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from typing import TYPE_CHECKING

from kingpost.core.errors import KingpostError
from kingpost.core.text import id_text, visible
from kingpost.tui import clipboard

if TYPE_CHECKING:
    from kingpost.core.graph import Graph
    from kingpost.tui.app import KingpostApp
    from kingpost.tui.jobs import Job
    from kingpost.tui.models.marks import Mark, Marks

_SHOWN = 40  # characters of a name in a sentence


class Keeper:
    """The shortlist of the sitting, and its file."""

    def __init__(self, app: KingpostApp) -> None:
        self._app = app
        self._marks: Marks | None = None
        self._paths: list[str] = []
        self._lock = threading.Lock()
        self._version = 0  # of the marks in memory
        self._written = 0  # of the marks in their file
        self._copied: tuple[int, bool] | None = None  # the node last copied; its whole row?

    # ---- the marks of a graph ------------------------------------------------------------------

    @staticmethod
    def fetch(paths: list[str], graph: Graph) -> tuple[Marks, str]:
        """The marks kept for a graph, and a sentence if there is trouble; for the loading job."""
        from kingpost.tui.models import marks as model

        trouble, kept = "", []
        try:
            # What comes through a pipe has no place of its own: it is known by what it is.
            kept = [] if "-" in paths else model.read(paths)
            kept = kept or model.read_moved(graph)
        except KingpostError as error:
            trouble = error.sentence
        return model.locate(graph, kept), trouble

    def begin(self, paths: list[str], marks: Marks) -> None:
        """A sitting over a graph begins."""
        self._paths, self._marks = list(paths), marks
        self._version = self._written = 0
        self._copied = None

    def reseat(self, marks: Marks) -> None:
        """Another graph has the screen, a part or the whole: the same marks by its numbers."""
        self._marks, self._copied = marks, None

    def end(self) -> None:
        """The sitting has ended: there are no marks to make."""
        self._marks = None

    @property
    def marks(self) -> Marks:
        """The shortlist."""
        assert self._marks is not None
        return self._marks

    @property
    def graph(self) -> Graph:
        """The graph at hand."""
        return self._app.sitting.graph

    def changed(self) -> None:
        """The marks are not what their file says: write them, away from the screen."""
        self._version += 1
        work = self._writing()
        self._app.background("marks", work, lambda _: None, words="keeping the marks")
        self._app.marks_changed()

    def _writing(self) -> Callable[[Job | None], None]:
        """What writes the marks as they are now, unless newer ones have been written by then."""
        from kingpost.tui.models import marks as model

        graph, paths = self._app.within.home.sitting.graph, self._paths
        rows, version = self.marks.as_json(), self._version

        def work(job: Job | None) -> None:
            # In a job there is time to work it out; on leaving it goes along only if known.
            fingerprint = graph.fingerprint if job is not None else vars(graph).get("fingerprint")
            with self._lock:
                if version > self._written:
                    piped = [f"-/{graph.fingerprint}"] if "-" in paths else paths
                    model.save(rows, piped, graph, fingerprint)
                    self._written = version

        return work

    def close(self) -> str:
        """Write what is not written yet; the sentence if that fails."""
        if self._marks is None or self._written >= self._version:
            return ""
        try:
            self._writing()(None)
        except KingpostError as error:
            return f"the marks are lost: {error.sentence}"
        return ""

    # ---- marks and notes -----------------------------------------------------------------------

    def _node(self) -> int | None:
        view = self._app.view
        return None if view is None or self._marks is None else view.node_at_hand()

    def name(self, node: int) -> str:
        """A node's name for a sentence."""
        return self.graph.name(node, _SHOWN)

    def can_mark_toggle(self) -> bool:
        """Whether there is a node at hand."""
        return self._node() is not None

    def do_mark_toggle(self) -> None:
        """Mark the node at hand, or take its mark off."""
        node = self._node()
        if node is None:
            return
        mark = self.marks.of(node)
        if mark is not None:
            self.take_off(mark)
            return
        try:
            self.marks.add(self.graph, node)
        except KingpostError as error:
            self._app.news(error.sentence, "bad")
            return
        self._app.news(f"marked {self.name(node)}; {self._count()}")
        self.changed()

    def take_off(self, mark: Mark) -> None:
        """Take a mark off the list, or put it back."""
        name = visible(mark.name, _SHOWN)
        if self.marks.holds(mark):
            self.marks.remove(mark)
            back = "x again puts it back" + (", note and all" if mark.note else "")
            self._app.news(f"took {name} off the shortlist; {back}")
        else:
            self.marks.put(mark)
            self._app.news(f"{name} is on the shortlist again; {self._count()}")
        self.changed()

    def _count(self) -> str:
        number = len(self.marks)
        return f"{number:,} on the shortlist"

    can_note_write = can_mark_toggle

    def do_note_write(self) -> None:
        """Write a note on the node at hand."""
        node = self._node()
        if node is not None:
            mark = self.marks.of(node)
            self.ask_note(self.name(node), mark.note if mark else "", node=node)

    def ask_note(self, name: str, text: str, *, node: int | None, mark: Mark | None = None) -> None:
        """Ask for the words of a note on a node, or on a mark that this graph does not hold."""
        from kingpost.tui.views.sheets import PromptSheet

        def noted(words: str | None) -> None:
            if words is None:
                return
            try:
                found = mark if node is None else self.marks.add(self.graph, node)
            except KingpostError as error:
                self._app.news(error.sentence, "bad")
                return
            if found is not None:
                found.note = " ".join(words.split())
                self._app.news(f"noted on {name}" if found.note else f"no note on {name}")
                self.changed()

        self._app.push_screen(PromptSheet(f"note on {visible(name, 24)}", text), noted)

    def can_shortlist_open(self) -> bool:
        """Whether a graph is open."""
        return self._marks is not None

    def do_shortlist_open(self) -> None:
        """Open the shortlist."""
        from kingpost.tui.views.shortlist import ShortlistView

        self._app.push_screen(ShortlistView())

    # ---- copying -------------------------------------------------------------------------------

    can_text_copy = can_mark_toggle

    def do_text_copy(self) -> None:
        """Copy the name of the node at hand; a second time the whole row."""
        node, view = self._node(), self._app.view
        if node is None or view is None:
            return
        cells = view.row_at_hand()
        whole = bool(cells) and self._copied == (node, False)
        text = "\t".join(cells) if whole else id_text(self.graph.label(node))
        sequence = clipboard.sequence(text)
        what = "the row of" if whole else "the name"
        if sequence is None:
            self._app.news(
                f"not copied: {what} {self.name(node)} takes more than {clipboard.LIMIT:,} bytes, "
                "which terminals cut",
                "bad",
            )
        else:
            self._app.send(sequence)
            more = "; y again: the whole row" if cells and not whole else ""
            # A terminal does not say whether it copied; many have to be told to allow it.
            self._app.news(f"{what} {self.name(node)} went to the terminal's clipboard{more}")
        self._copied = (node, whole)
