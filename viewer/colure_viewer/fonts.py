"""The chart's fonts: registers the shipped faces with Qt and gives the font of a label."""

from functools import cache, lru_cache

from PySide6.QtGui import QFont, QFontDatabase

from colure import resources
from colure.errors import ResourceError

SANS, SERIF = "Colure Sans", "Colure Serif"
FILES = (
    "fonts/ColureSans-Regular.ttf",
    "fonts/ColureSans-Bold.ttf",
    "fonts/ColureSerif-Regular.ttf",
    "fonts/ColureSerif-Italic.ttf",
    "fonts/ColureSerif-Bold.ttf",
)
SERIF_ROLES = ("title", "label.circle", "label.constellation", "label.star", "label.belt")
"""Roles (and their grades) set in the serif; every other role is set in the sans."""

PX_PER_PT = 4.0 / 3.0
"""Logical pixels to a point: 96 to the inch, as in colure.marks."""

CAP_MIDDLE = 0.33
"""Half the height of the capitals, in ems: how far a label's centre stands above its baseline."""


@cache
def register() -> None:
    """Register the shipped faces with the running application, once; raise ResourceError if one is damaged."""
    for file in FILES:
        if QFontDatabase.addApplicationFont(str(resources.path(file))) < 0:
            raise ResourceError(f"data file '{file}': not a font that can be read; run 'colure selfcheck'")


@cache
def family(role: str) -> str:
    """Return the family in which a role is set."""
    return SERIF if any(role == one or role.startswith(one + ".") for one in SERIF_ROLES) else SANS


@lru_cache(maxsize=64)
def font(family_name: str, pixels: float, italic: bool = False, bold: bool = False) -> QFont:
    """Return a shipped font, `pixels` to the em, laid out without hinting so that it measures alike at every size."""
    register()
    made = QFont(family_name)
    # Point sizes may be fractional and pixel sizes may not; the painter's devices all have 96 dots to the inch.
    made.setPointSizeF(pixels / PX_PER_PT)
    made.setHintingPreference(QFont.HintingPreference.PreferNoHinting)
    made.setStyleStrategy(QFont.StyleStrategy.PreferAntialias | QFont.StyleStrategy.NoSubpixelAntialias)
    made.setItalic(italic and family_name == SERIF)
    made.setBold(bold)
    return made
