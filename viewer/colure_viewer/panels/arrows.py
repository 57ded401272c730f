"""A clear sheet over the chart on which the steps of a ledger are drawn as arrows."""

from PySide6.QtCore import QEvent, QObject, QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QWidget

from colure.arrays import Float
from colure.ledger import Ledger
from colure.ledger.arrows import Arrow, Arrows, lay
from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk
from colure_viewer.fonts import SANS, font

HEAD_PX, TEXT_PX, FREE_PX = 8.0, 13.0, 6.0


class StepArrows(QWidget):
    """The arrows of one ledger; the pointer goes through to the chart.

    `laid` is what is drawn, or None where the direction is off the map or nothing is shown.
    """

    def __init__(self, desk: Desk, chart: ChartWidget) -> None:
        super().__init__(chart)
        self._desk, self._chart = desk, chart
        self._ledger: Ledger | None = None
        self._direction: Float | None = None
        self._body = ""
        self._chosen: str | None = None
        self._factor: float | None = None
        self.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
        self.setAttribute(Qt.WidgetAttribute.WA_NoSystemBackground)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setAccessibleName("Steps of the ledger as arrows")
        self.setGeometry(chart.rect())
        chart.installEventFilter(self)
        self.show()

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Cover the chart at every size."""
        if event.type() == QEvent.Type.Resize:
            self.setGeometry(self._chart.rect())
        return False

    @property
    def laid(self) -> Arrows | None:
        """The arrows as they lie on the chart that is shown."""
        chart = self._chart.current
        if self._ledger is None or self._direction is None or chart is None:
            return None
        # While time runs a body moves at every frame, its figures only a few times a second.
        moving = chart.sky["bodies"].vector(self._body) if self._body else None
        direction = self._direction if moving is None else moving
        return lay(self._ledger, direction, chart.scene, chosen=self._chosen, factor=self._factor)

    def show_ledger(
        self,
        ledger: Ledger | None,
        direction: Float | None,
        chosen: str | None,
        factor: float | None,
        body: str = "",
    ) -> None:
        """Show the arrows of a ledger about a direction (3,), or about a body of the chart, or none."""
        self._body = body
        if (ledger, chosen, factor) != (self._ledger, self._chosen, self._factor) or direction is not self._direction:
            self._ledger, self._direction, self._chosen, self._factor = ledger, direction, chosen, factor
            self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the arrows, the chosen one last, and the factor."""
        laid = self.laid
        if laid is None or not (laid.drawn or laid.long):
            return
        painter = QPainter(self)
        left, top, right, bottom = self._chart.scene.frame
        painter.setClipRect(QRectF(left, top, right - left, bottom - top))
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(font(SANS, TEXT_PX))
        foot = QPointF(laid.x, laid.y)
        for arrow in sorted(laid.drawn, key=lambda one: one.step == self._chosen):
            self._draw(painter, foot, arrow)
        self._tag(painter, laid)
        painter.end()

    def _draw(self, painter: QPainter, foot: QPointF, arrow: Arrow) -> None:
        theme, chosen = self._desk.theme, arrow.step == self._chosen
        colour = QColor(theme.colour("selection" if chosen else "accent"))
        pen = QPen(colour, 2.4 if chosen else 1.4)
        if arrow.is_turn:
            # Turns of the axes are dashed: they move the numbers, not the light.
            pen.setStyle(Qt.PenStyle.DashLine)
        painter.setPen(pen)
        tip = foot + QPointF(arrow.dx, arrow.dy)
        length = max((arrow.dx**2 + arrow.dy**2) ** 0.5, 1e-9)
        ux, uy = arrow.dx / length, arrow.dy / length
        # The object itself stays visible.
        painter.drawLine(foot + QPointF(ux, uy) * min(FREE_PX, 0.3 * length), tip)
        head = min(HEAD_PX, 0.6 * length)
        back = tip - QPointF(ux, uy) * head
        side = QPointF(-uy, ux) * (0.4 * head)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour)
        painter.drawPolygon(QPolygonF([tip, back + side, back - side]))
        if length > 24.0:
            self._text(painter, tip + QPointF(ux, uy) * 11.0, str(arrow.number), colour)

    def _tag(self, painter: QPainter, laid: Arrows) -> None:
        """Say the factor in the corner of the map, where it covers the least."""
        left, _, _, bottom = self._chart.scene.frame
        half = 0.5 * painter.fontMetrics().horizontalAdvance(laid.text)
        self._text(
            painter, QPointF(left + half + 10.0, bottom - 16.0), laid.text, QColor(self._desk.theme.colour("accent"))
        )

    def _text(self, painter: QPainter, at: QPointF, text: str, colour: QColor) -> None:
        """Write a text about a point on a ground of its own, inside the chart."""
        metrics = painter.fontMetrics()
        box = metrics.boundingRect(text).toRectF().adjusted(-3.0, -1.0, 3.0, 1.0)
        box.moveCenter(at)
        box.moveLeft(min(max(box.left(), 4.0), self.width() - box.width() - 4.0))
        box.moveTop(min(max(box.top(), 4.0), self.height() - box.height() - 4.0))
        ground = QColor(self._desk.theme.colour("sky"))
        ground.setAlpha(215)
        painter.fillRect(box, ground)
        painter.setPen(colour)
        painter.drawText(box, Qt.AlignmentFlag.AlignCenter, text)
