"""The audit's dialog: what is typed is asked, what the core answers is shown, and nothing is claimed beyond it."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QSettings, Qt
from PySide6.QtGui import QGuiApplication

from colure import audit, bodies, frames, pointing, tables
from colure.arrays import DEG, spherical
from colure.audit import Numbers
from colure.moment import Moment
from colure.overlays import opening
from colure.overlays.store import STORE
from colure.stars import catalogue
from colure.tables import Column, Table
from colure_viewer import app
from colure_viewer.panels import auditing
from colure_viewer.panels.audit import HINT
from colure_viewer.themes import THEMES


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
def dialog(window):
    window.actions_by_name["open_audit"].trigger()
    assert window.audit.isVisible()
    return window.audit


def type_into(qtbot, field, text):
    field.setFocus()
    field.selectAll()
    field.insert(text)
    qtbot.keyClick(field, Qt.Key.Key_Return)


def ask(qtbot, dialog, positions, against=""):
    dialog.positions.setPlainText(positions)
    type_into(qtbot, dialog.against, against)
    dialog.audit_button.click()
    qtbot.waitUntil(lambda: not dialog.jobs.busy, timeout=20000)


def mars(moment, frame, place):
    facts = bodies.facts(["mars"], moment, frame=frame, place=place)
    return float(np.ravel(facts["lon_deg"])[0]), float(np.ravel(facts["lat_deg"])[0])


def test_it_says_what_to_type_before_anything_was_asked(dialog):
    assert dialog.verdict.text() == HINT
    assert not dialog.table.isVisible()
    assert not dialog.command.isVisible()


def test_a_place_of_date_read_as_j2000_is_found_and_can_be_mended(qtbot, window, dialog):
    session = window.desk.session
    dialog.site.setChecked(False)
    lon, lat = mars(session.moment, "equator/true/date", "apparent")
    type_into(qtbot, dialog.claim, "icrs")
    ask(qtbot, dialog, f"{lon:.5f} {lat:+.5f}", "mars")
    numbers = audit.read(f"{lon:.5f} {lat:+.5f}")
    wanted = audit.audit(numbers, "mars", session.moment, claim="icrs")
    found = dialog.answer
    assert (found.status, found.verdict) == (wanted.status, wanted.verdict)
    assert dialog.verdict.text() == wanted.verdict
    assert "true" in wanted.verdict
    assert "equator/true/date" in dialog.command.text()
    assert dialog.command.text().startswith("colure convert ")
    dialog.copy_command.click()
    assert QGuiApplication.clipboard().text() == "\n".join(wanted.mending.commands)
    inside = [row for row in range(dialog.table.rowCount()) if dialog.table.item(row, 0).text() == "·"]
    assert len(inside) == len(wanted.members)
    dialog.copy_answer.click()
    assert wanted.verdict in QGuiApplication.clipboard().text()


def test_a_class_names_what_would_decide(qtbot, window, dialog):
    lon, lat = mars(window.desk.session.moment, "icrs", "astrometric")
    dialog.site.setChecked(False)
    ask(qtbot, dialog, f"{lon:.1f} {lat:+.1f}", "mars")
    assert dialog.answer.status == "class"
    assert dialog.title.text() == "Cannot be told apart"
    assert "what would decide" in dialog.details.text()


def test_none_of_these_is_said_plainly(qtbot, dialog):
    ask(qtbot, dialog, "123.45678 -76.54321", "mars")
    assert dialog.answer.status in ("none", "fitted")
    ask(qtbot, dialog, "0.0001 -89.9000")
    assert dialog.title.text() == "None of these"
    assert "no star" in dialog.verdict.text()
    assert not dialog.command.isVisible()


def test_the_catalogue_is_searched_where_nothing_is_named(qtbot, window, dialog):
    row = catalogue().brighter(1.0).take(np.array([0]))
    lon, lat = (float(v[0]) / DEG for v in spherical(row.directions(2000.0)))
    dialog.site.setChecked(False)
    type_into(qtbot, dialog.moment, "J2000.0")
    ask(qtbot, dialog, f"{lon:.5f} {lat:+.5f}")
    wanted = audit.audit_unknown(audit.read(f"{lon:.5f} {lat:+.5f}"), Moment.parse("J2000.0"))
    assert dialog.verdict.text() == f"{wanted[0].name}: {wanted[0].audit.verdict}"
    assert "accidental" in dialog.details.text()


@pytest.mark.parametrize(
    ("where", "text", "needle"),
    [
        (lambda d: d.against, "Betelgeuze", "Betelgeuse"),
        (lambda d: d.claim, "eclptic/mean/date", "ecliptic"),
        (lambda d: d.moment, "2026-13-01", "month"),
        (lambda d: d.rounding, "some", "arcseconds"),
        (lambda d: d.rounding, "-1", "more than zero"),
    ],
)
def test_a_bad_entry_is_marked_in_place_and_nothing_is_asked(qtbot, dialog, where, text, needle):
    dialog.positions.setPlainText("10.0 20.0")
    field = where(dialog)
    type_into(qtbot, field, text)
    assert needle.casefold() in field.fault.casefold()
    dialog.audit_button.click()
    assert not dialog.jobs.busy
    assert dialog.answer is None
    qtbot.keyClick(field, Qt.Key.Key_Escape)
    assert field.fault is None


@pytest.mark.parametrize(
    ("text", "needle"), [("", "no position"), ("10.0 20.0\nx y", "line 2"), ("12:30:00 5:0:0", "h")]
)
def test_a_bad_position_is_marked_in_place(dialog, text, needle):
    dialog.positions.setPlainText(text)
    dialog.audit_button.click()
    assert needle in dialog.positions.fault
    assert dialog.positions.property("fault") is True
    assert dialog.positions._note.isVisible()
    dialog.positions.setPlainText("10 20")
    assert dialog.positions.fault is None
    assert not dialog.positions._note.isVisible()


def test_a_few_positions_without_a_reference_are_refused_with_the_reason(qtbot, dialog):
    ask(qtbot, dialog, "10.0 20.0\n11.0 21.0")
    assert dialog.answer is None
    assert "expected one, or 5" in dialog.verdict.text()


def test_an_overlay_is_dated(qtbot, window, dialog, tmp_path):
    rows = catalogue().brighter(6.5)
    rows = rows.take(np.arange(0, len(rows), len(rows) // 300)[:300])
    there = frames.from_icrs(rows.directions(1900.0), "equator/mean/J1900")
    lon, lat = spherical(there)
    path = tmp_path / "old.ecsv"
    table = Table((Column("ra", np.round(lon / DEG, 4), "deg"), Column("dec", np.round(lat / DEG, 4), "deg")))
    tables.write(table, path)
    overlay = opening.open_file(path, frame="icrs")
    window.desk.put(replace(window.desk.session, overlays=(overlay,)), "test")
    dialog.source.setCurrentIndex(dialog.source.findText("old.ecsv"))
    dialog.source.activated.emit(dialog.source.currentIndex())
    assert not dialog.positions.isEnabled()
    dialog.audit_button.click()
    qtbot.waitUntil(lambda: dialog.answer is not None, timeout=30000)
    year = float(dialog.answer.verdict.split(" of J")[1].split(" ")[0]) if " of J" in dialog.answer.verdict else np.nan
    assert year == pytest.approx(1900.0, abs=0.1) or "B1900" in dialog.answer.verdict
    assert "stars agree" in dialog.details.text()
    assert str(path) in dialog.command.text()
    window.desk.put(replace(window.desk.session, overlays=()), "test")
    assert dialog.source.count() == 1


def test_the_selection_is_taken_and_the_moment_follows_the_chart(window, dialog):
    window.desk.select(pointing.body(window.chart.sky, "uranus"))
    dialog.selection.click()
    assert dialog.against.value == "Uranus"
    window.desk.select(pointing.bare(np.array([0.0, 0.6, 0.8]), 30.0))
    dialog.selection.click()
    assert dialog.against.fault is None
    assert "90.000000" in dialog.against.value
    window.desk.put(replace(window.desk.session, moment=Moment.parse("2030-01-01 TT")), "test")
    assert "2030-01-01" in dialog.moment.placeholderText()


def test_positions_are_put_together_and_their_rounding_can_be_said():
    found = auditing.read("10.1 20.2\n\n30.25 -40.5\n", None, None)
    assert isinstance(found, Numbers)
    assert found.x.tolist() == [10.1, 30.25]
    assert found.half_x == pytest.approx([0.05, 0.005])
    assert auditing.read("10.1 20.2", None, 3.6).half_x == pytest.approx([0.001])


@pytest.mark.parametrize("theme", list(THEMES))
def test_everything_fits_has_a_name_and_can_be_reached(qtbot, window, dialog, theme):
    window.desk.set_theme(THEMES[theme])
    lon, lat = mars(window.desk.session.moment, "icrs", "astrometric")
    ask(qtbot, dialog, f"{lon:.1f} {lat:+.1f}", "mars")
    assert dialog.minimumSizeHint().width() <= 1000
    assert dialog.minimumSizeHint().height() <= 660
    for part in (dialog.source, dialog.references, dialog.against, dialog.selection, dialog.claims, dialog.place,
                 dialog.moment, dialog.rounding, dialog.site, dialog.audit_button, dialog.command, dialog.table,
                 dialog.positions, dialog.copy_command, dialog.copy_answer):  # fmt: skip
        assert part.focusPolicy() & Qt.FocusPolicy.TabFocus, part
        assert part.accessibleName() or part.text(), part
