"""What the store of overlays knows of one, in words for its panel."""

from typing import TYPE_CHECKING

from colure.overlays import Overlay
from colure.overlays.store import STORE

if TYPE_CHECKING:
    from colure.overlays.matching import Match


def generation() -> int:
    """Return a number that grows whenever an answer may be another."""
    return STORE.generation


def fault(overlay: Overlay) -> str:
    """Return why an overlay cannot be shown; empty where it can, or was not read yet."""
    return STORE.fault(overlay)


def match(overlay: Overlay) -> "Match | None":
    """Return the match of an overlay as it is declared now, or None."""
    found: Match | None = STORE.match(overlay)
    return found


def holds(overlay: Overlay) -> str:
    """Return in a word what an overlay holds."""
    if overlay.kind == "image":
        return "image"
    rows = STORE.rows(overlay) if STORE.ready(overlay) else None
    return "table" if rows is None else f"{len(rows):,} rows"


def state(overlay: Overlay) -> str:
    """Return what of a file could be used; the rows that could not are listed by number."""
    if overlay.kind == "image":
        return "outline, north and east arrows, grid"
    rows = STORE.rows(overlay) if STORE.ready(overlay) else None
    if rows is None:
        return "not read yet: it is not shown"
    text = f"{len(rows):,} rows in columns {overlay.lon}, {overlay.lat}"
    if rows.refused:
        shown = "; ".join(rows.rejected[:3]) + ("; …" if rows.refused > 3 else "")
        text += f". {rows.refused:,} refused: {shown}"
    return "\n".join([text, *rows.notes[:2]])
