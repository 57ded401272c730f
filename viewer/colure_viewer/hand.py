"""The hand on the chart: turns drags, wheels, pinches, clicks and keys into new sessions, selections, measurements."""

from collections.abc import Callable
from dataclasses import replace
from typing import cast

from PySide6.QtCore import QEvent, QLineF, QObject, QPointF, Qt, QTimer, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QNativeGestureEvent, QWheelEvent

from colure import navigate, pointing
from colure.arrays import Float
from colure.pointing import Pointed
from colure.session import View
from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk

DRAG_START = 4.0
"""Logical pixels that the pointer must move before a press becomes a drag."""
REACH = 8.0
ZOOM_STEP = 1.25
WHEEL_NOTCH = 120.0
SETTLE_MS = 400
KEY_STEP, KEY_LEAP = 48.0, 240.0
KEYS = (
    "Arrow keys move over the sky, plus and minus zoom, space selects what is nearest to the middle, "
    "Shift with space measures from the selection"
)


class Hand(QObject):
    """Pointer and keys of one chart.

    `hovered` carries the words for what the pointer is over, `measured` a measurement or an empty text.
    """

    hovered = Signal(str)
    measured = Signal(str)

    def __init__(self, desk: Desk, chart: ChartWidget) -> None:
        super().__init__(chart)
        self._desk, self._chart = desk, chart
        self._press: QPointF | None = None
        self._grabbed: Float | None = None
        self._dragging = False
        self._measuring = False
        self._from: Pointed | None = None
        self._settle = QTimer(self)
        self._settle.setSingleShot(True)
        self._settle.setInterval(SETTLE_MS)
        self._settle.timeout.connect(desk.settle)
        self._does: dict[QEvent.Type, Callable[..., bool]] = {
            QEvent.Type.MouseButtonPress: self._pressed,
            QEvent.Type.MouseMove: self._moved,
            QEvent.Type.MouseButtonRelease: self._released,
            QEvent.Type.MouseButtonDblClick: self._double_clicked,
            QEvent.Type.Wheel: self._wheeled,
            QEvent.Type.NativeGesture: self._pinched,
            QEvent.Type.KeyPress: self._key,
            QEvent.Type.Leave: self._left,
        }
        chart.setMouseTracking(True)
        chart.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        chart.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        chart.setCursor(Qt.CursorShape.CrossCursor)
        chart.setAccessibleDescription(KEYS)
        chart.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Take the events of pointer and keys, and leave all others."""
        act = self._does.get(event.type())
        # On an empty page there is nothing to point at.
        return act(event) if act is not None and self._chart.current is not None else False

    # Moving

    @property
    def _middle(self) -> tuple[float, float]:
        left, top, right, bottom = self._chart.scene.frame
        return (left + right) / 2.0, (top + bottom) / 2.0

    def _pass(self, view: View, what: str) -> None:
        self._desk.pass_by(replace(self._desk.session, view=view), what)

    def zoom(self, factor: float, at: QPointF | None = None) -> None:
        """Magnify about a pixel, or about the middle of the map; successive zooms are one entry of the history."""
        chart = self._chart
        if chart.current is None:
            return
        x, y = self._middle if at is None else (at.x(), at.y())
        self._pass(navigate.zoomed(self._desk.session, chart.sky.axes, chart.scene.frame, x, y, factor), "zoom")
        self._settle.start()

    def move(self, right: float, down: float) -> None:
        """Move over the sky by logical pixels; successive moves are one entry of the history."""
        chart = self._chart
        view = navigate.stepped(self._desk.session, chart.sky.axes, chart.scene.frame, right, down)
        self._pass(view, "move over the sky")
        self._settle.start()

    def centre_on(self, pointed: Pointed) -> None:
        """Centre the chart on what is pointed at; a body is followed."""
        session = self._desk.session
        if pointed.kind == pointing.BODIES:
            view = replace(session.view, centre=replace(session.view.centre, body=pointed.name.casefold()))
        else:
            view = navigate.centred_on(session, pointed.vector)
        reason = self._desk.edit(lambda s: replace(s, view=view), f"centre on {pointed.name}")
        if reason is not None:
            self._desk.faulted.emit(reason)

    # Pointing

    def at(self, x: float, y: float) -> Pointed | None:
        """Return what is at a pixel of the chart."""
        return pointing.at(self._chart.sky, self._chart.scene, x, y, REACH)

    def point(self, x: float, y: float, *, measuring: bool = False) -> None:
        """Select what is at a pixel, or take it as the next end of a measurement."""
        found = self.at(x, y)
        if not measuring:
            self.let_go()
            self._desk.select(found)
        elif found is not None:
            # A third end begins a new measurement; the first may be the selection, so that one click is enough.
            start = self._from if self._chart.ends is None else None
            if start is None and self._chart.ends is None:
                start = self._desk.selection
            self.let_go()
            self._from = start or found
            if start is not None:
                self._measure_to(found)

    def let_go(self) -> None:
        """Drop the measurement."""
        self._from = self._chart.ends = None
        self.measured.emit("")
        self._chart.update()

    def _measure_to(self, found: Pointed | None) -> None:
        if found is None or self._from is None:
            return
        self._chart.ends = (self._from, found)
        measured = pointing.measure(self._chart.sky, self._from, found)
        self.measured.emit(f"{self._from.name} → {found.name}\n{measured.text}\n(north of {measured.frame})")
        self._chart.update()

    # Events; each returns whether it is done with

    def _pressed(self, event: QMouseEvent) -> bool:
        if event.button() != Qt.MouseButton.LeftButton:
            return False
        self._press, self._dragging = event.position(), False
        self._grabbed = self._chart.scene.unproject(self._press.x(), self._press.y())
        self._measuring = bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        return False

    def _moved(self, event: QMouseEvent) -> bool:
        at, chart = event.position(), self._chart
        if self._press is None:
            self.hovered.emit(pointing.readout(chart.sky, chart.scene, at.x(), at.y()))
            return False
        if not self._dragging and QLineF(self._press, at).length() < DRAG_START:
            return False
        if self._measuring:
            if not self._dragging:
                self._from = self.at(self._press.x(), self._press.y())
            self._dragging = True
            self._measure_to(self.at(at.x(), at.y()))
            return True
        if not self._dragging:
            self._dragging = True
            chart.setCursor(Qt.CursorShape.ClosedHandCursor)
        if self._grabbed is not None:
            frame = chart.scene.frame
            view = navigate.dragged(self._desk.session, chart.sky.axes, frame, self._grabbed, at.x(), at.y())
            self._pass(view, "drag the sky")
        return True

    def _released(self, event: QMouseEvent) -> bool:
        if event.button() != Qt.MouseButton.LeftButton or self._press is None:
            return False
        at, self._press = self._press, None
        if not self._dragging:
            self.point(at.x(), at.y(), measuring=self._measuring)
        elif not self._measuring:
            self._desk.settle()
        self._dragging = False
        self._chart.setCursor(Qt.CursorShape.CrossCursor)
        return True

    def _double_clicked(self, event: QMouseEvent) -> bool:
        found = self.at(event.position().x(), event.position().y())
        if found is not None:
            self._desk.select(found)
            self.centre_on(found)
        return True

    def _wheeled(self, event: QWheelEvent) -> bool:
        turn = event.angleDelta().y() or event.angleDelta().x()
        if turn:
            self.zoom(ZOOM_STEP ** (turn / WHEEL_NOTCH), event.position())
        event.accept()
        return True

    def _pinched(self, event: QEvent) -> bool:
        gesture = cast("QNativeGestureEvent", event)
        if gesture.gestureType() != Qt.NativeGestureType.ZoomNativeGesture:
            return False
        self.zoom(1.0 + gesture.value(), gesture.position())
        return True

    def _key(self, event: QKeyEvent) -> bool:
        key, shift = event.key(), bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        step = KEY_LEAP if shift else KEY_STEP
        match key:
            case Qt.Key.Key_Left:
                self.move(-step, 0.0)
            case Qt.Key.Key_Right:
                self.move(step, 0.0)
            case Qt.Key.Key_Up:
                self.move(0.0, -step)
            case Qt.Key.Key_Down:
                self.move(0.0, step)
            case Qt.Key.Key_Plus | Qt.Key.Key_Equal:
                self.zoom(ZOOM_STEP)
            case Qt.Key.Key_Minus:
                self.zoom(1.0 / ZOOM_STEP)
            case Qt.Key.Key_Space:
                x, y = self._middle
                picked = self._chart.scene.pick(x, y, 60.0)
                x, y = (x, y) if picked is None else (picked.x, picked.y)
                self.point(x, y, measuring=shift)
            case Qt.Key.Key_Escape:
                self.let_go()
                self._desk.select(None)
            case _:
                return False
        return True

    def _left(self, event: QEvent) -> bool:
        self.hovered.emit("")
        return False
