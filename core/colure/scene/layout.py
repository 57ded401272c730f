"""Where everything stands on the page: the map rectangle, its rim, and the rows of text around it."""

from dataclasses import dataclass

RIM = 7.0
"""Pixels between the inner and the outer line of the rim."""
ROW = 16.0
"""Pixels from one row of the title block to the next."""
FIGURES = 16.0
"""Pixels for the figures of the rim."""


@dataclass(frozen=True, slots=True)
class Layout:
    """Rectangles and rows of a page of `width` × `height` logical pixels.

    `frame` is the map (left, top, right, bottom); `above` and `below` the centres of the rows of text, from the page's
    edge inwards; `figures` whether there is room for figures along the rim.
    """

    width: int
    height: int
    frame: tuple[float, float, float, float]
    above: tuple[float, ...]
    below: tuple[float, ...]
    figures: bool


def layout(width: int, height: int) -> Layout:
    """Return the layout of a page: two rows of text above and below, one on small pages, none on tiny ones."""
    rows = 2 if min(width, height) >= 460 else 1 if min(width, height) >= 240 else 0
    figures = rows > 0
    edge = (FIGURES if figures else 0.0) + RIM + 3.0
    sides = edge + (14.0 if figures else 0.0)
    top = edge + (rows * ROW + 4.0 if rows else 0.0)
    frame = (round(sides), round(top), round(width - sides), round(height - top))
    above = tuple(ROW * (0.5 + i) + 2.0 for i in range(rows))
    below = tuple(height - y for y in above)
    return Layout(
        width, height, (float(frame[0]), float(frame[1]), float(frame[2]), float(frame[3])), above, below, figures
    )
