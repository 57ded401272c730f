"""Work that would hold up the window: done beside it, with a title, a progress bar and a cancel."""

from collections.abc import Callable
from typing import Any

from PySide6.QtCore import QObject, QRunnable, QThreadPool, Signal, Slot

from colure.errors import ColureError


class _Answer(QObject):
    """Carries an answer to the thread of the window."""

    ready = Signal(int, object, object)


class _Work(QRunnable):
    def __init__(self, number: int, work: Callable[[], Any], answer: _Answer) -> None:
        super().__init__()
        self._number, self._work, self._answer = number, work, answer

    def run(self) -> None:
        """Do the work; a refusal is an answer too."""
        result: Any = None
        fault: BaseException | None = None
        try:
            result = self._work()
        except Exception as raised:
            fault = raised
        self._answer.ready.emit(self._number, result, fault)


class Jobs(QObject):
    """One piece of work at a time: an answer whose number is old is dropped.

    `began` carries a title, `ended` nothing. `work` must hold all its inputs and touch no widget.
    """

    began = Signal(str)
    ended = Signal()

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._number = 0
        self._done: Callable[[Any], None] | None = None
        self._failed: Callable[[str], None] | None = None
        self._answer = _Answer(self)
        self._answer.ready.connect(self._arrived)
        self._pool = QThreadPool(self)
        self._pool.setMaxThreadCount(1)

    @property
    def busy(self) -> bool:
        """Whether an answer is awaited."""
        return self._done is not None

    def run(
        self, title: str, work: Callable[[], Any], done: Callable[[Any], None], failed: Callable[[str], None]
    ) -> None:
        """Start work in place of any that runs; `done` gets its answer, or `failed` one line, in the calling thread."""
        self._number += 1
        self._done, self._failed = done, failed
        self.began.emit(title)
        self._pool.start(_Work(self._number, work, self._answer))

    def cancel(self) -> None:
        """Drop the answer that is awaited."""
        if self.busy:
            self._number += 1
            self._done = self._failed = None
            self.ended.emit()

    def wait(self) -> None:
        """Wait until no work runs; for closing."""
        self.cancel()
        self._pool.waitForDone()

    @Slot(int, object, object)
    def _arrived(self, number: int, result: Any, fault: BaseException | None) -> None:
        if number != self._number or self._done is None or self._failed is None:
            return
        done, failed = self._done, self._failed
        self._done = self._failed = None
        self.ended.emit()
        if fault is None:
            done(result)
        elif isinstance(fault, ColureError | OSError | MemoryError):
            failed(str(fault) or type(fault).__name__)
        else:
            raise fault
