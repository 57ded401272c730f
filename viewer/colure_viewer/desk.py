"""What the window's parts share: the session with its history, the selection, the theme, and their signals."""

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, Signal

from colure.errors import ColureError
from colure.session import Session
from colure_viewer.history import History
from colure_viewer.themes import THEMES, Theme

if TYPE_CHECKING:
    from colure.pointing import Pointed


class Desk(QObject):
    """The one place through which sessions change; widgets read `session` and hear `changed`.

    `changed` carries whether the session is a transient one. `faulted` carries one line for the user, `stopped` says
    that running time must stop.
    """

    changed = Signal(bool)
    selected = Signal()
    themed = Signal()
    stopped = Signal()
    filed = Signal()
    faulted = Signal(str)
    noted = Signal(str)

    def __init__(self, session: Session, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._history = History(session)
        self._saved = session
        self._selection: Pointed | None = None
        self._theme = next(iter(THEMES.values()))
        self.path: Path | None = None
        self.checker: Callable[[Session], None] | None = None

    @property
    def session(self) -> Session:
        """The session on screen."""
        return self._history.current

    @property
    def history(self) -> History:
        """The sessions that were; change it only through the desk."""
        return self._history

    @property
    def modified(self) -> bool:
        """Whether the session differs from the one last opened or saved."""
        return self.session != self._saved

    @property
    def selection(self) -> "Pointed | None":
        """What is selected, or None."""
        return self._selection

    @property
    def theme(self) -> Theme:
        """The theme in use."""
        return self._theme

    def put(self, session: Session, what: str) -> None:
        """Show a new session as one action of the user, named `what` in the menu."""
        if self._history.push(session, what):
            self.changed.emit(False)

    def edit(self, make: Callable[[Session], Session], what: str) -> str | None:
        """Try an action that may be refused; return the reason, or None when it was done.

        The session stays as it was when `make`, or `checker` on what it made, raises a ColureError: the window's
        checker composes the chart, so that an impossible view is refused where it was asked for.
        """
        try:
            session = make(self.session)
            if self.checker is not None and session != self.session:
                self.checker(session)
        except ColureError as fault:
            return str(fault)
        self.put(session, what)
        return None

    def pass_by(self, session: Session, what: str) -> None:
        """Show a transient session of a drag, a wheel turn or running time."""
        if self._history.transient(session, what):
            self.changed.emit(True)

    def settle(self) -> None:
        """End a drag or a run."""
        self._history.settle()
        self.changed.emit(False)

    def break_off(self, good: Session, reason: str) -> None:
        """End a drag or a run at the last session that could be drawn, and say why."""
        self._history.transient(good, "")
        self.stopped.emit()
        self.settle()
        self.faulted.emit(reason)

    def undo(self) -> None:
        """Go back one action."""
        if self._history.undo():
            self.changed.emit(False)

    def redo(self) -> None:
        """Do the undone action again."""
        if self._history.redo():
            self.changed.emit(False)

    def open(self, session: Session, path: Path | None) -> None:
        """Begin anew with a session from a file, or with none for the demo."""
        self._history.reset(session)
        self._saved, self.path = session, path
        self.select(None)
        self.changed.emit(False)
        self.filed.emit()

    def saved(self, path: Path) -> None:
        """Remember that the session is in a file."""
        self._saved, self.path = self.session, path
        self.filed.emit()

    def select(self, selection: "Pointed | None") -> None:
        """Select something; the session is not touched."""
        if selection != self._selection:
            self._selection = selection
            self.selected.emit()

    def set_theme(self, theme: Theme) -> None:
        """Change the theme; the session is not touched."""
        if theme is not self._theme:
            self._theme = theme
            self.themed.emit()
