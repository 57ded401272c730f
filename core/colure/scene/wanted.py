"""What a text on the map asks for: its positions, its box and how it is set, and the marks made of those with room."""

from dataclasses import dataclass, field
from itertools import groupby
from typing import Any

import numpy as np

from colure.fontmetrics import CAP_HEIGHT, PX_PER_PT
from colure.labels import Request
from colure.marks import F32, I32, Labels


@dataclass(slots=True)
class Wanted:
    """Texts of one role that ask for a place; the columns of a Request, and what to draw them with."""

    role: str
    request: Request
    texts: tuple[str, ...]
    index: I32
    angles: F32
    size_pt: float = 9.0
    italic: bool = False
    bold: bool = False
    colours: tuple[str | None, ...] = field(default=())

    def marks(self, shown: Any, at: Any, xy: F32) -> list[Labels]:
        """Return the label marks of the texts `shown` (M,) at their positions `at`, `xy`; one mark for each colour."""
        if not len(shown):
            return []
        angle = self.angles[shown, at] if self.angles.ndim == 2 else self.angles[shown]
        index = self.index[shown]
        style = (self.size_pt, None, self.italic, self.bold)
        if not self.colours:
            return [Labels(self.role, self.texts, index, xy, angle, *style)]
        # Rows of one colour follow each other, so each colour is a slice.
        out, first = [], 0
        for colour, run in groupby([self.colours[i] for i in shown.tolist()]):
            own = slice(first, first := first + len(list(run)))
            style = (self.size_pt, colour, self.italic, self.bold)
            out.append(Labels(self.role, self.texts, index[own], xy[own], angle[own], *style))
        return out


def height(size_pt: float) -> float:
    """Return the height in pixels of the box of a text: capitals and a little above and below."""
    return size_pt * PX_PER_PT * (CAP_HEIGHT + 0.28)


def turned_half(width: Any, tall: float, tangent: F32) -> Any:
    """Return the half-extents (N, 2) of the upright boxes that hold boxes turned along unit tangents (N, 2)."""
    size = np.abs(tangent)
    out = size * (0.5 * width)[:, None]
    size *= 0.5 * tall
    out += size[:, ::-1]
    return out.astype(np.float32, copy=False)


def upright(tangent: F32) -> F32:
    """Return angles (N,) of tangents (N, 2), turned so that text is read from the left; almost level ones are level."""
    angle = np.arctan2(tangent[:, 1], tangent[:, 0])
    angle[angle > np.pi / 2] -= np.pi
    angle[angle <= -np.pi / 2] += np.pi
    # Level text is drawn sharper, and nobody sees half a degree.
    angle[np.abs(angle) < 0.009] = 0.0
    return angle.astype(np.float32, copy=False)
