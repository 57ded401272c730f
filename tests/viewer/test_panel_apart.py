"""The table of frames as differences from a chosen one: the core's figures, in place of positions and back."""

import pytest
from PySide6.QtCore import QSettings
from PySide6.QtGui import QGuiApplication

from colure import everyframe, pointing
from colure_viewer import app
from colure_viewer.panels import apart


@pytest.fixture
def window(qtbot, tmp_path):
    made = app.window(settings=QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat))
    qtbot.addWidget(made, before_close_func=lambda w: w.jobs.wait())
    made.desk._saved = made.desk.session
    made.resize(1200, 800)
    made.show()
    qtbot.waitUntil(lambda: made.top is not None)
    made.desk.select(pointing.body(made.chart.sky, "uranus"))
    return made


def choose(panel, frame):
    panel.against.setCurrentIndex(panel.against.findData(frame))
    panel.against.activated.emit(panel.against.currentIndex())


def test_differences_take_the_place_of_positions_and_back(window):
    panel = window.right.direction
    before = [panel.table.item(0, column).text() for column in range(3)]
    choose(panel, "icrs")
    assert panel.table.horizontalHeaderItem(1).text() == "Δ lon cos lat"
    session, here = window.desk.session, window.desk.selection
    also = tuple(circle.frame for circle in session.circles)
    moving = apart.motion(here, session)
    wanted = everyframe.differences(here.vector, session.moment, "icrs", site=session.site, motion=moving, also=also)
    assert panel.table.rowCount() == len(wanted)
    assert panel.table.item(0, 1).text() in ("0.0″", "0″", "0.00″")
    date = next(at for at, row in enumerate(wanted) if row.frame == "equator/mean/date")
    # Precession over 26.9 years: 22′ (the annual 50.3″ of the handbooks times that).
    assert wanted[date].size_arcsec == pytest.approx(26.9 * 50.3, rel=0.02)
    assert panel.table.item(date, 1).text().startswith("+22′")
    tip = panel.table.item(date, 1).toolTip()
    assert "along the motion" in tip
    assert "position angle 0° of icrs" in tip
    panel.copy()
    assert "read as icrs" in QGuiApplication.clipboard().text()
    choose(panel, None)
    assert [panel.table.item(0, column).text() for column in range(3)] == before
    assert panel.table.horizontalHeaderItem(1).text() == "longitude"


def test_what_stands_still_has_no_motion(window):
    star = pointing.star(window.chart.sky, 100)
    assert apart.motion(star, window.desk.session) is None
    window.desk.select(star)
    choose(window.right.direction, "ecliptic/mean/date")
    assert "along" not in window.right.direction.table.item(0, 0).toolTip()


def test_the_table_fits_its_column(qtbot, window):
    panel = window.right.direction
    window.resize(1024, 700)
    choose(panel, "icrs")
    qtbot.wait(20)
    metrics = panel.table.fontMetrics()
    for row in range(panel.table.rowCount()):
        for column in (1, 2):
            text = panel.table.item(row, column).text()
            assert metrics.horizontalAdvance(text) <= panel.table.columnWidth(column), text
    assert panel.minimumSizeHint().width() <= window.right.viewport().width()
