"""How wide a text is on the page, from the advance widths of the shipped fonts, with no font engine.

One table for each of the five faces, in thousandths of an em. Kerning is left out (about 1 %), so a width is rather a
little too large than too small.
"""

from functools import cache, lru_cache

from colure import resources

FACES = ("Sans-Regular", "Sans-Bold", "Serif-Regular", "Serif-Italic", "Serif-Bold")
PX_PER_PT = 4.0 / 3.0
"""Logical pixels in a point: 96 pixels and 72 points to the inch."""
CAP_HEIGHT = 0.66
"""Height of capitals and figures in em, the same to 0.01 in all five faces."""
ASCENT, DESCENT = 0.78, 0.22
"""How far letters reach above and below the baseline, in em, accents on capitals left out."""

_SERIF_ROLES = ("title", "label.circle", "label.constellation", "label.star", "label.belt")


@lru_cache(maxsize=256)
def face_of(role: str, *, italic: bool = False, bold: bool = False) -> int:
    """Return the place in FACES of the face that a role is set in; the sans face has no italic."""
    if any(role == serif or role.startswith(serif + ".") for serif in _SERIF_ROLES):
        return 3 if italic else 4 if bold else 2
    return 1 if bold else 0


@cache
def _advances(face: int) -> dict[str, int]:
    table = resources.load_array("metrics/advances.npy", mmap=False)
    rows = table[table["face"] == face]
    return dict(zip(map(chr, rows["code"].tolist()), rows["advance"].tolist(), strict=True))


@lru_cache(maxsize=65536)
def width_em(text: str, face: int = 0) -> float:
    """Return the advance width of a text in em; a character that the face lacks counts as one em."""
    advances = _advances(face)
    return sum(advances.get(c, 1000) for c in text) * 1e-3


def width_px(text: str, size_pt: float, role: str, *, italic: bool = False, bold: bool = False) -> float:
    """Return the advance width in logical pixels of a text as its role is set."""
    return width_em(text, face_of(role, italic=italic, bold=bold)) * size_pt * PX_PER_PT
