"""The cards of a header that a projection library is given: those that it needs, each of them well formed."""

import math
import re

from colure.overlays.headers import CARD, HeaderText
from colure.overlays.model import OverlayError
from colure.wording import one_line

_NUMBERS = re.compile(
    r"(CRVAL|CRPIX|CDELT|CROTA|NAXIS|ZNAXIS|PROJP)\d{1,2}|(CD|PC)\d{1,2}_\d{1,2}|(CD|PC)\d{6}|PV\d{1,2}_\d{1,3}"
    r"|(A|B|AP|BP)_\d_\d|(A|B|AP|BP)_ORDER|LONPOLE|LATPOLE|WCSAXES|NAXIS|BITPIX|CPERR\d|CQERR\d|D2IMERR\d"
    # The plate solution of the digitised sky surveys.
    r"|AMD[XY](1?\d|20)|PPO\d|CNPIX\d|[XY]PIXELSZ|PLTRA[HMS]|PLTDEC[DMS]|PLTSCALE"
)
_TEXTS = re.compile(r"CTYPE\d{1,2}|CUNIT\d{1,2}|CPDIS\d|CQDIS\d|D2IMDIS\d|D2IMARR\d|D2IMEXT|PS\d{1,2}_\d{1,2}|PLTDECSN")
_RECORD = re.compile(r"D[PQ]\d|D2IM\d")
_LATTICE = re.compile(r"WAT\d_\d{3}")


def projection_cards(unit: HeaderText, where: str) -> str:
    """Return the cards of a header that say how its pixels lie on the sky, without END.

    Projection libraries written in C corrupt their memory over some cards that are not well formed, so they get no
    others. OverlayError names a card that should hold a finite number and does not: leaving it out would put the image
    elsewhere.
    """
    kept: list[str] = []
    seen: set[str] = set()
    surfaces = any(code in str(unit.cards.get(f"CTYPE{i}", "")) for i in range(1, 10) for code in ("TNX", "ZPX"))
    for start in range(0, len(unit.text), CARD):
        image = unit.text[start : start + CARD]
        key = image[:8].strip().upper()
        if key == "END":
            break
        value = unit.cards.get(key)
        # Record-valued cards repeat their keyword; of all others the first counts.
        if value is None or image[8:9] != "=" or (key in seen and not _RECORD.fullmatch(key)):
            continue
        seen.add(key)
        if _NUMBERS.fullmatch(key):
            if isinstance(value, bool | str) or not math.isfinite(value):
                raise OverlayError(f"{where}: {key} is '{one_line(str(value), 30)}'; expected a number")
            kept.append(image)
        elif (
            _RECORD.fullmatch(key)
            or (_TEXTS.fullmatch(key) and isinstance(value, str))
            or (surfaces and _LATTICE.fullmatch(key))
        ):
            kept.append(image)
    return "".join("".join(c if " " <= c <= "~" else " " for c in image.ljust(CARD)) for image in kept)
