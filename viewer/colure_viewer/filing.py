"""The window's commands on files: sessions opened, saved and remembered; the chart exported, printed and copied."""

from functools import partial
from pathlib import Path

from PySide6.QtWidgets import QMenu

from colure.errors import ColureError
from colure.session import Session
from colure_viewer.shell import Shell

RECENT = 8


class Filing(Shell):
    """A window that reads and writes."""

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
        except ColureError as fault:
            self.say(str(fault))
            self._forget(path)
            return False
        if session.overlays:
            from colure_viewer.panels import stored

            if not stored.ready(session) and self.left is not None:
                # Other people's files may be large: they are read beside the window, and then the session is opened.
                def done(_read: None) -> None:
                    self._put_up(session, path, report)

                work = partial(stored.read_all, session)
                self.left.overlays.jobs.run(f"Reading overlays of {path.name}", work, done, self.say)
                return True
        return self._put_up(session, path, report)

    def _put_up(self, session: Session, path: Path, report: tuple[str, ...]) -> bool:
        """Show a session that was read; one that cannot be drawn is reported, and the old one stays."""
        try:
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
