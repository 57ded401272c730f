"""The window: what is typed reaches the session, what the session holds is shown, and nothing bad gets in."""

import gc
import weakref
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, QSettings, Qt
from PySide6.QtGui import QAction, QGuiApplication, QWheelEvent
from PySide6.QtWidgets import QMenu, QWidget

from colure import session_file
from colure.moment import Moment
from colure.session import Circle, Session
from colure_viewer import app
from colure_viewer.themes import THEMES


@pytest.fixture
def settings(tmp_path):
    return QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat)


@pytest.fixture
def window(qtbot, settings):
    """A window of 1200 × 800 with all its panels, selection dropped."""
    made = app.window(settings=settings)
    qtbot.addWidget(made, before_close_func=lambda w: w.jobs.wait())
    made.desk._saved = made.desk.session
    made.resize(1200, 800)
    made.show()
    qtbot.waitUntil(lambda: made.top is not None)
    made.desk.select(None)
    return made


def type_into(qtbot, field, text, key=Qt.Key.Key_Return):
    field.setFocus()
    field.selectAll()
    # As if typed or pasted; key events of the test module know Latin letters only.
    field.insert(text)
    qtbot.keyClick(field, key)


# What is typed


def test_a_typed_moment_reaches_the_session(qtbot, window):
    type_into(qtbot, window.top.moment.field, "2027-06-21 12:00 UTC")
    assert window.desk.session.moment == Moment.parse("2027-06-21 12:00 UTC")
    assert window.top.moment.field.text() == "2027-06-21 12:00:00 UTC"
    assert window.desk.history.undo_name == "set the moment"


def test_the_session_reaches_the_fields(qtbot, window):
    session = window.desk.session
    view = replace(session.view, projection="gnomonic", width_deg=3.0, east_left=False, limit_mag=9.5)
    window.desk.put(replace(session, moment=Moment.parse("-1200-03-30"), view=view, place="apparent"), "test")
    assert "−1200-03-30" in window.top.moment.field.text()
    assert "Julian" in window.top.moment.field.text()
    bar = window.top.view
    assert bar.projection.currentData() == "gnomonic"
    assert bar.east.text() == "east right"
    assert (bar.width_field.text(), bar.limit.text(), bar.place.currentText()) == ("3.0°", "9.5", "apparent")


@pytest.mark.parametrize(
    ("where", "text", "needle"),
    [
        (lambda w: w.top.moment.field, "2026-13-01", "month"),
        (lambda w: w.top.moment.field, "1582-10-10", "1582"),
        (lambda w: w.top.moment.step, "3 lightyears", "unit"),
        (lambda w: w.top.site.field, "Qern Hill", "Quern Hill"),
        (lambda w: w.top.view.centre, "75", "position"),
        (lambda w: w.top.view.centre, "75 6 ecliptc/mean/date", "ecliptic"),
        (lambda w: w.top.view.width_field, "-3", "width"),
        (lambda w: w.top.view.width_field, "nan", "width"),
        (lambda w: w.top.view.limit, "bright", "magnitude"),
        (lambda w: w.top.search.field, "Betelgeuze", "Betelgeuse"),
        (lambda w: w.left.circles.equinox, "J20x", "equinox"),
        (lambda w: w.left.circles.lat, "91", "91"),
        (lambda w: w.left.belt.half_width, "70", "60"),
        (lambda w: w.left.belt.frame, "eclptic/mean/date", "ecliptic"),
        (lambda w: w.left.layers.grid, "grid", "frame"),
    ],
)
def test_a_bad_entry_is_marked_and_the_old_value_kept(qtbot, window, where, text, needle):
    field, before = where(window), window.desk.session
    shown = field.value
    type_into(qtbot, field, text)
    assert window.desk.session == before
    assert field.fault is not None
    assert needle.casefold() in field.fault.casefold()
    assert field.property("fault") is True
    assert field.text() == text
    assert field.fault in field.accessibleDescription()
    note = field._note
    assert note.isVisible()
    assert needle.casefold() in note.text().casefold()
    assert window.rect().contains(note.geometry())
    qtbot.keyClick(field, Qt.Key.Key_Escape)
    assert field.fault is None
    assert field.text() == shown
    assert not note.isVisible()


def test_a_refused_entry_can_be_mended(qtbot, window):
    field = window.top.moment.field
    type_into(qtbot, field, "2026-02-30")
    assert field.fault
    type_into(qtbot, field, "2026-02-28")
    assert field.fault is None
    assert window.desk.session.moment == Moment.parse("2026-02-28")


def test_a_view_that_cannot_be_drawn_is_refused_where_it_is_asked_for(qtbot, window):
    session = window.desk.session
    window.desk.put(replace(session, from_site=True), "test")
    # The Earth has no direction from itself.
    type_into(qtbot, window.top.view.centre, "earth")
    assert window.top.view.centre.fault is not None
    assert window.desk.session.view == session.view


def test_every_field_takes_what_it_shows(qtbot, window):
    before = window.desk.session
    bar = window.top
    for field in (bar.moment.field, bar.moment.step, bar.site.field, bar.view.centre, bar.view.width_field,
                  bar.view.limit, window.left.belt.half_width, window.left.belt.frame, window.left.layers.grid,
                  window.left.circles.equinox, window.left.circles.lat):  # fmt: skip
        type_into(qtbot, field, field.text().replace("−", "-"))
        assert field.fault is None, (field.accessibleName(), field.fault)
    after = window.desk.session
    assert after.view.centre.lon_deg == pytest.approx(before.view.centre.lon_deg, abs=1e-9)
    assert (after.circles, after.belt, after.site) == (before.circles, before.belt, before.site)


# Circles, belt, bodies


def test_circles_are_added_recoloured_and_removed(qtbot, window, monkeypatch):
    from PySide6.QtGui import QColor
    from PySide6.QtWidgets import QColorDialog

    panel, count = window.left.circles, len(window.desk.session.circles)
    panel.add()
    assert len(window.desk.session.circles) == panel.table.rowCount() == count + 1
    assert panel.row == count
    monkeypatch.setattr(QColorDialog, "getColor", lambda *_: QColor("#123456"))
    panel.recolour()
    assert window.desk.session.circles[-1].colour == "#123456"
    panel.plane.setCurrentText("equator")
    panel.plane.activated.emit(panel.plane.currentIndex())
    assert window.desk.session.circles[-1].frame == "equator/mean/date"
    type_into(qtbot, panel.equinox, "-1200")
    assert window.desk.session.circles[-1].frame == "equator/mean/-1200"
    panel.model.setCurrentText("vondrak2011")
    panel.model.activated.emit(panel.model.currentIndex())
    assert window.desk.session.circles[-1].frame == "equator/mean/-1200@vondrak2011"
    panel.remove()
    assert len(window.desk.session.circles) == panel.table.rowCount() == count
    for _ in range(6):
        window.undo()
    assert window.desk.session == window.desk._saved
    assert panel.table.rowCount() == count


def test_ticks_in_the_table_are_circles_shown_and_graduated(window):
    panel = window.left.circles
    panel.table.item(1, 0).setCheckState(Qt.CheckState.Unchecked)
    panel.table.item(2, 3).setCheckState(Qt.CheckState.Checked)
    circles = window.desk.session.circles
    assert (circles[1].visible, circles[2].graduated) == (False, True)
    window.undo()
    window.undo()
    assert panel.table.item(1, 0).checkState() == Qt.CheckState.Checked


def test_the_session_reaches_the_table(window):
    circles = (Circle("icrs", colour="#0072B2"), Circle("equator/fk4/B1950", 10.0, graduated=False))
    window.desk.put(replace(window.desk.session, circles=circles), "test")
    table = window.left.circles.table
    assert [table.item(1, k).text() for k in range(3)] == ["equator 10.0°", "fk4", "B1950"]
    window.desk.put(replace(window.desk.session, circles=()), "test")
    assert table.rowCount() == 0
    assert not window.left.circles.remove_button.isEnabled()
    window.left.circles.remove()
    assert window.left.circles.circle is None


def test_boxes_go_both_ways(window):
    left, desk = window.left, window.desk
    left.bodies.boxes["mars"].click()
    assert "mars" not in desk.session.bodies
    left.layers.boxes["edges"].click()
    assert desk.session.layers.edges
    left.belt.visible.click()
    assert not desk.session.belt.visible
    for _ in range(3):
        window.undo()
    assert left.bodies.boxes["mars"].isChecked()
    assert not left.layers.boxes["edges"].isChecked()
    assert left.belt.visible.isChecked()
    assert desk.session.bodies == Session.demo().bodies


# The chart under the hand


def middle(chart):
    left, top, right, bottom = chart.scene.frame
    return QPoint(round((left + right) / 2), round((top + bottom) / 2))


def test_a_drag_moves_the_sky_and_is_one_entry(qtbot, window):
    chart, start = window.chart, middle(window.chart)
    before = window.desk.session
    grabbed = chart.scene.unproject(start.x(), start.y())
    qtbot.mousePress(chart, Qt.MouseButton.LeftButton, pos=start)
    for step in range(1, 9):
        qtbot.mouseMove(chart, start + QPoint(10 * step, 5 * step))
    qtbot.mouseRelease(chart, Qt.MouseButton.LeftButton, pos=start + QPoint(80, 40))
    # What was grabbed is under the pointer again, to a fraction of a pixel.
    assert chart.scene.projector.project(grabbed) == pytest.approx([start.x() + 80, start.y() + 40], abs=0.1)
    assert window.desk.history.undo_name == "drag the sky"
    window.undo()
    assert window.desk.session == before
    assert window.desk.history.undo_name is None


def test_the_wheel_zooms_about_the_pointer_and_is_one_entry(qtbot, window):
    chart = window.chart
    at = QPointF(middle(chart)) + QPointF(120, -70)
    held = chart.scene.unproject(at.x(), at.y())
    before = window.desk.session
    for _ in range(3):
        event = QWheelEvent(at, chart.mapToGlobal(at), QPoint(), QPoint(0, 120), Qt.MouseButton.NoButton,
                            Qt.KeyboardModifier.NoModifier, Qt.ScrollPhase.NoScrollPhase, False)  # fmt: skip
        QGuiApplication.sendEvent(chart, event)
    assert window.desk.session.view.width_deg == pytest.approx(before.view.width_deg / 1.25**3)
    assert chart.scene.projector.project(held) == pytest.approx([at.x(), at.y()], abs=0.1)
    qtbot.waitUntil(lambda: window.desk.history._anchor is None)
    window.undo()
    assert window.desk.session == before


def test_keys_move_zoom_select_and_let_go(qtbot, window):
    chart, before = window.chart, window.desk.session
    chart.setFocus()
    grabbed = chart.scene.unproject(*(v + 48 for v in (middle(chart).x(), -48 + middle(chart).y())))
    qtbot.keyClick(chart, Qt.Key.Key_Right)
    place = chart.scene.projector.project(grabbed)
    assert place[0] == pytest.approx(middle(chart).x(), abs=1.0)
    qtbot.keyClick(chart, Qt.Key.Key_Plus)
    assert window.desk.session.view.width_deg < before.view.width_deg
    qtbot.keyClick(chart, Qt.Key.Key_Minus)
    assert window.desk.session.view.width_deg == pytest.approx(before.view.width_deg)
    qtbot.keyClick(chart, Qt.Key.Key_Space)
    assert window.desk.selection is not None
    qtbot.keyClick(chart, Qt.Key.Key_Escape)
    assert window.desk.selection is None


def body_pixel(window, name):
    chart = window.chart
    x, y = chart.scene.projector.project(chart.sky["bodies"].vector(name))
    return QPoint(round(float(x)), round(float(y)))


def test_a_click_selects_and_the_panel_follows(qtbot, window):
    qtbot.mouseClick(window.chart, Qt.MouseButton.LeftButton, pos=body_pixel(window, "uranus"))
    assert window.desk.selection.name == "Uranus"
    panel = window.right.direction
    assert panel.title.text() == "Uranus"
    rows = {row.frame: row for row in panel.rows}
    assert panel.table.item(0, 1).text() == rows["icrs"].lon_text
    # The circles on the chart are in the table too.
    assert "ecliptic/mean/-1000" in rows
    before = rows["ecliptic/mean/date"].lon_deg
    window.desk.put(replace(window.desk.session, moment=window.desk.session.moment.shifted(10.0)), "test")
    after = {row.frame: row for row in panel.rows}["ecliptic/mean/date"].lon_deg
    # Uranus near opposition goes back by some 2.5′ a day.
    assert -0.6 < after - before < -0.2
    panel.copy()
    assert "Uranus" in QGuiApplication.clipboard().text()
    assert panel.rows[0].lon_text in QGuiApplication.clipboard().text()


def test_shift_clicks_measure(qtbot, window):
    a, b = body_pixel(window, "uranus"), middle(window.chart)
    with qtbot.waitSignal(window.hand.measured):
        qtbot.mouseClick(window.chart, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.ShiftModifier, a)
    qtbot.mouseClick(window.chart, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.ShiftModifier, b)
    text = window.right.measure.text.text()
    assert "Uranus →" in text
    assert "position angle" in text
    # The second end is the star or the point there.
    v, w = window.chart.sky["bodies"].vector("uranus"), window.chart.ends[1].vector
    assert f"\n{int(np.degrees(np.arccos(v @ w))):02d}°" in text


def test_hovering_says_what_is_there(qtbot, window):
    with qtbot.waitSignal(window.hand.hovered, check_params_cb=lambda text: text.startswith("Uranus")):
        qtbot.mouseMove(window.chart, body_pixel(window, "uranus") + QPoint(30, 30))
        qtbot.mouseMove(window.chart, body_pixel(window, "uranus"))
    assert "β" in window._hover.text()


def test_search_selects_and_centres(qtbot, window):
    # Pasted: the list of completions would want to pop up, which the offscreen platform only warns about.
    def look_for(name):
        window.top.search.field.setText(name)
        window.top.search.field.setModified(True)
        qtbot.keyClick(window.top.search.field, Qt.Key.Key_Return)

    look_for("Aldebaran")
    assert window.desk.selection.name == "Aldebaran"
    chart = window.chart
    here = chart.scene.projector.project(window.desk.selection.vector)
    assert here == pytest.approx([middle(chart).x(), middle(chart).y()], abs=1.0)
    look_for("moon")
    assert window.desk.session.view.centre.body == "moon"


# Time


def test_steps_and_running_time(qtbot, window):
    before = window.desk.session.moment
    bar = window.top.moment
    type_into(qtbot, bar.step, "10 min")
    window.step_on()
    assert window.desk.session.moment == before.shifted(600.0 / 86400.0)
    window.step_back()
    assert abs(window.desk.session.moment.jd_tt - before.jd_tt) < 1e-8
    window.run_on()
    assert bar.running == 1
    qtbot.waitUntil(lambda: window.desk.session.moment.jd_tt > before.jd_tt + 0.005)
    window.run_on()
    assert bar.running == 0
    assert window.desk.history.undo_name == "run time"
    window.undo()
    assert abs(window.desk.session.moment.jd_tt - before.jd_tt) < 1e-8


def test_time_stops_at_the_end_of_the_calendar(qtbot, window):
    edge = Moment.parse("4999-12-31 23:00 TT")
    window.desk.put(replace(window.desk.session, moment=edge), "test")
    window.top.moment.speed.setCurrentIndex(window.top.moment.speed.count() - 1)
    with qtbot.waitSignal(window.desk.faulted):
        window.run_on()
    assert window.top.moment.running == 0


def test_a_scale_that_does_not_reach_is_said(qtbot, window):
    window.desk.put(replace(window.desk.session, moment=Moment.parse("-1200-03-30")), "test")
    combo = window.top.moment.scale
    combo.setCurrentText("UTC")
    with qtbot.waitSignal(window.desk.faulted, check_params_cb=lambda text: "UTC" in text):
        combo.activated.emit(combo.currentIndex())


# Files


def test_save_open_and_recent(qtbot, window, tmp_path):
    path = tmp_path / "evening.toml"
    window.desk.put(replace(window.desk.session, place="apparent"), "test")
    assert window.isWindowModified()
    assert window.save_path(path)
    assert not window.isWindowModified()
    assert "evening.toml" in window.windowTitle()
    kept = window.desk.session
    window.desk.put(Session.demo(), "test")
    window.desk._saved = window.desk.session
    assert window.open_path(path)
    assert window.desk.session == kept
    assert window.recent_paths() == [path]
    menu = window.actions_by_name["recent"]
    assert isinstance(menu, QMenu)
    assert [a.text() for a in menu.actions()] == [str(path)]


@pytest.mark.parametrize(
    "content", [b"", b"format = 2", b"\x00\xff\x00", b"format = 1\n[view]\nwidth_deg = nan", b"[" * 5000]
)
def test_a_bad_session_is_reported_and_the_old_one_kept(qtbot, window, tmp_path, content):
    path, before = tmp_path / "bad.toml", window.desk.session
    path.write_bytes(content)
    with qtbot.assertNotEmitted(window.desk.changed):
        assert not window.open_path(path)
    assert window.desk.session == before
    assert "bad.toml" in window._hover.text()


def test_unknown_keys_are_kept_and_said(window, tmp_path):
    path = tmp_path / "newer.toml"
    path.write_text(session_file.dumps(window.desk.session) + '\n[future]\nthing = "kept"\n', encoding="utf-8")
    assert window.open_path(path)
    assert "future" in window._hover.text()
    assert window.save_path(path)
    assert 'thing = "kept"' in path.read_text(encoding="utf-8")


def test_a_session_that_cannot_be_saved_stays_unsaved(window, tmp_path):
    window.desk.put(replace(window.desk.session, place="apparent"), "test")
    assert not window.save_path(tmp_path / "no" / "such" / "folder.toml")
    assert window.isWindowModified()
    assert "folder.toml" in window._hover.text()


@pytest.mark.parametrize(("suffix", "start"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_export_writes_beside_the_window(qtbot, window, tmp_path, suffix, start):
    path = tmp_path / f"chart.{suffix}"
    with qtbot.waitSignal(window.jobs.ended, timeout=20000):
        window.export_path(path)
    assert path.read_bytes().startswith(start)
    assert str(path) in window._hover.text()


@pytest.mark.parametrize("name", ["chart.gif", "chart", "no/such/folder.png"])
def test_an_export_that_cannot_be_is_said(qtbot, window, tmp_path, name):
    with qtbot.waitSignal(window.chart._desk.faulted, raising=False, timeout=10):
        window.export_path(tmp_path / name)
    qtbot.waitUntil(lambda: not window.jobs.busy)
    assert name.rpartition("/")[2] in window._hover.text()
    assert not (tmp_path / name).exists()


def test_copy_puts_the_chart_on_the_clipboard(window):
    window.copy_chart()
    image = QGuiApplication.clipboard().image()
    assert (image.width(), image.height()) == (window.chart.width(), window.chart.height())


# The whole


def test_every_control_has_an_accessible_name_and_can_be_reached(window):
    from PySide6.QtWidgets import (
        QAbstractButton,
        QAbstractItemView,
        QAbstractSpinBox,
        QComboBox,
        QHeaderView,
        QLineEdit,
    )

    kinds = (QAbstractButton, QComboBox, QLineEdit, QAbstractSpinBox, QAbstractItemView)
    controls = [c for c in window.findChildren(QWidget) if isinstance(c, kinds) and c.isVisibleTo(window)]
    controls = [c for c in controls if not isinstance(c, QHeaderView) and not c.objectName().startswith("qt_")]
    assert len(controls) > 40
    for control in controls:
        named = control.accessibleName() or getattr(control, "text", lambda: "")()
        assert named, control
    typed = [c for c in controls if isinstance(c, QLineEdit | QComboBox)]
    assert all(c.focusPolicy() & Qt.FocusPolicy.TabFocus for c in typed)
    assert window.chart.accessibleName()


def test_no_two_commands_share_a_key(window):
    from collections import Counter

    actions = [a for a in window.actions_by_name.values() if isinstance(a, QAction)]
    keys = Counter(a.shortcut().toString() for a in actions if not a.shortcut().isEmpty())
    assert max(keys.values()) == 1
    assert len(keys) > 25


@pytest.mark.parametrize("name", THEMES)
def test_themes_dress_the_window_and_are_remembered(window, settings, name):
    before = window.desk.session
    window._set_theme(name)
    assert window.desk.theme.name == name
    assert window.desk.session is before
    assert window.grab().toImage().pixelColor(3, window.height() // 2).name().upper() == THEMES[name].colour("window")


@pytest.mark.parametrize("size", [(1024, 700), (1920, 1080)])
def test_nothing_is_cut_at_any_size(qtbot, window, size):
    window.resize(*size)
    window.chart.repaint()
    assert (window.width(), window.height()) == size
    for side in (window.left, window.right):
        inside = side.widget()
        assert inside.minimumSizeHint().width() <= side.viewport().width()
    assert window.top.minimumSizeHint().width() <= size[0]


def test_the_toggles_of_the_menu(window):
    session = window.desk.session
    layers = [f"toggle_{layer}" for layer in ("belt", "edges", "milky_way", "deep_sky", "grid")]
    for name in (*layers, "mirror", "turn_up", "whole_sky"):
        window.actions_by_name[name].trigger()
        assert window.desk.session != session, name
        window.undo()
        assert window.desk.session == session, name
    for name in ("toggle_left", "toggle_right"):
        window.actions_by_name[name].trigger()
        assert not window.actions_by_name[name].isChecked()
        window.actions_by_name[name].trigger()
        assert window.actions_by_name[name].isChecked()


def test_help_lists_every_key(qtbot, window):
    from PySide6.QtWidgets import QDialog, QTextBrowser

    window.show_help()
    [dialog] = window.findChildren(QDialog)
    text = dialog.findChild(QTextBrowser).toPlainText()
    assert "Ctrl+E" in text
    assert "wheel" in text
    dialog.close()


def test_a_closed_window_is_gone(qtbot, settings):
    """Five windows, each with all panels: none is held by a signal, a timer or a cache."""
    refs = []
    for _ in range(5):
        made = app.window(settings=settings)
        made.resize(1024, 700)
        made.show()
        qtbot.waitUntil(lambda made=made: made.top is not None)
        refs.append((weakref.ref(made), weakref.ref(made.chart), weakref.ref(made.desk)))
        made.close()
        made.deleteLater()
        del made
    qtbot.wait(10)
    gc.collect()
    assert [ref() for triple in refs for ref in triple if ref() is not None] == []


def test_a_chart_of_very_many_stars_is_finished_beside_the_window(qtbot, window):
    session = window.desk.session
    deep = replace(session, view=replace(session.view, limit_mag=11.0, width_deg=40.0))
    window.desk.put(deep, "test")
    first = window.chart.scene.layer("stars").shown
    assert not window.chart.whole
    window.export_path(window._folder() / "never.png")
    assert "not whole" in window._hover.text()
    with qtbot.waitSignal(window.chart.completed, timeout=20000):
        pass
    assert window.chart.whole
    assert window.chart.scene.layer("stars").shown > first
    # Given up, the chart stays with fewer stars; a new session begins anew.
    window.desk.put(replace(deep, view=replace(deep.view, limit_mag=11.2)), "test")
    assert window.chart.scene.layer("stars").shown
    window.chart._finish()
    assert window.jobs.busy
    window.jobs.cancel()
    assert not window.jobs.busy
    window.desk.put(session, "test")
    assert window.chart.scene
    assert window.chart.whole


def test_running_time_stops_where_the_ephemeris_ends(qtbot, window):
    """A chart that follows a body cannot go on past the tables: it stands at the last moment that could be drawn."""
    session = window.desk.session
    # The tables of the shipped ephemeris reach JD 2816816.5, in the year 3000.
    near = Moment.parse("JD 2816787.5 TT")
    view = replace(session.view, centre=replace(session.view.centre, body="mars"))
    window.desk.put(replace(session, moment=near, view=view), "test")
    window.chart.repaint()
    window.top.moment.speed.setCurrentIndex(window.top.moment.speed.count() - 2)
    with qtbot.waitSignal(window.desk.faulted, timeout=10000):
        window.run_on()
    assert window.top.moment.running == 0
    assert near.jd_tt <= window.desk.session.moment.jd_tt < 2816816.6
    window.chart.repaint()
    assert window.chart.scene.layer("bodies").shown > 0


def test_a_first_session_that_cannot_be_drawn_is_said_on_the_page(qtbot, settings):
    session = Session.demo()
    view = replace(session.view, centre=replace(session.view.centre, body="earth"))
    made = app.window(replace(session, view=view), settings=settings)
    qtbot.addWidget(made)
    made.resize(1024, 700)
    made.show()
    qtbot.waitUntil(lambda: "cannot" in made.chart._reason or "direction" in made.chart._reason)
    # It does not ask again and again.
    with qtbot.assertNotEmitted(made.desk.faulted, wait=100):
        made.chart.repaint()
    qtbot.waitUntil(lambda: made.top is not None)
    type_into(qtbot, made.top.view.centre, "mars")
    made.chart.repaint()
    assert made.chart.scene.layer("bodies").shown > 0


def test_printing_fills_the_page(qapp, window, tmp_path):
    from PySide6.QtPrintSupport import QPrinter

    from colure_viewer import export
    from colure_viewer.themes import PRINT

    printer = QPrinter(QPrinter.PrinterMode.HighResolution)
    printer.setOutputFormat(QPrinter.OutputFormat.PdfFormat)
    printer.setOutputFileName(str(tmp_path / "page.pdf"))
    export.print_chart(window.chart.scene, PRINT, printer)
    data = (tmp_path / "page.pdf").read_bytes()
    assert data.startswith(b"%PDF")
    assert b"/Subtype /Image" not in data
    assert PRINT.colour("sky") == "#FFFFFF"
