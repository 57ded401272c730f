"""The chart on the screen: shows the session of the desk, and turns drags, wheels, clicks and keys into new ones."""

from dataclasses import replace

import numpy as np
from PySide6.QtCore import QEvent, QLineF, QPointF, QRectF, QSize, Qt, QTimer, Signal
from PySide6.QtGui import (
    QColor,
    QFocusEvent,
    QImage,
    QKeyEvent,
    QMouseEvent,
    QNativeGestureEvent,
    QPainter,
    QPaintEvent,
    QPen,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QSizePolicy, QWidget

from colure import navigate, pointing
from colure.arrays import Float
from colure.errors import ColureError
from colure.marks import Scene
from colure.pointing import Pointed
from colure.session import Session
from colure.sky import Sky
from colure_viewer import paint
from colure_viewer.compose import Chart, compose
from colure_viewer.desk import Desk
from colure_viewer.fonts import SANS, font

DRAG_START = 4.0
"""Logical pixels that the pointer must move before a press becomes a drag."""
REACH = 8.0
ZOOM_STEP = 1.25
WHEEL_NOTCH = 120.0
SETTLE_MS = 400
KEY_STEP, KEY_LEAP = 48.0, 240.0


class ChartWidget(QWidget):
    """The sky, drawn by `paint`, with the selection and the measurement over it.

    `hovered` carries the words for what the pointer is over, `measured` a measurement or an empty text, `painted` the
    first time that a chart has been on the screen.
    """

    hovered = Signal(str)
    measured = Signal(str)
    painted = Signal()

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self._chart: Chart | None = None
        self._composed: tuple[object, ...] | None = None
        self._image: QImage | None = None
        self._drawn: tuple[object, ...] | None = None
        self._press: QPointF | None = None
        self._grabbed: Float | None = None
        self._dragging = False
        self._from: Pointed | None = None
        self._to: Pointed | None = None
        self._measuring = False
        self._shown_once = False
        self._settle = QTimer(self)
        self._settle.setSingleShot(True)
        self._settle.setInterval(SETTLE_MS)
        self._settle.timeout.connect(desk.settle)
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setCursor(Qt.CursorShape.CrossCursor)
        self.setAccessibleName("Sky chart")
        self.setAccessibleDescription(
            "Arrow keys move over the sky, plus and minus zoom, space selects what is nearest to the middle, "
            "Shift with space measures from the selection"
        )
        desk.changed.connect(self._changed)
        desk.selected.connect(self.update)
        desk.themed.connect(self.update)

    def sizeHint(self) -> QSize:
        """A chart is happy with any room; this is a good one."""
        return QSize(900, 700)

    def minimumSizeHint(self) -> QSize:
        """Below this the title block would be cut."""
        return QSize(380, 320)

    # What is drawn

    @property
    def chart(self) -> Chart:
        """The chart of the session as the widget shows it, composed now if need be."""
        session, ratio = self._desk.session, self.devicePixelRatioF()
        key = (session, self.width(), self.height(), ratio)
        if self._chart is None or self._composed != key:
            self._chart = compose(session, max(self.width(), 1), max(self.height(), 1), ratio, self._chart)
            self._composed = key
        return self._chart

    @property
    def scene(self) -> Scene:
        """The scene of the chart."""
        return self.chart.scene

    @property
    def sky(self) -> Sky:
        """The sky of the chart."""
        return self.chart.sky

    def check(self, session: Session) -> None:
        """Compose a session that is about to be shown; raise its ColureError, the chart staying as it is."""
        ratio = self.devicePixelRatioF()
        self._chart = compose(session, max(self.width(), 1), max(self.height(), 1), ratio, self._chart)
        self._composed = (session, self.width(), self.height(), ratio)

    def _changed(self, transient: bool) -> None:
        selection = self._desk.selection
        if selection is not None and not transient:
            self._desk.select(pointing.again(self.sky, selection))
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the chart if anything in it has changed, then what lies over it."""
        chart: Chart | None
        try:
            chart = self.chart
        except ColureError as fault:
            # Only a passing session can be refused here: an action is checked before it is taken.
            self._composed = None
            QTimer.singleShot(0, lambda text=str(fault): self._refused(text))
            chart = self._chart
        if chart is not None:
            key = (id(chart.scene), self._desk.theme.name)
            if self._drawn != key or self._image is None:
                self._draw(chart.scene)
                self._drawn = key
        painter = QPainter(self)
        if self._image is not None:
            painter.drawImage(QPointF(0.0, 0.0), self._image)
        else:
            painter.fillRect(self.rect(), QColor(self._desk.theme.colour("paper")))
        if chart is not None:
            self._overlay(painter, chart.scene)
        painter.end()
        if not self._shown_once:
            self._shown_once = True
            QTimer.singleShot(0, self.painted.emit)

    def _refused(self, text: str) -> None:
        self._desk.abandon()
        self._desk.faulted.emit(text)

    def _draw(self, scene: Scene) -> None:
        size = QSize(round(scene.width * scene.ratio), round(scene.height * scene.ratio))
        if self._image is None or self._image.size() != size:
            self._image = QImage(size, QImage.Format.Format_RGB32)
            self._image.setDevicePixelRatio(scene.ratio)
        painter = QPainter(self._image)
        paint.draw(scene, self._desk.theme, painter)
        painter.end()

    def _pixel(self, scene: Scene, pointed: Pointed) -> QPointF | None:
        x, y = (float(v) for v in scene.projector.project(pointed.vector))
        left, top, right, bottom = scene.frame
        inside = np.isfinite([x, y]).all() and left <= x <= right and top <= y <= bottom
        return QPointF(x, y) if inside else None

    def _overlay(self, painter: QPainter, scene: Scene) -> None:
        theme = self._desk.theme
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        selection = self._desk.selection
        if selection is not None and (at := self._pixel(scene, selection)) is not None:
            painter.setPen(QPen(QColor(theme.colour("selection")), 1.6))
            # Four arcs with gaps: the object inside and the lines through it stay visible.
            box = QRectF(at.x() - 12.0, at.y() - 12.0, 24.0, 24.0)
            for quarter in range(4):
                painter.drawArc(box, round((quarter * 90.0 + 15.0) * 16.0), 60 * 16)
        if self._from is not None and self._to is not None:
            a, b = self._pixel(scene, self._from), self._pixel(scene, self._to)
            if a is not None and b is not None:
                colour = QColor(theme.colour("measure"))
                painter.setPen(QPen(colour, 1.4))
                painter.drawLine(QLineF(a, b))
                for end in (a, b):
                    painter.drawEllipse(end, 3.0, 3.0)
                self._tag(painter, (a + b) / 2.0, pointing.measure(self.sky, self._from, self._to).text, colour)
        if self.hasFocus():
            painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
            painter.setPen(QPen(QColor(theme.colour("accent")), 1.0))
            painter.drawRect(QRectF(0.5, 0.5, self.width() - 1.0, self.height() - 1.0))

    def _tag(self, painter: QPainter, at: QPointF, text: str, colour: QColor) -> None:
        painter.setFont(font(SANS, 13.0))
        size = painter.fontMetrics().boundingRect(text).size()
        box = QRectF(at.x() + 10.0, at.y() - size.height() - 6.0, size.width() + 12.0, size.height() + 6.0)
        box.moveRight(min(box.right(), self.width() - 4.0))
        box.moveTop(max(box.top(), 4.0))
        painter.fillRect(box, QColor(self._desk.theme.colour("sky")))
        painter.setPen(colour)
        painter.drawText(box, Qt.AlignmentFlag.AlignCenter, text)

    # Moving

    def _pass(self, view: object, what: str) -> None:
        session = self._desk.session
        self._desk.pass_by(replace(session, view=view), what)  # type: ignore[arg-type]

    def zoom(self, factor: float, at: QPointF | None = None) -> None:
        """Magnify about a pixel, or about the middle of the map; successive zooms are one entry of the history."""
        left, top, right, bottom = self.scene.frame
        x, y = ((left + right) / 2.0, (top + bottom) / 2.0) if at is None else (at.x(), at.y())
        self._pass(navigate.zoomed(self._desk.session, self.sky.axes, self.scene.frame, x, y, factor), "zoom")
        self._settle.start()

    def move(self, right: float, down: float) -> None:  # type: ignore[override]
        """Move over the sky by logical pixels; successive moves are one entry of the history."""
        view = navigate.stepped(self._desk.session, self.sky.axes, self.scene.frame, right, down)
        self._pass(view, "move over the sky")
        self._settle.start()

    def centre_on(self, pointed: Pointed) -> None:
        """Centre the chart on what is pointed at; a body is followed."""
        session = self._desk.session
        if pointed.kind == pointing.BODIES:
            centre = replace(session.view.centre, body=pointed.name.casefold())
            view = replace(session.view, centre=centre)
        else:
            view = navigate.centred_on(session, pointed.vector)
        reason = self._desk.edit(lambda s: replace(s, view=view), f"centre on {pointed.name}")
        if reason is not None:
            self._desk.faulted.emit(reason)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Begin a drag or a measurement."""
        if event.button() != Qt.MouseButton.LeftButton:
            return
        at = event.position()
        self._press, self._dragging = at, False
        self._grabbed = self.scene.unproject(at.x(), at.y())
        self._measuring = bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Drag the sky, draw out a measurement, or say what is under the pointer."""
        at = event.position()
        if self._press is None:
            self.hovered.emit(pointing.readout(self.sky, self.scene, at.x(), at.y()))
            return
        if not self._dragging and QLineF(self._press, at).length() < DRAG_START:
            return
        if self._measuring:
            if not self._dragging:
                self._from = pointing.at(self.sky, self.scene, self._press.x(), self._press.y(), REACH)
            self._dragging = True
            self._measure_to(pointing.at(self.sky, self.scene, at.x(), at.y(), REACH))
            return
        if not self._dragging:
            self._dragging = True
            self.setCursor(Qt.CursorShape.ClosedHandCursor)
        if self._grabbed is not None:
            axes, frame = self.sky.axes, self.scene.frame
            view = navigate.dragged(self._desk.session, axes, frame, self._grabbed, at.x(), at.y())
            self._pass(view, "drag the sky")

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """End a drag, or select or measure what was clicked."""
        if event.button() != Qt.MouseButton.LeftButton or self._press is None:
            return
        at, self._press = self._press, None
        if self._dragging:
            self._dragging = False
            self.setCursor(Qt.CursorShape.CrossCursor)
            if not self._measuring:
                self._desk.settle()
            return
        self.point(at.x(), at.y(), measuring=self._measuring)

    def point(self, x: float, y: float, *, measuring: bool = False) -> None:
        """Select what is at a pixel, or take it as the next end of a measurement."""
        found = pointing.at(self.sky, self.scene, x, y, REACH)
        if not measuring:
            self._from = self._to = None
            self.measured.emit("")
            self._desk.select(found)
            self.update()
            return
        if found is None:
            return
        if self._from is None or self._to is not None:
            # The first end: the selection when a second click is all that the user gave, else this point.
            selection = self._desk.selection
            if self._from is None and selection is not None:
                self._from = selection
                self._measure_to(found)
                return
            self._from, self._to = found, None
            self.measured.emit("")
            self.update()
            return
        self._measure_to(found)

    def _measure_to(self, found: Pointed | None) -> None:
        if found is None or self._from is None:
            return
        self._to = found
        measured = pointing.measure(self.sky, self._from, found)
        self.measured.emit(f"{self._from.name} → {found.name}\n{measured.text}\n(north of {measured.frame})")
        self.update()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Centre on what was double-clicked."""
        at = event.position()
        found = pointing.at(self.sky, self.scene, at.x(), at.y(), REACH)
        if found is not None:
            self._desk.select(found)
            self.centre_on(found)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom about the pointer."""
        turn = event.angleDelta().y() or event.angleDelta().x()
        if turn:
            self.zoom(ZOOM_STEP ** (turn / WHEEL_NOTCH), event.position())
        event.accept()

    def event(self, event: QEvent) -> bool:
        """Zoom by pinching."""
        if isinstance(event, QNativeGestureEvent) and event.gestureType() == Qt.NativeGestureType.ZoomNativeGesture:
            self.zoom(1.0 + event.value(), event.position())
            return True
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Move, zoom, select and measure without a pointer."""
        key, shift = event.key(), bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        step = KEY_LEAP if shift else KEY_STEP
        moves = {
            Qt.Key.Key_Left: (-step, 0.0),
            Qt.Key.Key_Right: (step, 0.0),
            Qt.Key.Key_Up: (0.0, -step),
            Qt.Key.Key_Down: (0.0, step),
        }
        if key in moves:
            self.move(*moves[Qt.Key(key)])
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom(ZOOM_STEP)
        elif key == Qt.Key.Key_Minus:
            self.zoom(1.0 / ZOOM_STEP)
        elif key == Qt.Key.Key_Space:
            left, top, right, bottom = self.scene.frame
            self._point_near_middle((left + right) / 2.0, (top + bottom) / 2.0, shift)
        elif key == Qt.Key.Key_Escape:
            self._from = self._to = None
            self.measured.emit("")
            self._desk.select(None)
            self.update()
        else:
            super().keyPressEvent(event)

    def _point_near_middle(self, x: float, y: float, measuring: bool) -> None:
        picked = self.scene.pick(x, y, 60.0)
        self.point(picked.x, picked.y, measuring=measuring) if picked is not None else self.point(
            x, y, measuring=measuring
        )

    def leaveEvent(self, event: QEvent) -> None:
        """Nothing is under the pointer any more."""
        self.hovered.emit("")
        super().leaveEvent(event)

    def focusInEvent(self, event: QFocusEvent) -> None:
        """Show that the keys move the chart."""
        super().focusInEvent(event)
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """The keys no longer move the chart."""
        super().focusOutEvent(event)
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size is a new chart."""
        super().resizeEvent(event)
        self.update()
