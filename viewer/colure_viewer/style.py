"""Dresses the window in a theme: palette, style sheet and fonts of its widgets."""

from PySide6.QtGui import QColor, QFont, QPalette
from PySide6.QtWidgets import QApplication

from colure_viewer import fonts
from colure_viewer.themes import Theme, mix

TEXT_PT = 10.0


def palette(theme: Theme) -> QPalette:
    """Return the palette of a theme."""
    colour = {name: QColor(theme.colour(name)) for name in theme.roles}
    made = QPalette()
    role = QPalette.ColorRole
    for group in (QPalette.ColorGroup.Active, QPalette.ColorGroup.Inactive, QPalette.ColorGroup.Disabled):
        off = group == QPalette.ColorGroup.Disabled
        ink = QColor(mix(theme.colour("ink"), theme.colour("window"), 0.45)) if off else colour["ink"]
        for which, value in (
            (role.Window, colour["window"]),
            (role.WindowText, ink),
            (role.Base, colour["field"]),
            (role.AlternateBase, colour["panel"]),
            (role.Text, ink),
            (role.Button, colour["panel"]),
            (role.ButtonText, ink),
            (role.BrightText, colour["fault"]),
            (role.Highlight, colour["accent"]),
            (role.HighlightedText, colour["on.accent"]),
            (role.Link, colour["accent"]),
            (role.PlaceholderText, colour["muted"]),
            (role.ToolTipBase, colour["field"]),
            (role.ToolTipText, colour["ink"]),
            (role.Light, colour["field"]),
            (role.Midlight, colour["panel"]),
            (role.Mid, colour["rule"]),
            (role.Dark, colour["rule"]),
            (role.Shadow, colour["rule"]),
        ):
            made.setColor(group, which, value)
    return made


def sheet(theme: Theme) -> str:
    """Return the style sheet of a theme: thin rules, no shadows, one grid."""
    c = theme.colour
    return f"""
    QLabel#heading, QLabel#bar {{ font-family: "{fonts.SERIF}"; font-weight: bold; color: {c("ink")};
        qproperty-indent: 0; }}
    QLabel#heading {{ padding: 7px 0 2px 0; }}
    QLabel#muted {{ color: {c("muted")}; }}
    QLabel#fault {{ background: {c("field")}; color: {c("fault")}; border: 1px solid {c("fault")}; padding: 5px 7px; }}
    QLabel#notice {{ color: {c("fault")}; }}
    QLineEdit, QComboBox, QDoubleSpinBox, QSpinBox, QPlainTextEdit {{
        background: {c("field")}; color: {c("ink")}; border: 1px solid {c("rule")}; padding: 2px 5px; min-height: 20px;
        selection-background-color: {c("accent")}; selection-color: {c("on.accent")}; }}
    QLineEdit:focus, QComboBox:focus, QDoubleSpinBox:focus, QPlainTextEdit:focus, QTableView:focus,
    QListView:focus {{
        border: 1px solid {c("accent")}; }}
    QComboBox QLineEdit, QComboBox QLineEdit:focus {{ border: 0; padding: 0; min-height: 18px; }}
    QLineEdit[fault="true"], QComboBox QLineEdit[fault="true"], QPlainTextEdit[fault="true"] {{
        border: 1px solid {c("fault")}; color: {c("fault")}; }}
    QComboBox QAbstractItemView {{ background: {c("field")}; color: {c("ink")}; border: 1px solid {c("rule")};
        selection-background-color: {c("accent")}; selection-color: {c("on.accent")}; }}
    QPushButton, QToolButton {{ background: {c("panel")}; color: {c("ink")}; border: 1px solid {c("rule")};
        padding: 2px 8px; min-height: 20px; }}
    QPushButton:hover, QToolButton:hover {{ border-color: {c("accent")}; }}
    QPushButton:focus, QToolButton:focus {{ border: 1px solid {c("accent")}; }}
    QPushButton:checked, QToolButton:checked {{ background: {c("accent")}; color: {c("on.accent")}; }}
    QPushButton:pressed, QToolButton:pressed {{ background: {c("rule")}; color: {c("ink")}; }}
    QPushButton:disabled, QToolButton:disabled {{ color: {mix(c("ink"), c("window"), 0.5)}; }}
    QTableView, QListView {{ background: {c("field")}; alternate-background-color: {c("panel")}; color: {c("ink")};
        border: 1px solid {c("rule")}; gridline-color: {mix(c("rule"), c("field"), 0.5)};
        selection-background-color: {c("accent")}; selection-color: {c("on.accent")}; }}
    QHeaderView::section {{ background: {c("panel")}; color: {c("muted")}; border: 0;
        border-bottom: 1px solid {c("rule")}; padding: 2px 4px; }}
    QHeaderView {{ background: {c("panel")}; border: 0; }}
    QTableView {{ selection-background-color: {mix(c("accent"), c("field"), 0.82)};
        selection-color: {c("ink")}; outline: 0; }}
    QScrollBar:vertical {{ background: {c("window")}; width: 9px; margin: 0; border: 0; }}
    QScrollBar::handle:vertical {{ background: {c("rule")}; min-height: 30px; }}
    QScrollBar::add-line:vertical, QScrollBar::sub-line:vertical {{ height: 0; }}
    QScrollBar::add-page:vertical, QScrollBar::sub-page:vertical {{ background: none; }}
    QScrollArea, QScrollArea > QWidget > QWidget#column {{ background: {c("window")}; border: 0; }}
    QMenuBar {{ background: {c("window")}; color: {c("ink")}; }}
    QMenuBar::item:selected, QMenu::item:selected {{ background: {c("accent")}; color: {c("on.accent")}; }}
    QMenu {{ background: {c("field")}; color: {c("ink")}; border: 1px solid {c("rule")}; }}


    QToolTip {{ background: {c("field")}; color: {c("ink")}; border: 1px solid {c("rule")}; padding: 3px; }}
    QCheckBox {{ spacing: 6px; }}
    QCheckBox::indicator, QTableView::indicator {{ width: 7px; height: 7px; padding: 2px;
        border: 1px solid {c("muted")}; background: {c("field")}; background-clip: content; }}
    QCheckBox::indicator:checked, QTableView::indicator:checked {{ background: {c("ink")};
        background-clip: content; }}
    QCheckBox::indicator:focus {{ border-color: {c("accent")}; }}
    QCheckBox:focus {{ color: {c("accent")}; }}
    """


def dress(application: QApplication, theme: Theme) -> None:
    """Put a theme on every widget of the application."""
    application.setPalette(palette(theme))
    application.setStyleSheet(sheet(theme))


def set_font(application: QApplication) -> None:
    """Set the widgets in the shipped sans, whose figures are tabular."""
    fonts.register()
    face = QFont(fonts.SANS)
    face.setPointSizeF(TEXT_PT)
    application.setFont(face)
