"""Themes: the colour of every role of a chart and of the window around it, each text readable on its ground.

Circle colours are the palette of Okabe & Ito, "Color Universal Design" (2008), made to be told apart by people with any
common colour vision. On a light or dark ground a colour is shifted in lightness only, until it stands out enough:
3:1 for lines and 4.5:1 for text (the WCAG 2.2 contrast ratio, from relative luminances).
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache

PALETTE = {
    "blue": "#0072B2",
    "vermillion": "#D55E00",
    "reddish purple": "#CC79A7",
    "bluish green": "#009E73",
    "orange": "#E69F00",
    "sky blue": "#56B4E9",
    "yellow": "#F0E442",
    "black": "#000000",
}
"""Okabe & Ito 2008, in the order in which new circles take them."""

TEXT, LINE = 4.5, 3.0
"""Least contrast of text and of lines that carry meaning."""


def channels(colour: str) -> tuple[int, int, int]:
    """Return red, green, blue (0 to 255) of `#RRGGBB`."""
    return int(colour[1:3], 16), int(colour[3:5], 16), int(colour[5:7], 16)


def luminance(colour: str) -> float:
    """Return the relative luminance (0 to 1) of an sRGB colour as WCAG 2.2 defines it."""
    linear = [v / 12.92 if v <= 0.04045 else ((v + 0.055) / 1.055) ** 2.4 for v in (c / 255 for c in channels(colour))]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(a: str, b: str) -> float:
    """Return the WCAG contrast ratio of two colours, 1 to 21."""
    high, low = sorted((luminance(a), luminance(b)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def mix(a: str, b: str, part: float) -> str:
    """Return the colour `part` of the way from a to b."""
    return "#" + "".join(f"{round(x + (y - x) * part):02X}" for x, y in zip(channels(a), channels(b), strict=True))


@lru_cache(maxsize=512)
def legible(colour: str, ground: str, least: float) -> str:
    """Return the colour, moved towards black or white no further than `least` contrast on `ground` asks for."""
    away = "#000000" if luminance(ground) > 0.18 else "#FFFFFF"
    for step in range(41):
        moved = mix(colour, away, step / 40)
        if contrast(moved, ground) >= least:
            return moved
    return away


@dataclass(frozen=True, slots=True, eq=False)
class Theme:
    """Colours by role; a role such as `label.star` falls back on `label`, and every role on `ink`.

    `tints` are the seven colours of stars from the bluest to the reddest. With `mono` a user's own colour keeps only
    its lightness, so that a red screen stays red.
    """

    name: str
    title: str
    dark: bool
    roles: Mapping[str, str]
    tints: tuple[str, ...]
    mono: bool = False

    def colour(self, role: str) -> str:
        """Return the colour of a role."""
        while True:
            found = self.roles.get(role)
            if found is not None:
                return found
            if "." not in role:
                return self.roles["ink"]
            role = role.rpartition(".")[0]

    def line(self, role: str, own: str | None) -> str:
        """Return the colour of a line: the user's own made to stand out on the sky, or the role's."""
        return self.colour(role) if own is None else self._own(own, LINE)

    def text(self, role: str, own: str | None) -> str:
        """Return the colour of a text: as of a line, with the contrast that text needs."""
        return self.colour(role) if own is None else self._own(own, TEXT)

    def _own(self, colour: str, least: float) -> str:
        ground = self.roles["sky"]
        if self.mono:
            # Eight colours become reds between the faintest readable one and full red.
            colour = mix("#BC0000", "#FF0000", luminance(colour) ** 0.5)
            if least < TEXT:
                return colour
            return colour if contrast(colour, ground) >= TEXT else "#F40000"
        return legible(colour, ground, least)


PAPER = Theme(
    "paper",
    "Paper",
    False,
    {
        "paper": "#F3EEE1",
        "sky": "#F8F4EA",
        "ink": "#1D1E22",
        "milkyway": "#EFE9DA",
        "milkyway.1": "#F4EFE2",
        "milkyway.2": "#F0EADB",
        "milkyway.3": "#ECE5D3",
        "milkyway.4": "#E7DFCA",
        "milkyway.5": "#E2D9C2",
        "grid": "#CFC6B2",
        "edge": "#9C8F76",
        "belt": "#E9D49A",
        "belt.edge": "#A98538",
        "belt.division": "#A98538",
        "circle": "#3A4A5E",
        "point": "#1D1E22",
        "star": "#1D1E22",
        "deepsky": "#5A6A52",
        "body": "#7A2E6B",
        "body.sun": "#B45F06",
        "body.moon": "#3F4650",
        "body.mars": "#A63A12",
        "rim": "#1D1E22",
        "label": "#33343A",
        "label.deepsky": "#48573F",
        "label.body": "#6B2360",
        "label.constellation": "#665B48",
        "label.belt": "#75581A",
        "label.grid": "#635B4A",
        "figure": "#4A4638",
        "figure.rim": "#33343A",
        "title": "#1D1E22",
        "legend": "#33343A",
        "caution": "#A01818",
        "selection": "#A0156E",
        "measure": "#005A8C",
        "window": "#E8E1D0",
        "panel": "#F3EEE1",
        "field": "#FBF8F0",
        "rule": "#C9BEA6",
        "muted": "#625B4B",
        "accent": "#005A8C",
        "on.accent": "#FFFFFF",
        "fault": "#A01818",
    },
    ("#1B2A52", "#1D2742", "#1E2332", "#1D1E22", "#2E231E", "#41261B", "#572818"),
)

SLATE = Theme(
    "slate",
    "Slate",
    True,
    {
        "paper": "#171B22",
        "sky": "#10141A",
        "ink": "#E6E3DA",
        "milkyway": "#161B22",
        "milkyway.1": "#141920",
        "milkyway.2": "#181E26",
        "milkyway.3": "#1D242D",
        "milkyway.4": "#232A34",
        "milkyway.5": "#262D37",
        "grid": "#2E3641",
        "edge": "#5C6470",
        "belt": "#2A2C2C",
        "belt.edge": "#8C7B4A",
        "belt.division": "#8C7B4A",
        "circle": "#9FB2C8",
        "point": "#E6E3DA",
        "star": "#F2F0EA",
        "deepsky": "#8FA58A",
        "body": "#E7A9D6",
        "body.sun": "#FFC857",
        "body.moon": "#DADFE6",
        "body.mars": "#FF9A6B",
        "rim": "#CFCDC6",
        "label": "#C9C8C2",
        "label.deepsky": "#A3B89D",
        "label.body": "#EDB6DD",
        "label.constellation": "#8D95A1",
        "label.belt": "#C8B47C",
        "label.grid": "#8D95A1",
        "figure": "#B8B7B0",
        "figure.rim": "#C9C8C2",
        "title": "#E6E3DA",
        "legend": "#C9C8C2",
        "caution": "#FF8A7A",
        "selection": "#FF9ADB",
        "measure": "#7FC8F5",
        "window": "#1D222A",
        "panel": "#171B22",
        "field": "#10141A",
        "rule": "#39414D",
        "muted": "#A0A5AD",
        "accent": "#7FC8F5",
        "on.accent": "#10141A",
        "fault": "#FF8A7A",
    },
    ("#BFD2FF", "#D3DFFF", "#E6ECFA", "#F2F0EA", "#FFEBCB", "#FFDAAE", "#FFC49A"),
)

LAMP = Theme(
    "lamp",
    "Lamp",
    True,
    {
        # Only the red channel is lit: a dome's eyes stay dark-adapted.
        "paper": "#000000",
        "sky": "#000000",
        "ink": "#F00000",
        "milkyway": "#120000",
        "milkyway.1": "#0A0000",
        "milkyway.2": "#100000",
        "milkyway.3": "#140000",
        "milkyway.4": "#180000",
        "milkyway.5": "#1C0000",
        "grid": "#3A0000",
        "edge": "#640000",
        "belt": "#1A0000",
        "belt.edge": "#8A0000",
        "belt.division": "#8A0000",
        "circle": "#D00000",
        "point": "#F00000",
        "star": "#FF0000",
        "deepsky": "#A80000",
        "body": "#F00000",
        "rim": "#B00000",
        "label": "#F40000",
        "figure": "#F40000",
        "title": "#F40000",
        "legend": "#F40000",
        "caution": "#FF0000",
        "selection": "#FF0000",
        "measure": "#FF0000",
        "window": "#0A0000",
        "panel": "#000000",
        "field": "#0A0000",
        "rule": "#4A0000",
        "muted": "#EE0000",
        "accent": "#F00000",
        "on.accent": "#000000",
        "fault": "#FF0000",
    },
    ("#FF0000",) * 7,
    mono=True,
)

PRINT = replace(
    PAPER, name="print", title="Print", roles={**PAPER.roles, "paper": "#FFFFFF", "sky": "#FFFFFF", "belt": "#F2E6C4"}
)
"""Paper for a printer, which has its own."""

THEMES = {theme.name: theme for theme in (PAPER, SLATE, LAMP)}
"""The themes by name; the first is the default."""

TEXT_ROLES = (
    "label",
    "label.star",
    "label.deepsky",
    "label.body",
    "label.constellation",
    "label.circle",
    "label.belt",
    "label.grid",
    "figure",
    "figure.circle",
    "figure.rim",
    "title",
    "legend",
    "caution",
)
"""Roles that are read: on the chart each must reach TEXT contrast on paper, sky and belt."""


def theme(name: str) -> Theme:
    """Return a theme by name; ValueError names the known ones."""
    try:
        return THEMES[name]
    except KeyError:
        raise ValueError(f"theme: {name!r} is unknown; expected one of {', '.join(THEMES)}") from None
