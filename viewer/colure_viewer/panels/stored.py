"""What the store of overlays knows of one, in words for its panel."""

from typing import TYPE_CHECKING

from colure.overlays import Overlay
from colure.session import Session

if TYPE_CHECKING:
    from colure.overlays.matching import Match
    from colure.overlays.store import Store


def store() -> "Store":
    """Return the program's store; a window without overlays never loads it."""
    from colure.overlays.store import STORE

    return STORE


def ready(session: Session) -> bool:
    """Whether every visible overlay of a session has been read, or was found missing."""
    return all(store().ready(one) for one in session.overlays if one.visible)


def read_all(session: Session) -> None:
    """Read the files of the visible overlays into the store; slow, and touches no widget."""
    for one in session.overlays:
        if one.visible:
            store().rows(one) if one.kind == "table" else store().shape(one)


def generation() -> int:
    """Return a number that grows whenever an answer may be another."""
    return store().generation


def fault(overlay: Overlay) -> str:
    """Return why an overlay cannot be shown; empty where it can, or was not read yet."""
    return store().fault(overlay)


def match(overlay: Overlay) -> "Match | None":
    """Return the match of an overlay as it is declared now, or None."""
    found: Match | None = store().match(overlay)
    return found


def holds(overlay: Overlay) -> str:
    """Return in a word what an overlay holds."""
    if overlay.kind == "image":
        return "image"
    rows = store().rows(overlay) if store().ready(overlay) else None
    return "table" if rows is None else f"{len(rows):,} rows"


def state(overlay: Overlay) -> str:
    """Return what of a file could be used; the rows that could not are listed by number."""
    if overlay.kind == "image":
        return "outline, north and east arrows, grid"
    rows = store().rows(overlay) if store().ready(overlay) else None
    if rows is None:
        return "not read yet: it is not shown"
    text = f"{len(rows):,} rows in columns {overlay.lon}, {overlay.lat}"
    if rows.refused:
        shown = "; ".join(rows.rejected[:3]) + ("; …" if rows.refused > 3 else "")
        text += f". {rows.refused:,} refused: {shown}"
    return "\n".join([text, *rows.notes[:2]])
