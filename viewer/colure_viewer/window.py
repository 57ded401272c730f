"""The window: its panels and menus, which come after the first chart, and the commands on its own looks."""

from functools import partial
from typing import TYPE_CHECKING

from PySide6.QtCore import QSettings
from PySide6.QtGui import QAction, QCloseEvent
from PySide6.QtWidgets import QApplication, QHBoxLayout, QMenu, QVBoxLayout, QWidget

from colure_viewer import style
from colure_viewer.acting import Acting
from colure_viewer.desk import Desk
from colure_viewer.themes import THEMES

if TYPE_CHECKING:
    from colure_viewer.panels.audit import AuditDialog


class Window(Acting):
    """Colure's window over one desk; panels are made after the first chart is on the screen."""

    def __init__(self, desk: Desk, settings: QSettings | None = None) -> None:
        super().__init__(desk, settings)
        self.audit: AuditDialog | None = None
        desk.changed.connect(self._changed)
        desk.themed.connect(self._themed)
        self.chart.painted.connect(self.finish)

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
        self.right.ledger.attach(self.chart)
        self.left.overlays.attach(self.chart)
        self.chart.use_jobs(self.jobs)
        self.chart.setFocus()
        self.progress = Progress(self.jobs)
        self._hover.setAccessibleName("Under the pointer")
        foot = QHBoxLayout(self._foot_room)
        foot.setContentsMargins(10, 0, 10, 0)
        foot.addWidget(self._hover, 1)
        foot.addWidget(self.progress)
        foot.addWidget(Progress(self.left.overlays.jobs))
        for name in ("toggle_left", "toggle_right"):
            self._check(name, True)
        self._changed(False)
        self._select_nearest_body()

    def _select_nearest_body(self) -> None:
        """Begin with the body nearest to the middle of the chart, so that the panels have something to show."""
        from colure import pointing

        if self.desk.selection is None and self.chart.current is not None:
            self.desk.select(pointing.nearest_body(self.chart.sky, self.chart.scene))

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

    def open_overlay(self) -> None:
        """Ask for a table or an image header and lay it on the chart."""
        if self.left is not None:
            self.left.overlays.open()

    def open_audit(self) -> None:
        """Ask which frame a coordinate is in; the dialog may stay open beside the chart."""
        from colure_viewer.panels.audit import AuditDialog

        if self.audit is None:
            self.audit = AuditDialog(self.desk, self)
        self.audit.refresh()
        self.audit.show()
        self.audit.activateWindow()

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
        for part in (self.audit, self.left.overlays if self.left is not None else None):
            if part is not None:
                part.jobs.wait()
        self.settings.setValue("size", self.size())
        event.accept()
