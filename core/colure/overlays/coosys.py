"""What a table file says of its frame and epoch outside its columns: COOSYS, RADESYS and EQUINOX, remarks."""

import html
import re
from collections.abc import Mapping
from dataclasses import dataclass

from colure.errors import ColureError
from colure.frames import Frame
from colure.overlays.fitsrules import SYSTEMS, decide
from colure.overlays.headers import HeaderText
from colure.overlays.systems import ecliptic, equatorial, julian_epoch, year_of
from colure.wording import one_line

MOST_HEAD = 4_000_000
"""How far into a VOTable its declarations are looked for."""
_TAG = re.compile(r"<\s*(?:[\w.-]+:)?(COOSYS|FIELD|TABLE|DATA|GROUP)\b((?:[^>\"']|\"[^\"]*\"|'[^']*')*)>")
_ATTRIBUTE = re.compile(r"([\w:.-]+)\s*=\s*(\"[^\"]*\"|'[^']*')")
_COMMENT = re.compile(r"<!--.*?-->", re.DOTALL)


@dataclass(frozen=True, slots=True)
class Said:
    """What a file says: a frame or None, the rule, an epoch (Julian year) or None, its rule, and doubts."""

    frame: str | None
    rule: str
    epoch: float | None = None
    epoch_rule: str = ""
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Coosys:
    """One COOSYS element of a VOTable."""

    id: str
    system: str
    equinox: str
    epoch: str

    def said(self, plane: str) -> Said:
        """Return the frame that it stands for, for columns of a plane ("equator", "ecliptic", …, "" if unknown)."""
        given = " ".join(
            f'{key}="{one_line(value, 20)}"'
            for key, value in (("system", self.system), ("equinox", self.equinox), ("epoch", self.epoch))
            if value
        )
        rule = f"COOSYS {given}"
        doubts: list[str] = []
        epoch = year_of(self.epoch) if self.epoch else None
        if self.epoch and epoch is None:
            doubts.append(f"COOSYS epoch '{one_line(self.epoch, 20)}' is no year; left out")
        when = None if epoch is None else julian_epoch(*epoch)
        frame, more = self._frame(plane)
        return Said(frame, rule + more, when, rule if when is not None else "", tuple(doubts))

    def _frame(self, plane: str) -> tuple[str | None, str]:
        system = self.system.strip().upper().replace("-", "_")
        found = year_of(self.equinox) if self.equinox else None
        if self.equinox and found is None:
            return None, ": its equinox is no year"
        match system:
            case "ICRS":
                return ("icrs", "") if plane in ("equator", "") else self._other(plane, "ICRS", 2000.0)
            case "EQ_FK5" | "FK5":
                return self._other(plane or "equator", "FK5", found[1] if found else 2000.0)
            case "EQ_FK4" | "FK4":
                return self._other(plane or "equator", "FK4", found[1] if found else 1950.0)
            case "ECL_FK5":
                return ecliptic("FK5", found[1] if found else 2000.0), ""
            case "ECL_FK4":
                return ecliptic("FK4", found[1] if found else 1950.0), ""
            case "ECLIPTIC":
                return (ecliptic("ICRS", found[1]), "") if found else (None, ": of which equinox?")
            case "GALACTIC" | "GALACTIC_II":
                return "galactic", ""
            case "SUPERGALACTIC" | "SUPER_GALACTIC":
                return "supergalactic", ""
        return None, ": this system names no frame of the sky"

    @staticmethod
    def _other(plane: str, system: str, year: float) -> tuple[str | None, str]:
        """Return the frame of columns in a plane by the name of an equatorial system."""
        if plane == "equator":
            return equatorial(system, year), ""
        if plane == "ecliptic":
            return ecliptic(system, year), ", for ecliptic columns"
        return plane, f", for {plane} columns"


def votable_systems(data: bytes) -> tuple[tuple[Coosys, ...], Mapping[str, str]]:
    """Return the COOSYS elements in the bytes of a VOTable, and field name → reference of its first table.

    Only the head of the file is looked at, and no entity but the five of XML is known to it.
    """
    text = _COMMENT.sub("", data[:MOST_HEAD].decode("utf-8", "replace"))
    systems: list[Coosys] = []
    refs: dict[str, str] = {}
    began = done = False
    for found in _TAG.finditer(text):
        tag, inside = found[1], {k: html.unescape(v[1:-1]) for k, v in _ATTRIBUTE.findall(found[2])}
        if tag == "COOSYS":
            systems.append(Coosys(*(inside.get(key, "") for key in ("ID", "system", "equinox", "epoch"))))
        elif tag == "DATA" and began:
            done = True
        elif tag == "FIELD" and not done:
            began = True
            refs[inside.get("name") or inside.get("ID", "")] = inside.get("ref", "")
    return tuple(systems), refs


def of_votable(data: bytes, lon: str, lat: str, plane: str) -> Said | None:
    """Return what a VOTable says of two of its columns, or None."""
    systems, refs = votable_systems(data)
    by_id = {system.id: system for system in systems if system.id}
    mine, other = by_id.get(refs.get(lon, "")), by_id.get(refs.get(lat, ""))
    if mine is None and other is None:
        distinct = {(system.system.upper(), system.equinox, system.epoch) for system in systems}
        if len(distinct) != 1:
            return None
        said = systems[0].said(plane)
        return Said(said.frame, said.rule + " (the only one in the file)", said.epoch, said.epoch_rule, said.doubts)
    chosen = mine or other
    assert chosen is not None
    said = chosen.said(plane)
    doubts = list(said.doubts)
    if mine is not None and other is not None:
        second = other.said(plane)
        if second.frame != said.frame:
            text = f"the two columns name different systems, {mine.id} and {other.id}: which one holds?"
            return Said(None, text, doubts=tuple(doubts))
        if second.epoch != said.epoch:
            doubts.append(f"the two columns name different epochs ({mine.epoch or 'none'}, {other.epoch or 'none'})")
            return Said(said.frame, said.rule, None, "", tuple(doubts))
    return Said(said.frame, said.rule, said.epoch, said.epoch_rule, tuple(doubts))


def of_header(unit: HeaderText, plane: str) -> Said | None:
    """Return what the header of a FITS table says: RADESYS and EQUINOX, as for an image, but nothing by default."""
    cards = unit.cards
    keys = ("RADESYS", "RADECSYS", "EQUINOX", "EPOCH")
    if plane in ("galactic", "supergalactic") or not any(key in cards for key in keys):
        return None
    ruling = decide(cards, "ecliptic" if plane == "ecliptic" else "equatorial")
    if "default" in ruling.rule and not any(str(cards.get(k, "")).strip().upper() in SYSTEMS for k in keys[:2]):
        return Said(None, "its RADESYS and EQUINOX cannot be read", doubts=ruling.doubts)
    return Said(ruling.frame, ruling.rule, ruling.epoch, ruling.epoch_rule, ruling.doubts)


def of_remarks(meta: Mapping[str, str]) -> Said | None:
    """Return what remarks `frame` and `epoch` of a CSV or ECSV file say, or None; our own tables carry them."""
    folded = {key.strip().casefold(): str(value) for key, value in meta.items()}
    epoch = year_of(folded["epoch"]) if "epoch" in folded else None
    when = None if epoch is None else julian_epoch(*epoch)
    epoch_rule = "" if when is None else f"remark epoch = {one_line(folded['epoch'], 20)}"
    text = folded.get("frame")
    if text is None:
        return None if when is None else Said(None, "", when, epoch_rule)
    try:
        frame = str(Frame.parse(text))
    except ColureError as fault:
        return Said(None, f"remark {fault}", when, epoch_rule)
    return Said(frame, f"remark frame = {one_line(text, 40)}", when, epoch_rule)
