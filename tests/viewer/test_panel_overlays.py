"""The panel of overlays: files reach the session, the session the list, and what is missing is asked for."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QSettings, Qt
from PySide6.QtWidgets import QDialogButtonBox

from colure import frames, session_file, tables
from colure.arrays import DEG, spherical
from colure.overlays import opening
from colure.overlays.store import STORE
from colure.stars import catalogue
from colure.tables import Column, Table
from colure_viewer import app
from colure_viewer.panels.asking import AskDialog
from colure_viewer.panels.overlays import EMPTY
from colure_viewer.themes import THEMES

OPEN = QDialogButtonBox.StandardButton.Open


@pytest.fixture
def window(qtbot, tmp_path):
    made = app.window(settings=QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat))
    qtbot.addWidget(made, before_close_func=lambda w: w.jobs.wait())
    made.desk._saved = made.desk.session
    made.resize(1200, 800)
    made.show()
    qtbot.waitUntil(lambda: made.top is not None)
    yield made
    STORE.clear()


@pytest.fixture
def panel(window):
    return window.left.overlays


@pytest.fixture
def stars(tmp_path):
    """Two hundred stars of the catalogue in FK4 B1950, in a table that says its units and no frame."""
    rows = catalogue().brighter(6.0)
    rows = rows.take(np.arange(0, len(rows), len(rows) // 200)[:200])
    there = frames.from_icrs(rows.directions(1950.0), "equator/fk4/B1950", None, None, 1950.0)
    lon, lat = spherical(there)
    path = tmp_path / "stars.ecsv"
    tables.write(Table((Column("ra", lon / DEG, "deg"), Column("dec", lat / DEG, "deg"))), path)
    return path


def type_into(qtbot, field, text):
    field.setFocus()
    field.selectAll()
    field.insert(text)
    qtbot.keyClick(field, Qt.Key.Key_Return)


def add(qtbot, panel, path, **said):
    panel.add(opening.open_file(path, **said))
    return panel.overlay


def test_an_empty_list_says_what_can_be_opened(panel):
    assert panel.empty.isVisibleTo(panel)
    assert panel.empty.text() == EMPTY
    assert not panel.parts.isVisibleTo(panel)
    assert not panel.remove_button.isEnabled()


def test_a_table_that_says_nothing_of_its_frame_is_asked_about(qtbot, window, panel, stars):
    panel.open_path(stars)
    qtbot.waitUntil(lambda: window.findChild(AskDialog) is not None)
    dialog = window.findChild(AskDialog)
    assert window.desk.session.overlays == ()
    # Nothing is chosen beforehand, and nothing can be opened until it is.
    assert dialog.pick("frame").currentText() == ""
    assert not dialog.buttons.button(OPEN).isEnabled()
    type_into(qtbot, dialog.frame, "equator/fk5/B1950")
    assert dialog.frame.fault is not None
    assert not dialog.buttons.button(OPEN).isEnabled()
    type_into(qtbot, dialog.frame, "equator/fk4/B1950")
    assert dialog.frame.fault is None
    type_into(qtbot, dialog.epoch, "long ago")
    assert "Julian year" in dialog.epoch.fault
    type_into(qtbot, dialog.epoch, "1950")
    dialog.buttons.button(OPEN).click()
    qtbot.waitUntil(lambda: len(window.desk.session.overlays) == 1)
    (overlay,) = window.desk.session.overlays
    assert (overlay.frame, overlay.epoch) == ("equator/fk4/B1950", 1950.0)
    assert panel.table.item(0, 0).text() == "stars.ecsv"
    assert panel.table.item(0, 1).text() == "200 rows"
    assert "declared by the user" in panel.rule.text()


def test_columns_and_units_that_are_unknown_are_asked_for(qtbot, window, panel, tmp_path):
    path = tmp_path / "odd.csv"
    path.write_text("this,that\n10.5,20.5\n11.5,-3.25\n")
    panel.open_path(path)
    qtbot.waitUntil(lambda: window.findChild(AskDialog) is not None)
    dialog = window.findChild(AskDialog)

    def choose(key, value):
        pick = dialog.pick(key)
        pick.setCurrentIndex(pick.findData(value))
        pick.activated.emit(pick.currentIndex())

    choose("lon", "this")
    choose("lat", "that")
    dialog.buttons.button(OPEN).click()
    qtbot.waitUntil(lambda: dialog.refusal.isVisible())
    assert "unit" in dialog.refusal.text()
    choose("lon_unit", "deg")
    choose("lat_unit", "deg")
    type_into(qtbot, dialog.frame, "galactic")
    assert not dialog.refusal.isVisible()
    dialog.buttons.button(OPEN).click()
    qtbot.waitUntil(lambda: len(window.desk.session.overlays) == 1)
    overlay = panel.overlay
    assert (overlay.lon, overlay.lat, overlay.lon_unit, overlay.frame) == ("this", "that", "deg", "galactic")


def test_a_file_that_is_no_table_is_reported_and_the_session_kept(qtbot, window, panel, tmp_path):
    before = window.desk.session
    path = tmp_path / "noise.vot"
    path.write_bytes(b"<VOTABLE><!DOCTYPE x>")
    with qtbot.waitSignal(window.desk.faulted):
        panel.open_path(path)
    with qtbot.waitSignal(window.desk.faulted):
        panel.open_path(tmp_path / "absent.csv")
    assert window.desk.session == before


def test_reading_can_be_given_up_and_is_not_pushed_aside_by_other_work(qtbot, window, panel, stars):
    before = window.desk.session
    panel.open_path(stars)
    assert panel.jobs.busy
    window.jobs.run("other work", lambda: 1, lambda _: None, lambda _: None)
    assert panel.jobs.busy
    panel.jobs.cancel()
    panel.jobs.wait()
    qtbot.wait(50)
    assert window.findChild(AskDialog) is None
    assert window.desk.session == before


def test_a_declared_frame_can_be_changed_and_moves_it(qtbot, window, panel, stars):
    add(qtbot, panel, stars, frame="icrs")
    before = window.chart.sky["overlays"][0].columns.copy()
    type_into(qtbot, panel.frame, "equator/fk4/B1950")
    assert window.desk.session.overlays[0].frame == "equator/fk4/B1950"
    after = window.chart.sky["overlays"][0].columns
    # Precession from B1950 to J2000 is 50.3″ a year for 50 years.
    apart = np.degrees(np.arccos(np.clip((before * after).sum(axis=0), -1.0, 1.0)))
    assert 0.2 < np.median(apart) < 0.8
    type_into(qtbot, panel.frame, "equator/fk44")
    assert panel.frame.fault is not None
    assert window.desk.session.overlays[0].frame == "equator/fk4/B1950"
    qtbot.keyClick(panel.frame, Qt.Key.Key_Escape)
    type_into(qtbot, panel.epoch, "x")
    assert "Julian year" in panel.epoch.fault


def test_the_session_reaches_the_list(window, panel, stars):
    overlay = opening.open_file(stars, frame="icrs", label="my stars", colour="#123456")
    window.desk.put(replace(window.desk.session, overlays=(overlay,)), "test")
    assert panel.table.item(0, 0).text() == "my stars"
    assert panel.frame.text() == "icrs"
    panel.table.item(0, 0).setCheckState(Qt.CheckState.Unchecked)
    assert not window.desk.session.overlays[0].visible
    panel.remove()
    assert window.desk.session.overlays == ()
    assert window.desk.history.undo_name == "remove my stars"
    window.undo()
    assert panel.table.rowCount() == 1


def test_a_match_says_as_if_and_shows_residuals(qtbot, window, panel, stars):
    add(qtbot, panel, stars, frame="icrs", epoch=1950.0)
    assert "Not matched" in panel.result.text()
    assert not panel.arrows.isEnabled()
    panel.match_button.click()
    qtbot.waitUntil(lambda: "as if" in panel.result.text(), timeout=20000)
    text = panel.result.text()
    assert "B1950 (FK4)" in text
    assert "shift east" in text
    assert "turn" in text
    assert "rms" in text
    assert window.desk.session.overlays[0].arrows
    assert window.chart.sky["overlays"][0].foot.shape[1] > 150
    # In another frame it is another match.
    type_into(qtbot, panel.frame, "equator/fk4/B1950")
    assert "match it again" in panel.result.text()
    panel.match_button.click()
    qtbot.waitUntil(lambda: "declared" in panel.result.text(), timeout=20000)


def test_a_missing_file_is_a_shown_state_and_can_come_back(qtbot, window, panel, stars, tmp_path):
    overlay = opening.open_file(stars, frame="icrs")
    STORE.clear()
    data = stars.read_bytes()
    stars.unlink()
    window.desk.put(replace(window.desk.session, overlays=(overlay,)), "test")
    assert window.chart.sky["overlays"][0].fault
    assert panel.table.item(0, 1).text() == "missing"
    assert "stars.ecsv" in panel.state.text()
    assert panel.state.objectName() == "notice"
    stars.write_bytes(data)
    panel.again_button.click()
    assert panel.table.item(0, 1).text() == "200 rows"
    assert not panel.again_button.isVisibleTo(panel)


def test_a_session_with_overlays_opens_after_its_files_were_read(qtbot, window, panel, stars, tmp_path):
    overlay = opening.open_file(stars, frame="icrs")
    path = tmp_path / "saved.toml"
    session_file.write(replace(window.desk.session, overlays=(overlay,)), path)
    STORE.clear()
    assert window.open_path(path)
    assert panel.jobs.busy
    assert window.desk.path is None
    qtbot.waitUntil(lambda: window.desk.path == path)
    assert panel.table.item(0, 1).text() == "200 rows"
    # A file that has gone does not keep the session from opening.
    window.new_session()
    STORE.clear()
    stars.unlink()
    window.open_path(path)
    qtbot.waitUntil(lambda: window.desk.path == path)
    assert panel.table.item(0, 1).text() == "missing"


def test_rows_that_fail_are_listed_by_number(qtbot, panel, tmp_path):
    path = tmp_path / "some.csv"
    path.write_text("ra_deg,dec_deg\n10,20\n11,95\n12,-5\nnan,3\n")
    found = opening.inspect(path)
    said = {key: "deg" for key in ("lon_unit", "lat_unit") if key in {one.key for one in found.missing}}
    panel.add(opening.declare(found, frame="icrs", **said))
    assert "2 rows" in panel.state.text()
    assert "refused" in panel.state.text()


def test_every_control_can_be_reached_and_has_a_name(panel):
    named = (panel.table, panel.open_button, panel.remove_button, panel.colour_button, panel.frames, panel.frame)
    more = (panel.epoch, panel.again_button, panel.match_button, panel.names, panel.arrows, panel.enlarge)
    for part in (*named, *more):
        assert part.focusPolicy() & Qt.FocusPolicy.TabFocus, part
        assert part.accessibleName() or part.text(), part


@pytest.mark.parametrize("theme", list(THEMES))
def test_the_panel_fits_its_column(qtbot, window, panel, stars, theme):
    window.resize(1024, 700)
    window.desk.set_theme(THEMES[theme])
    add(qtbot, panel, stars, frame="icrs", epoch=1950.0)
    qtbot.wait(20)
    column = window.left.viewport().width()
    assert panel.mapTo(window.left.viewport(), panel.rect().topRight()).x() <= column
    assert panel.minimumSizeHint().width() <= column
