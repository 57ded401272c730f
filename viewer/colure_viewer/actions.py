"""The window's commands: their names, keys and menus, in one table that the help is made from too."""

from collections.abc import Callable
from dataclasses import dataclass

from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtWidgets import QMainWindow, QMenu

Keys = QKeySequence.StandardKey | str | None


@dataclass(frozen=True, slots=True)
class Command:
    """One entry of a menu; `name` is its method's name in the window."""

    menu: str
    name: str
    text: str
    keys: Keys = None
    checkable: bool = False


S = QKeySequence.StandardKey
RULE = Command("", "", "")
COMMANDS = (
    Command("&File", "new_session", "&New: the demo session", S.New),
    Command("&File", "open_session", "&Open session…", S.Open),
    Command("&File", "recent", "Open &recent"),
    Command("&File", "save_session", "&Save session", S.Save),
    Command("&File", "save_session_as", "Save session &as…", "Ctrl+Shift+S"),
    RULE,
    Command("&File", "open_overlay", "Open o&verlay…", "Ctrl+Shift+O"),
    RULE,
    Command("&File", "export_chart", "&Export chart…", "Ctrl+E"),
    Command("&File", "print_chart", "&Print chart…", S.Print),
    RULE,
    Command("&File", "close", "&Quit", "Ctrl+Q"),
    Command("&Edit", "undo", "&Undo", S.Undo),
    Command("&Edit", "redo", "&Redo", "Ctrl+Shift+Z"),
    RULE,
    Command("&Edit", "copy_chart", "&Copy chart as a picture", "Ctrl+Shift+C"),
    Command("&Edit", "copy_direction", "Copy the direction in every &frame", "Ctrl+Alt+C"),
    RULE,
    Command("&Edit", "find_name", "&Find a name…", S.Find),
    Command("&Edit", "open_audit", "&Which frame is this coordinate in?…", "Ctrl+Shift+A"),
    Command("&View", "zoom_in", "Zoom &in", "Ctrl++"),
    Command("&View", "zoom_out", "Zoom &out", "Ctrl+-"),
    Command("&View", "whole_sky", "&Whole sky", "Ctrl+0"),
    Command("&View", "centre_selection", "&Centre on the selection", "Ctrl+J"),
    Command("&View", "mirror", "&East to the left", "Ctrl+I", True),
    Command("&View", "turn_up", "Next way &up", "Ctrl+U"),
    RULE,
    Command("&View", "toggle_belt", "&Belt", "Ctrl+1", True),
    Command("&View", "toggle_edges", "Constellation e&dges", "Ctrl+3", True),
    Command("&View", "toggle_milky_way", "&Milky Way", "Ctrl+4", True),
    Command("&View", "toggle_deep_sky", "Dee&p sky", "Ctrl+5", True),
    Command("&View", "toggle_grid", "&Grid", "Ctrl+2", True),
    RULE,
    Command("&View", "theme", "&Theme"),
    Command("&View", "next_theme", "Next t&heme", "Ctrl+T"),
    Command("&View", "toggle_left", "&Left panels", "F7", True),
    Command("&View", "toggle_right", "&Right panels", "F8", True),
    Command("&View", "full_screen", "Full &screen", "F11", True),
    Command("&Time", "step_on", "Step &on", "Ctrl+Right"),
    Command("&Time", "step_back", "Step &back", "Ctrl+Left"),
    Command("&Time", "run_on", "&Run on", "F5"),
    Command("&Time", "run_back", "Run b&ack", "Shift+F5"),
    Command("&Time", "now", "&Now", "F6"),
    RULE,
    Command("&Time", "focus_moment", "Type the &moment", "Ctrl+M"),
    Command("&Time", "focus_site", "Type the &site", "Ctrl+L"),
    Command("&Time", "focus_centre", "Type the &centre", "Ctrl+K"),
    Command("&Help", "show_help", "&Keys and pointer", S.HelpContents),
    Command("&Help", "show_cautions", "&Cautions"),
    Command("&Help", "show_about", "&About Colure"),
)
POINTER = (
    ("drag", "move over the sky"),
    ("wheel, pinch", "zoom about the pointer"),
    ("click", "select a star, a body, an object or a point"),
    ("double click", "centre there; a body is followed"),
    ("Shift and click, or drag", "measure separation and position angle"),
    ("arrow keys", "move over the sky; with Shift, farther"),
    ("+  −", "zoom about the middle"),
    ("Space", "select what is nearest to the middle; with Shift, measure from the selection"),
    ("Esc", "drop the selection and the measurement; in a field, bring back the value in force"),
)


def build(window: QMainWindow) -> dict[str, QAction | QMenu]:
    """Make the menus of a window and return its actions and submenus by name."""
    menus: dict[str, QMenu] = {}
    made: dict[str, QAction | QMenu] = {}
    last: QMenu | None = None
    for command in COMMANDS:
        if command is RULE:
            if last is not None:
                last.addSeparator()
            continue
        menu = menus.get(command.menu)
        if menu is None:
            menu = menus[command.menu] = window.menuBar().addMenu(command.menu)
        last = menu
        if command.name in ("recent", "theme"):
            made[command.name] = menu.addMenu(command.text)
            continue
        action = QAction(command.text, window)
        if command.keys is not None:
            action.setShortcut(QKeySequence(command.keys))
        action.setCheckable(command.checkable)
        slot: Callable[..., object] = getattr(window, command.name)
        # The slot is looked up by name and called without Qt's "checked", which few want.
        action.triggered.connect(lambda _checked=False, slot=slot: slot())
        menu.addAction(action)
        made[command.name] = action
    return made


def help_rows(made: dict[str, QAction | QMenu]) -> list[tuple[str, str]]:
    """Return keys or gestures and what they do, pointer first."""
    rows = list(POINTER)
    for command in COMMANDS:
        action = made.get(command.name)
        if isinstance(action, QAction) and not action.shortcut().isEmpty():
            keys = action.shortcut().toString(QKeySequence.SequenceFormat.NativeText)
            rows.append((keys, command.text.replace("&", "").rstrip("…")))
    return rows
