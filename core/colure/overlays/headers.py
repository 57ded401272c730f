"""Read the headers of a FITS file, or a header saved as text, and never its pixels; every size is bounded."""

import gzip
import hashlib
import io
import zlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, BinaryIO

from colure.overlays.model import OverlayError
from colure.wording import one_line

CARD, BLOCK = 80, 2880
MOST_BYTES = 4_000_000
"""The longest header that is read: 50,000 cards."""
MOST_UNITS = 400
MOST_UNPACKED = 300_000_000
"""How much of a packed file is passed over in search of its headers."""


@dataclass(frozen=True, slots=True, eq=False)
class HeaderText:
    """One header: its place in the file, its cards as text without line ends, and the sha256 of that text."""

    place: int
    text: str
    sha256: str
    cards: Mapping[str, Any]

    @property
    def is_table(self) -> bool:
        """Whether it stands before a table (and not before an image packed into one)."""
        return self.cards.get("XTENSION") in ("BINTABLE", "TABLE", "A3DTABLE") and not self.cards.get("ZIMAGE")


@dataclass(frozen=True, slots=True, eq=False)
class Headers:
    """The headers of a file, and remarks such as that it is cut short."""

    units: tuple[HeaderText, ...]
    notes: tuple[str, ...] = ()


def read_headers(path: Path | str) -> Headers:
    """Return the headers of a file; OverlayError in one line where it has none. Packed files (gzip) are unpacked."""
    where = f"image '{path}'"
    try:
        with Path(path).open("rb") as raw:
            start = raw.read(4)
            raw.seek(0)
            if start[:2] == b"\x1f\x8b":
                with gzip.GzipFile(fileobj=raw) as unpacked:
                    return _walk(_Forward(unpacked), where)
            raw.seek(0, io.SEEK_END)
            size = raw.tell()
            raw.seek(0)
            return _walk(_Plain(raw, size), where)
    except (EOFError, zlib.error) as fault:
        raise OverlayError(f"{where}: the packed file is damaged, {one_line(str(fault))}") from None
    except (OSError, ValueError) as fault:
        reason = getattr(fault, "strerror", None) or str(fault)
        raise OverlayError(f"{where}: cannot be read, {one_line(reason.casefold())}") from None


class _Plain:
    """A file that can be skipped through."""

    def __init__(self, file: BinaryIO, size: int) -> None:
        self.file, self.size = file, size

    def read(self, count: int) -> bytes:
        """Return the next bytes."""
        return self.file.read(count)

    def skip(self, count: int) -> bool:
        """Pass over bytes; False where the file ends before."""
        if self.file.tell() + count > self.size:
            return False
        self.file.seek(count, io.SEEK_CUR)
        return True


class _Forward:
    """A packed file, which must be unpacked to be passed over: up to a bound."""

    def __init__(self, file: gzip.GzipFile) -> None:
        self.file, self.left = file, MOST_UNPACKED

    def read(self, count: int) -> bytes:
        """Return the next bytes."""
        return self.file.read(count)

    def skip(self, count: int) -> bool:
        """Pass over bytes; False where the file ends before, or at the bound."""
        if count > self.left:
            return False
        self.left -= count
        while count > 0:
            got = len(self.file.read(min(count, 1 << 20)))
            if not got:
                return False
            count -= got
        return True


def _walk(file: _Plain | _Forward, where: str) -> Headers:
    units: list[HeaderText] = []
    notes: list[str] = []
    while len(units) < MOST_UNITS:
        text, whole = _one(file, where, len(units))
        if text is None:
            break
        cards = parse(text)
        units.append(HeaderText(len(units), text, hashlib.sha256(text.encode("latin-1")).hexdigest(), cards))
        if not whole:
            break  # a header saved as text: nothing follows
        length = _data_bytes(cards)
        if length is None:
            notes.append(f"header {len(units) - 1} has sizes that make no sense; what follows it was not read")
            break
        if length and not file.skip(-(-length // BLOCK) * BLOCK):
            # The last block need not be filled up, and a header saved without its data is whole by itself.
            if not file.skip(length) and file.read(1):
                notes.append(f"the file is cut short: header {len(units) - 1} promises {length:,} bytes of data")
            break
    if not units:
        raise OverlayError(f"{where}: no FITS header; expected one that begins with SIMPLE, or one saved as text")
    return Headers(tuple(units), tuple(notes))


def _one(file: _Plain | _Forward, where: str, number: int) -> tuple[str | None, bool]:
    """Return the cards of the next header, or None, and whether it ended with END in whole blocks."""
    data = b""
    while True:
        block = file.read(BLOCK)
        data += block
        if number == 0 and len(data) == len(block) and not _begins_well(data):
            return None, False
        if number and not data.startswith(b"XTENSION"):
            return None, False
        if 0 < data.find(b"\n") <= CARD + 1:  # a header saved line by line
            data += file.read(MOST_BYTES + 1 - len(data))
            _check_size(data, where)
            lines = data.decode("latin-1").splitlines()
            return "".join(line[:CARD].ljust(CARD) for line in lines), False
        cards = [data[i : i + CARD] for i in range(max(0, len(data) - len(block)), len(data), CARD)]
        if any(card.rstrip() == b"END" for card in cards):
            return data.decode("latin-1"), len(block) == BLOCK
        if len(block) < BLOCK:
            return (data.decode("latin-1") if data.strip() else None), False
        _check_size(data, where)


def _check_size(data: bytes, where: str) -> None:
    if len(data) > MOST_BYTES:
        raise OverlayError(f"{where}: more than {MOST_BYTES:,} bytes without END; expected a FITS header")


def _begins_well(data: bytes) -> bool:
    """Whether bytes look like cards: keywords of FITS, then = in the ninth column, in the first few."""
    lines = data.split(b"\n") if 0 < data.find(b"\n") <= CARD + 1 else [data[i : i + CARD] for i in range(0, 400, CARD)]
    return any(line[8:10].rstrip() == b"=" and line[:8].strip().replace(b"-", b"").isalnum() for line in lines[:6])


def parse(text: str) -> dict[str, Any]:
    """Return keyword → value of the cards; the first of each keyword counts. What is no value comes as its text."""
    from astropy.io import fits

    cards: dict[str, Any] = {}
    for start in range(0, len(text), CARD):
        image = text[start : start + CARD]
        key = image[:8].strip().upper()
        if key == "END":
            break
        if not key or image[8:9] != "=" or key in cards:
            continue
        image = "".join(c if " " <= c <= "~" else "?" for c in image)
        value: Any
        try:
            value = fits.Card.fromstring(image).value
        except Exception:  # whatever a card holds that is no value, it spoils no other
            value = image[10:].partition("/")[0].strip()
        if isinstance(value, str | bool | int | float):
            cards[key] = value.strip() if isinstance(value, str) else value
    return cards


def _data_bytes(cards: Mapping[str, Any]) -> int | None:
    """Return the length of the data that follow a header (FITS 4.0, eq. 1 and 2), or None where it makes no sense."""

    def whole(key: str, default: int) -> int:
        value = cards.get(key, default)
        return int(value) if isinstance(value, int | float) and value == value and abs(value) < 1e15 else -1

    naxis = whole("NAXIS", 0)
    bits = whole("BITPIX", 8)
    if not 0 <= naxis <= 999:
        return None
    sizes = [whole(f"NAXIS{i + 1}", 0) for i in range(naxis)]
    if cards.get("GROUPS") is True and sizes and sizes[0] == 0:
        sizes = sizes[1:]
    parameters, groups = whole("PCOUNT", 0), whole("GCOUNT", 1)
    if any(size < 0 for size in sizes) or parameters < 0 or groups < 0:
        return None
    count = 1 if sizes else 0
    for size in sizes:
        count *= size
    return abs(bits) // 8 * groups * (parameters + count)
