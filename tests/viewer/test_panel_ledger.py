"""The ledger's panel: it shows the selection's steps, its boxes reach the session, and its arrows the chart."""

import json
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QSettings, Qt
from PySide6.QtGui import QGuiApplication

from colure import ledger, pointing
from colure.moment import Moment
from colure_viewer import app
from colure_viewer.panels.ledger import EMPTY
from colure_viewer.themes import THEMES


@pytest.fixture
def window(qtbot, tmp_path):
    made = app.window(settings=QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat))
    qtbot.addWidget(made, before_close_func=lambda w: w.jobs.wait())
    made.desk._saved = made.desk.session
    made.resize(1200, 800)
    made.show()
    qtbot.waitUntil(lambda: made.top is not None)
    return made


@pytest.fixture
def panel(window):
    window.desk.select(pointing.body(window.chart.sky, "uranus"))
    return window.right.ledger


def type_into(qtbot, field, text):
    field.setFocus()
    field.selectAll()
    field.insert(text)
    qtbot.keyClick(field, Qt.Key.Key_Return)


def row_of(panel, step):
    return [line.step for line in panel.model.lines].index(step)


def test_the_panel_says_what_to_click_when_nothing_is_selected(window):
    window.desk.select(None)
    panel = window.right.ledger
    assert panel.detail.text() == EMPTY
    assert panel.found is None
    assert not panel.table.isVisible()
    assert panel._arrows.laid is None


def test_the_steps_are_those_of_the_core(window, panel):
    session = window.desk.session
    wanted = ledger.body("uranus", session.moment, observer=window.chart.sky.observer, frame="horizon")
    assert [line.step for line in panel.model.lines] == list(wanted.steps)
    assert panel.found.direction == pytest.approx(wanted.direction, abs=1e-15)
    assert "Uranus" in panel.title.text()
    assert "observed place, from Quern Hill" in panel.detail.text()
    cells = panel.model.lines[row_of(panel, "annual aberration")].cells
    assert f"{wanted['annual aberration'].size_arcsec:.5f}″" in cells[1]
    assert "±" in cells[0]


def test_a_star_and_a_bare_direction_have_ledgers(window, panel):
    sky = window.chart.sky
    row = int(sky["bright stars"].rows[0]) if "bright stars" in sky.layers else 100
    window.desk.select(pointing.star(sky, row))
    assert panel.found.kind == "star"
    assert panel.model.lines[0].step == "catalogue position"
    window.desk.select(pointing.bare(np.array([0.0, 0.6, 0.8]), 30.0))
    assert panel.found.kind == "direction"
    assert "Direction" in panel.title.text()


def test_the_ledger_follows_the_moment(window, panel):
    before = panel.found.lon_deg
    window.desk.put(replace(window.desk.session, moment=Moment.parse("2027-06-01 TT")), "test")
    assert panel.found.moment == Moment.parse("2027-06-01 TT")
    assert panel.found.lon_deg != before


def test_a_box_leaves_a_step_out_of_the_session_and_back(qtbot, window, panel):
    index = panel.model.index(row_of(panel, "annual aberration"), 0)
    panel.model.setData(index, Qt.CheckState.Unchecked.value, Qt.ItemDataRole.CheckStateRole)
    assert window.desk.session.omitted == ("annual aberration",)
    assert window.desk.history.undo_name == "leave out annual aberration"
    assert "left out" in panel.model.lines[index.row()].cells[1]
    assert panel.found["annual aberration"].omitted
    panel.table.selectRow(index.row())
    qtbot.keyClick(panel.table, Qt.Key.Key_Space)
    assert window.desk.session.omitted == ()


def test_a_step_left_out_in_the_session_is_unticked(window, panel):
    window.desk.put(replace(window.desk.session, omitted=("nutation", "refraction")), "test")
    index = panel.model.index(row_of(panel, "nutation"), 0)
    assert panel.model.data(index, Qt.ItemDataRole.CheckStateRole) == Qt.CheckState.Unchecked
    window.undo()
    assert panel.model.data(index, Qt.ItemDataRole.CheckStateRole) == Qt.CheckState.Checked


def test_steps_left_out_that_this_ledger_has_not_are_said_and_can_be_taken_in(qtbot, window, panel):
    assert not panel.left_out.isVisibleTo(panel)
    type_into(qtbot, panel.frame, "galactic")
    window.desk.put(replace(window.desk.session, omitted=("refraction",)), "test")
    assert "refraction" not in [line.step for line in panel.model.lines]
    assert "refraction" in panel.left_out.text()
    window.desk.select(None)
    assert panel.left_out.isVisibleTo(panel)
    panel.take_in.click()
    assert window.desk.session.omitted == ()
    assert not panel.left_out.isVisibleTo(panel)
    assert not panel.take_in.isVisibleTo(panel)


def test_arrows_go_with_a_body_while_time_runs(window, panel):
    window.desk.select(pointing.body(window.chart.sky, "moon"))
    session = window.desk.session
    view = replace(session.view, centre=replace(session.view.centre, body="uranus"), width_deg=360.0)
    window.desk.put(replace(session, view=replace(view, projection="hammer")), "test")
    window.desk.pass_by(replace(window.desk.session, moment=session.moment.shifted(0.5)), "run")
    laid = panel._arrows.laid
    there = window.chart.scene.projector.project(window.chart.sky["bodies"].vector("moon"))
    assert (laid.x, laid.y) == pytest.approx(tuple(map(float, there)), abs=1e-6)
    window.desk.settle()


def test_a_line_that_cannot_be_left_out_has_no_box(qtbot, window, panel):
    index = panel.model.index(0, 0)
    assert panel.model.data(index, Qt.ItemDataRole.CheckStateRole) is None
    assert not panel.model.flags(index) & Qt.ItemFlag.ItemIsUserCheckable
    panel.table.selectRow(0)
    qtbot.keyClick(panel.table, Qt.Key.Key_Space)
    assert window.desk.session.omitted == ()


def test_the_frame_can_be_typed_and_a_bad_one_is_marked(qtbot, panel):
    type_into(qtbot, panel.frame, "galactic")
    assert panel.frame.fault is None
    assert panel.found.frame == "galactic"
    type_into(qtbot, panel.frame, "galctic")
    assert "galactic" in panel.frame.fault
    assert panel.found.frame == "galactic"
    qtbot.keyClick(panel.frame, Qt.Key.Key_Escape)
    assert panel.frame.text() == "galactic"
    panel.frames.textActivated.emit("galactic")
    assert panel.frame.fault is None


def test_the_place_can_be_chosen_and_a_refusal_is_shown(window, panel):
    panel.place.setCurrentIndex(panel.place.findData("apparent"))
    panel.place.activated.emit(0)
    assert panel.found.place == "apparent"
    window.desk.put(replace(window.desk.session, from_site=False, place="astrometric"), "test")
    panel.place.setCurrentIndex(panel.place.findData("observed"))
    panel.place.activated.emit(0)
    assert panel.found is None
    assert "site" in panel.detail.text()
    assert panel.detail.objectName() == "notice"


@pytest.mark.parametrize("kind", ["text", "json", "csv"])
def test_the_ledger_is_copied_as_the_core_writes_it(qtbot, panel, kind):
    qtbot.mouseClick(panel.copies[kind], Qt.MouseButton.LeftButton)
    write = {"text": ledger.as_text, "json": ledger.as_json, "csv": ledger.as_csv}[kind]
    assert QGuiApplication.clipboard().text() == write(panel.found)


def test_matrices_are_copied_on_request(panel):
    panel.matrices.setChecked(True)
    panel.copy("json")
    records = json.loads(QGuiApplication.clipboard().text())
    bias = next(record for record in records if record["step"] == "frame bias")
    assert np.asarray(bias["matrix"]) == pytest.approx(panel.found["frame bias"].matrix)


def test_arrows_are_drawn_and_say_their_factor(qtbot, window, panel):
    laid = panel._arrows.laid
    assert laid is not None
    assert laid.text.removeprefix("steps ") in panel.scale.text()
    with_arrows = window.chart.grab().toImage()
    panel.arrows.click()
    assert panel._arrows.laid is None
    assert window.chart.grab().toImage() != with_arrows
    panel.arrows.click()
    panel.factor.setCurrentIndex(panel.factor.findData(1e3))
    panel.factor.activated.emit(0)
    assert panel._arrows.laid.factor == 1e3
    assert "1000" in panel.scale.text()


def test_a_chosen_step_sets_the_factor(panel):
    panel.table.selectRow(row_of(panel, "frame bias"))
    drawn = [arrow.step for arrow in panel._arrows.laid.drawn]
    assert "frame bias" in drawn
    assert "annual aberration" not in drawn
    assert "too long: 2" in panel.scale.text()


def test_the_pointer_is_followed_and_let_go(qtbot, window, panel):
    panel.follow.click()
    at = QPoint(300, 300)
    qtbot.mouseMove(window.chart, at)
    qtbot.waitUntil(lambda: "pointer" in panel.title.text())
    wanted = window.chart.scene.unproject(300.0, 300.0)
    assert panel.subject.vector == pytest.approx(wanted)
    assert (panel._arrows.laid.x, panel._arrows.laid.y) == pytest.approx((300.0, 300.0), abs=0.1)
    qtbot.mouseMove(window.chart, at + QPoint(40, 10))
    qtbot.waitUntil(lambda: panel._arrows.laid.x == pytest.approx(340.0, abs=0.1))
    panel.follow.click()
    assert "Uranus" in panel.title.text()


def test_arrows_cover_the_chart_at_every_size_and_let_the_pointer_through(qtbot, window, panel):
    window.resize(1300, 900)
    qtbot.waitUntil(lambda: panel._arrows.geometry() == window.chart.rect())
    assert panel._arrows.testAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)


def test_every_control_can_be_reached_and_has_a_name(window, panel):
    for part in (panel.frames, panel.frame, panel.place, panel.table, panel.follow, panel.arrows, panel.factor,
                 panel.matrices, *panel.copies.values()):  # fmt: skip
        assert part.focusPolicy() & Qt.FocusPolicy.TabFocus, part
        assert part.accessibleName() or part.text(), part


@pytest.mark.parametrize("theme", list(THEMES))
@pytest.mark.parametrize("size", [(1024, 700), (1920, 1080)])
def test_nothing_is_cut(qtbot, window, panel, theme, size):
    window.resize(*size)
    window.desk.set_theme(THEMES[theme])
    qtbot.wait(20)
    assert panel.table.width() <= panel.width()
    metrics = panel.table.fontMetrics()
    for line in panel.model.lines:
        for column in (1, 2):
            widest = max(metrics.horizontalAdvance(text) for text in line.cells[column].split("\n"))
            assert widest <= panel.table.columnWidth(column) - 8, (line.cells[column], column)
        step = line.cells[0].split("\n")[0]
        assert metrics.horizontalAdvance(step) <= panel.table.columnWidth(0) - 25, step
