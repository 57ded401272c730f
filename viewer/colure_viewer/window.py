"""The window: chart in the middle, panels at its sides, and the commands of the menus."""

from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QSettings, QSize, QTimer
from PySide6.QtGui import QAction, QCloseEvent
from PySide6.QtWidgets import QApplication, QHBoxLayout, QLabel, QMainWindow, QMenu, QVBoxLayout, QWidget

from colure.errors import ColureError
from colure.session import Session
from colure_viewer import style
from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk
from colure_viewer.jobs import Jobs
from colure_viewer.themes import THEMES

if TYPE_CHECKING:
    from colure.targets import Target
    from colure_viewer.hand import Hand
    from colure_viewer.panels.sides import LeftSide, RightSide, TopBar

LEFT, RIGHT, TOP, FOOT = 270, 318, 68, 26
"""Room kept for the panels before they are there, in logical pixels."""
RECENT = 8
NOTICE_MS = 8000


class Window(QMainWindow):
    """Colure's window over one desk; panels are made after the first chart is on the screen."""

    def __init__(self, desk: Desk, settings: QSettings | None = None) -> None:
        super().__init__()
        self.desk = desk
        self.settings = settings if settings is not None else QSettings("colure", "colure")
        self.jobs = Jobs(self)
        self.hand: Hand | None = None
        self.top: TopBar | None = None
        self.left: LeftSide | None = None
        self.right: RightSide | None = None
        self.chart = ChartWidget(desk)
        self._hover = QLabel()
        self.setWindowTitle("Colure")
        # Empty rooms of the panels' sizes: the chart does not move when the panels come.
        self._top_room, self._left_room, self._right_room, self._foot_room = (QWidget() for _ in range(4))
        self._foot_room.setFixedHeight(FOOT)
        self._top_room.setFixedHeight(TOP)
        self._left_room.setFixedWidth(LEFT)
        self._right_room.setFixedWidth(RIGHT)
        middle = QHBoxLayout()
        middle.setContentsMargins(0, 0, 0, 0)
        middle.setSpacing(0)
        middle.addWidget(self._left_room)
        middle.addWidget(self.chart, 1)
        middle.addWidget(self._right_room)
        whole = QWidget()
        column = QVBoxLayout(whole)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self._top_room)
        column.addLayout(middle, 1)
        column.addWidget(self._foot_room)
        self.setCentralWidget(whole)
        self.setMinimumSize(QSize(1000, 660))
        self.actions_by_name: dict[str, QAction | QMenu] = {}
        desk.checker = self.chart.check
        desk.changed.connect(self._changed)
        desk.filed.connect(self._retitle)
        desk.themed.connect(self._themed)
        desk.faulted.connect(self.say)
        desk.noted.connect(self.note)
        self.chart.painted.connect(self.finish)
        self._notice = QTimer(self)
        self._notice.setSingleShot(True)
        self._notice.timeout.connect(lambda: self._show_hover("", False))
        self._retitle()

    # Building what can wait

    def finish(self) -> None:
        """Make the menus and panels; called once the first chart is on the screen."""
        if self.top is not None:
            return
        from colure_viewer import actions
        from colure_viewer.hand import Hand
        from colure_viewer.panels.sides import LeftSide, Progress, RightSide, TopBar

        self._dress()
        self.actions_by_name = actions.build(self)
        self._theme_menu()
        self._recent_menu()
        self.top = TopBar(self.desk, self.show_target)
        self.left = LeftSide(self.desk)
        self.right = RightSide(self.desk)
        for room, side in ((self._top_room, self.top), (self._left_room, self.left), (self._right_room, self.right)):
            layout = QVBoxLayout(room)
            layout.setContentsMargins(0, 0, 0, 0)
            layout.addWidget(side)
        self._top_room.setFixedHeight(self.top.sizeHint().height())
        self.hand = Hand(self.desk, self.chart)
        self.hand.hovered.connect(self._hovered)
        self.hand.measured.connect(self.right.measure.show_text)
        self.chart.use_jobs(self.jobs)
        self.chart.setFocus()
        self.progress = Progress(self.jobs)
        self._hover.setAccessibleName("Under the pointer")
        foot = QHBoxLayout(self._foot_room)
        foot.setContentsMargins(10, 0, 10, 0)
        foot.addWidget(self._hover, 1)
        foot.addWidget(self.progress)
        for name in ("toggle_left", "toggle_right"):
            self._check(name, True)
        self._changed(False)
        self._select_nearest_body()

    def _select_nearest_body(self) -> None:
        """Begin with the body nearest to the middle of the chart, so that the panels have something to show."""
        from colure import pointing

        if self.desk.selection is None and self.chart.current is not None:
            self.desk.select(pointing.nearest_body(self.chart.sky, self.chart.scene))

    def _check(self, name: str, on: bool) -> None:
        action = self.actions_by_name.get(name)
        if isinstance(action, QAction):
            action.setChecked(on)

    def _changed(self, transient: bool) -> None:
        if transient or not self.actions_by_name:
            return
        history, session = self.desk.history, self.desk.session
        for name, verb, what in (("undo", "&Undo", history.undo_name), ("redo", "&Redo", history.redo_name)):
            action = self.actions_by_name[name]
            assert isinstance(action, QAction)
            action.setEnabled(what is not None)
            action.setText(f"{verb} {what}".rstrip() if what else verb)
        layers = session.layers
        self._check("mirror", session.view.east_left)
        self._check("toggle_belt", session.belt.visible)
        self._check("toggle_edges", layers.edges)
        self._check("toggle_milky_way", layers.milky_way)
        self._check("toggle_deep_sky", layers.deep_sky)
        self._check("toggle_grid", layers.grid is not None)
        self._retitle()

    def _retitle(self) -> None:
        name = self.desk.path.name if self.desk.path else "Demo session"
        self.setWindowTitle(f"{name}[*] · Colure")
        self.setWindowModified(self.desk.modified)

    # Telling

    def say(self, text: str) -> None:
        """Show one line about what was refused."""
        self._show_hover(text, True)
        self._notice.start(NOTICE_MS)

    def note(self, text: str) -> None:
        """Show one line about what was done."""
        self._show_hover(text, False)
        self._notice.start(NOTICE_MS)

    def _show_hover(self, text: str, fault: bool) -> None:
        name = "notice" if fault else ""
        if self._hover.objectName() != name:
            self._hover.setObjectName(name)
            self._hover.style().unpolish(self._hover)
            self._hover.style().polish(self._hover)
        self._hover.setText(text)
        self._hover.setToolTip(text)

    def _hovered(self, text: str) -> None:
        if not self._notice.isActive():
            self._show_hover(text, False)

    # Session files

    def new_session(self) -> None:
        """Open the demo session."""
        if self._may_leave():
            self.desk.open(Session.demo(), None)

    def open_session(self) -> None:
        """Ask for a session file and open it."""
        from PySide6.QtWidgets import QFileDialog

        if not self._may_leave():
            return
        name, _ = QFileDialog.getOpenFileName(self, "Open session", str(self._folder()), "Sessions (*.toml)")
        if name:
            self.open_path(Path(name))

    def open_path(self, path: Path) -> bool:
        """Open a session file; a bad one is reported, and the session stays."""
        from colure import session_file

        try:
            session, report = session_file.read(path)
            self.chart.check(session)
        except ColureError as fault:
            self.say(str(fault))
            self._forget(path)
            return False
        self.desk.open(session, path)
        self._remember(path)
        if report:
            self.note(f"{path.name}: {'; '.join(report)}")
        return True

    def save_session(self) -> bool:
        """Save to the session's file, or ask for one."""
        return self.save_path(self.desk.path) if self.desk.path is not None else self.save_session_as()

    def save_session_as(self) -> bool:
        """Ask for a file and save to it."""
        from PySide6.QtWidgets import QFileDialog

        start = self.desk.path or self._folder() / "session.toml"
        name, _ = QFileDialog.getSaveFileName(self, "Save session", str(start), "Sessions (*.toml)")
        return bool(name) and self.save_path(Path(name))

    def save_path(self, path: Path) -> bool:
        """Save to a file; a refusal is reported."""
        from colure import session_file

        try:
            session_file.write(self.desk.session, path)
        except ColureError as fault:
            self.say(str(fault))
            return False
        self.desk.saved(path)
        self._remember(path)
        self.note(f"Saved {path}")
        return True

    def _folder(self) -> Path:
        return self.desk.path.parent if self.desk.path else Path(str(self.settings.value("folder", str(Path.home()))))

    def recent_paths(self) -> list[Path]:
        """Return the files opened or saved last, the newest first."""
        stored = self.settings.value("recent", [])
        names = [stored] if isinstance(stored, str) else list(stored or [])  # type: ignore[call-overload]
        return [Path(str(name)) for name in names]

    def _remember(self, path: Path) -> None:
        path = path.absolute()
        paths = [path, *(p for p in self.recent_paths() if p != path)][:RECENT]
        self.settings.setValue("recent", [str(p) for p in paths])
        self.settings.setValue("folder", str(path.parent))
        self._recent_menu()

    def _forget(self, path: Path) -> None:
        paths = [p for p in self.recent_paths() if p != path.absolute()]
        self.settings.setValue("recent", [str(p) for p in paths])
        self._recent_menu()

    def _recent_menu(self) -> None:
        menu = self.actions_by_name.get("recent")
        if not isinstance(menu, QMenu):
            return
        menu.clear()
        paths = self.recent_paths()
        for path in paths:
            action = menu.addAction(str(path))
            action.triggered.connect(partial(self._open_recent, path))
        if not paths:
            menu.addAction("No session was opened yet").setEnabled(False)

    def _open_recent(self, path: Path, _checked: bool = False) -> None:
        if self._may_leave():
            self.open_path(path)

    def _may_leave(self) -> bool:
        """Ask about unsaved changes of a session that has a file; the demo may be left without a word."""
        if not self.desk.modified or self.desk.path is None:
            return True
        from PySide6.QtWidgets import QMessageBox

        buttons = QMessageBox.StandardButton
        answer = QMessageBox.question(
            self,
            "Unsaved changes",
            f"{self.desk.path.name} has changes that are not saved.",
            buttons.Save | buttons.Discard | buttons.Cancel,
        )
        return self.save_session() if answer == buttons.Save else answer == buttons.Discard

    # The chart on paper and in files

    def export_chart(self) -> None:
        """Ask for a file and write the chart to it, beside the window's own work."""
        from PySide6.QtWidgets import QFileDialog

        start = self._folder() / "chart.png"
        name, _ = QFileDialog.getSaveFileName(
            self, "Export chart", str(start), "Pictures (*.png);;Drawings (*.svg);;Documents (*.pdf)"
        )
        if name:
            self.export_path(Path(name))

    def export_path(self, path: Path) -> None:
        """Write the chart to a file; the caution near the Sun is repeated in the file and here."""
        from colure_viewer import export

        if not self._has_chart():
            return
        scene, theme = self.chart.scene, self.desk.theme
        try:
            export.kind(path)
            work = export.prepared(scene, theme, path)
        except ColureError as fault:
            self.say(str(fault))
            return
        caution = export.remarks(scene)
        done = f"Exported {path}" + (f". {caution}" if caution else "")
        self.jobs.run(f"Exporting {path.name}", work, lambda _: self.note(done), self.say)

    def _has_chart(self) -> bool:
        """Return whether there is a whole chart to write, and say so where there is not."""
        if self.chart.current is None:
            self.say("There is no chart: this view cannot be drawn")
        elif not self.chart.whole:
            self.say("The chart is not whole yet: its faint stars are still being read")
        else:
            return True
        return False

    def print_chart(self) -> None:
        """Ask for a printer and print the chart on white."""
        from PySide6.QtPrintSupport import QPrintDialog, QPrinter

        from colure_viewer import export
        from colure_viewer.themes import PRINT

        if not self._has_chart():
            return
        printer = QPrinter(QPrinter.PrinterMode.HighResolution)
        dialog = QPrintDialog(printer, self)
        if dialog.exec() != QPrintDialog.DialogCode.Accepted:
            return
        try:
            export.print_chart(self.chart.scene, PRINT, printer)
        except ColureError as fault:
            self.say(str(fault))

    def copy_chart(self) -> None:
        """Put the chart on the clipboard."""
        from colure_viewer import export

        if not self._has_chart():
            return
        export.copy(self.chart.scene, self.desk.theme)
        self.note("Copied the chart as a picture")

    def copy_direction(self) -> None:
        """Put the table of the selected direction on the clipboard."""
        if self.right is not None:
            self.right.direction.copy()

    # Acting on the session

    def _do(self, make: object, what: str) -> None:
        reason = self.desk.edit(make, what)  # type: ignore[arg-type]
        if reason is not None:
            self.say(reason)

    def undo(self) -> None:
        """Take the last action back."""
        self._stop()
        self.desk.undo()

    def redo(self) -> None:
        """Do the undone action again."""
        self._stop()
        self.desk.redo()

    def _stop(self) -> None:
        if self.top is not None:
            self.top.moment.stop()

    def zoom_in(self) -> None:
        """Magnify about the middle."""
        if self.hand is not None:
            self.hand.zoom(1.5)

    def zoom_out(self) -> None:
        """Show more of the sky."""
        if self.hand is not None:
            self.hand.zoom(1.0 / 1.5)

    def whole_sky(self) -> None:
        """Show as much of the sky as the projection can, or of all of it where none of a hemisphere fits."""
        from colure.session import WIDEST

        self._do(lambda s: replace(s, view=replace(s.view, width_deg=WIDEST[s.view.projection])), "show the whole sky")

    def centre_selection(self) -> None:
        """Centre the chart on the selection."""
        if self.desk.selection is not None and self.hand is not None:
            self.hand.centre_on(self.desk.selection)
        else:
            self.say("Nothing is selected: click an object, or find one by name")

    def mirror(self) -> None:
        """Turn a sky chart into a map and back."""
        self._do(lambda s: replace(s, view=replace(s.view, east_left=not s.view.east_left)), "mirror the chart")

    def turn_up(self) -> None:
        """Let the next frame's north be up."""
        from colure_viewer.panels.viewbar import UPS

        names = [name for _, name in UPS]
        now = self.desk.session.view.up
        following = names[(names.index(now) + 1) % len(names)] if now in names else names[0]
        self._do(lambda s: replace(s, view=replace(s.view, up=following)), "turn the chart")

    def _toggle(self, layer: str, what: str) -> None:
        def make(s: Session) -> Session:
            changes: dict[str, Any] = {layer: not getattr(s.layers, layer)}
            return replace(s, layers=replace(s.layers, **changes))

        self._do(make, f"show or hide {what}")

    def toggle_belt(self) -> None:
        """Show or hide the belt."""
        self._do(lambda s: replace(s, belt=replace(s.belt, visible=not s.belt.visible)), "show or hide the belt")

    def toggle_edges(self) -> None:
        """Show or hide the constellations' edges."""
        self._toggle("edges", "edges")

    def toggle_milky_way(self) -> None:
        """Show or hide the Milky Way."""
        self._toggle("milky_way", "the Milky Way")

    def toggle_deep_sky(self) -> None:
        """Show or hide the deep-sky objects."""
        self._toggle("deep_sky", "deep sky")

    def toggle_grid(self) -> None:
        """Show the grid of the frame that is up, or hide the grid."""

        def make(s: Session) -> Session:
            up = "horizon" if s.view.up == "zenith" else s.view.up
            return replace(s, layers=replace(s.layers, grid=None if s.layers.grid else up))

        self._do(make, "show or hide the grid")

    def step_on(self) -> None:
        """Go one step on."""
        if self.top is not None:
            self.top.moment.go(1)

    def step_back(self) -> None:
        """Go one step back."""
        if self.top is not None:
            self.top.moment.go(-1)

    def run_on(self) -> None:
        """Let time run on, or stand."""
        if self.top is not None:
            self.top.moment.run(self.top.moment.running or 1)

    def run_back(self) -> None:
        """Let time run back, or stand."""
        if self.top is not None:
            self.top.moment.run(self.top.moment.running or -1)

    def now(self) -> None:
        """Go to the clock's moment."""
        from colure.moment import Moment

        self._stop()
        self._do(lambda s: replace(s, moment=Moment.now()), "go to now")

    def show_target(self, target: "Target") -> None:
        """Select what a search found and bring it to the middle."""
        from colure import pointing

        found = pointing.target(self.chart.sky, target) if self.chart.current is not None else None
        if found is None or self.hand is None:
            self.say(f"{target.name} cannot be shown at this moment")
            return
        self.desk.select(found)
        self.hand.centre_on(found)
        self.chart.use_jobs(self.jobs)
        self.chart.setFocus()

    # Focus, looks, help

    def _focus(self, field: QWidget) -> None:
        from PySide6.QtCore import Qt

        field.setFocus(Qt.FocusReason.ShortcutFocusReason)
        if hasattr(field, "selectAll"):
            field.selectAll()

    def find_name(self) -> None:
        """Type a name to find."""
        if self.top is not None:
            self._focus(self.top.search.field)

    def focus_moment(self) -> None:
        """Type a moment."""
        if self.top is not None:
            self._focus(self.top.moment.field)

    def focus_site(self) -> None:
        """Type a site."""
        if self.top is not None:
            self._focus(self.top.site.field)

    def focus_centre(self) -> None:
        """Type a centre."""
        if self.top is not None:
            self._focus(self.top.view.centre)

    def toggle_left(self) -> None:
        """Show or hide the left panels."""
        self._left_room.setVisible(not self._left_room.isVisible())
        self._check("toggle_left", self._left_room.isVisible())

    def toggle_right(self) -> None:
        """Show or hide the right panels."""
        self._right_room.setVisible(not self._right_room.isVisible())
        self._check("toggle_right", self._right_room.isVisible())

    def full_screen(self) -> None:
        """Fill the screen, or leave it."""
        full = self.isFullScreen()
        self.showNormal() if full else self.showFullScreen()
        self._check("full_screen", not full)

    def _theme_menu(self) -> None:
        from PySide6.QtGui import QActionGroup

        menu = self.actions_by_name["theme"]
        assert isinstance(menu, QMenu)
        group = QActionGroup(menu)
        for theme in THEMES.values():
            action = menu.addAction(theme.title)
            action.setCheckable(True)
            action.setChecked(theme is self.desk.theme)
            action.setData(theme.name)
            action.triggered.connect(partial(self._set_theme, theme.name))
            group.addAction(action)

    def _set_theme(self, name: str, _checked: bool = False) -> None:
        self.desk.set_theme(THEMES[name])

    def next_theme(self) -> None:
        """Put on the next theme."""
        names = list(THEMES)
        self._set_theme(names[(names.index(self.desk.theme.name) + 1) % len(names)])

    def _dress(self) -> None:
        application = QApplication.instance()
        if isinstance(application, QApplication):
            style.dress(application, self.desk.theme)

    def _themed(self) -> None:
        self._dress()
        self.settings.setValue("theme", self.desk.theme.name)
        menu = self.actions_by_name.get("theme")
        if isinstance(menu, QMenu):
            for action in menu.actions():
                action.setChecked(action.data() == self.desk.theme.name)

    def show_help(self) -> None:
        """Show keys and gestures."""
        from colure_viewer import actions
        from colure_viewer.panels.help import show_keys

        show_keys(self, actions.help_rows(self.actions_by_name))

    def show_cautions(self) -> None:
        """Show what must be minded when observing."""
        from colure_viewer.panels.help import show_cautions

        show_cautions(self)

    def show_about(self) -> None:
        """Show version and licences."""
        from colure_viewer.panels.help import show_about

        show_about(self)

    def closeEvent(self, event: QCloseEvent) -> None:
        """Ask about unsaved changes, then let go of all work."""
        if not self._may_leave():
            event.ignore()
            return
        self._stop()
        self.jobs.wait()
        self.settings.setValue("size", self.size())
        event.accept()
