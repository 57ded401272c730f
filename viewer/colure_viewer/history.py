"""Undo and redo: the sessions that were, kept as values; transient ones leave a single entry at their end."""

from colure.session import Session

MOST = 200
"""Sessions kept for undo; each shares nearly all of its parts with its neighbours."""


class History:
    """The session of now, those before it and those undone.

    `push` is one action of the user. A drag, a turn of the wheel or running time calls `transient` for every step and
    `settle` at its end, which makes one entry of them all.
    """

    def __init__(self, session: Session) -> None:
        self.current = session
        self._before: list[tuple[Session, str]] = []
        self._after: list[tuple[Session, str]] = []
        self._anchor: Session | None = None
        self._doing = ""

    def push(self, session: Session, what: str = "") -> bool:
        """Take a new session as one action; return whether anything changed."""
        self.settle()
        if session == self.current:
            return False
        self._remember(self.current, what)
        self.current = session
        return True

    def transient(self, session: Session, what: str = "") -> bool:
        """Take a session that passes by; return whether anything changed."""
        if session == self.current:
            return False
        if self._anchor is None:
            self._anchor, self._doing = self.current, what
        self.current = session
        return True

    def settle(self) -> None:
        """End a drag or a run: one entry leads back to where it began."""
        anchor, self._anchor = self._anchor, None
        if anchor is not None and anchor != self.current:
            self._remember(anchor, self._doing)

    def _remember(self, session: Session, what: str) -> None:
        self._before.append((session, what))
        del self._before[:-MOST]
        self._after.clear()

    @property
    def undo_name(self) -> str | None:
        """What undo would take back, or None when there is nothing."""
        self_anchor = self._anchor is not None and self._anchor != self.current
        return self._doing if self_anchor else (self._before[-1][1] if self._before else None)

    @property
    def redo_name(self) -> str | None:
        """What redo would do again, or None when there is nothing."""
        return self._after[-1][1] if self._after else None

    def undo(self) -> bool:
        """Step back; return whether there was an entry."""
        self.settle()
        if not self._before:
            return False
        session, what = self._before.pop()
        self._after.append((self.current, what))
        self.current = session
        return True

    def redo(self) -> bool:
        """Step forward again; return whether there was an entry."""
        self.settle()
        if not self._after:
            return False
        session, what = self._after.pop()
        self._before.append((self.current, what))
        self.current = session
        return True

    def reset(self, session: Session) -> None:
        """Begin anew, as after opening a file."""
        self.__init__(session)  # type: ignore[misc]
