"""A made-up chart with every kind of mark, for tests and measurements of the painter alone."""

import numpy as np

from colure.marks import Areas, Bodies, Discs, Labels, Layer, Lines, Scene, Segments, Symbols

RADII = np.linspace(0.45, 6.0, 24).astype(np.float32)


class Flat:
    """A stand-in for a projection: the tests of the painter never ask where a pixel points."""

    def unproject(self, xy):
        return np.full((*np.shape(xy)[:-1], 3), np.nan)

    def project(self, vectors):
        return np.full((*np.shape(vectors)[:-1], 2), np.nan)


def starts(*lengths):
    return np.concatenate([[0], np.cumsum(lengths)]).astype(np.int32)


def chart(width=1920, height=1080, ratio=1.0, stars=46099, circles=8, labels=100, seed=1):
    """Return a Scene whose marks have the numbers of the full-frame benchmark."""
    rng = np.random.default_rng(seed)
    frame = (40.0, 40.0, width - 40.0, height - 40.0)
    left, top, right, bottom = frame
    span = np.array([right - left, bottom - top])
    corner = np.array([left, top])

    def somewhere(n):
        return (corner + rng.random((n, 2)) * span).astype(np.float32)

    x = np.linspace(left, right, 721)
    corners = np.array([[left, top], [right, top], [right, bottom], [left, bottom]])
    layers = [
        Layer(
            "sky",
            (Areas("sky", corners.astype(np.float32), starts(4)),),
            0,
        )
    ]
    middle = height / 2 + 60 * np.sin(x / 400)
    belt = np.concatenate([np.stack([x, middle - 80], -1), np.stack([x, middle + 80], -1)[::-1]]).astype(np.float32)
    divisions = np.array([[xx, yy + s * 80] for xx, yy in zip(x[::60], middle[::60], strict=True) for s in (-1, 1)])
    layers.append(
        Layer(
            "belt",
            (
                Areas("belt", belt, starts(len(belt)), alpha=0.5),
                Lines("belt.division", divisions.astype(np.float32), starts(*[2] * (len(divisions) // 2)), weight=2),
            ),
            0,
        )
    )
    grid = [
        np.stack([x[::6], top + (bottom - top) * (k + 0.5) / 12 + 20 * np.sin(x[::6] / 300)], -1) for k in range(12)
    ]
    layers.append(Layer("grid", (Lines("grid", np.concatenate(grid).astype(np.float32), starts(*map(len, grid))),), 0))
    edges = [somewhere(1) + np.cumsum(rng.normal(0, 7, (6, 2)), axis=0) for _ in range(740)]
    layers.append(
        Layer("edges", (Lines("edge", np.concatenate(edges).astype(np.float32), starts(*map(len, edges))),), 0)
    )
    size = np.sort(np.minimum(rng.exponential(2.2, stars), len(RADII) - 1)).astype(np.uint8)
    tint = rng.integers(0, 7, stars).astype(np.uint8)
    layers.append(
        Layer(
            "stars",
            (Discs("star", somewhere(stars), size, tint, RADII, np.arange(stars)),),
            0,
        )
    )
    palette = ("#0072B2", "#D55E00", "#CC79A7", "#009E73", "#E69F00", "#56B4E9", "#F0E442", "#000000")
    for k in range(circles):
        y = top + (bottom - top) * (k + 0.5) / circles + 70 * np.sin(x / 350 + k)
        slope = np.arctan2(np.gradient(y), np.gradient(x))
        across = np.stack([-np.sin(slope), np.cos(slope)], -1)
        ticks = np.concatenate([np.stack([x, y], -1), np.stack([x, y], -1) + 5 * across], -1)[::2]
        at = slice(0, None, 20)
        figures = tuple(f"{10 * i}°" for i in range(len(x[at])))
        layers.append(
            Layer(
                f"circle.{k}",
                (
                    Lines("circle", np.stack([x, y], -1).astype(np.float32), starts(721), 3, palette[k], dash=k == 7),
                    Segments("circle", ticks.astype(np.float32), 1, palette[k]),
                    Labels(
                        "figure.circle",
                        figures,
                        np.arange(len(figures), dtype=np.int32),
                        np.stack([x[at] - 14 * np.sin(slope[at]), y[at] + 14 * np.cos(slope[at])], -1).astype(
                            np.float32
                        ),
                        slope[at].astype(np.float32),
                        9.0,
                        palette[k],
                    ),
                ),
                k,
            )
        )
    layers.append(
        Layer(
            "deepsky",
            (
                Symbols(
                    "deepsky",
                    ("galaxy", "open_cluster", "globular", "nebula", "planetary"),
                    rng.integers(0, 5, 110).astype(np.uint8),
                    somewhere(110),
                    np.tile(np.array([[5.0, 3.5]], dtype=np.float32), (110, 1)),
                    rng.uniform(0, 3, 110).astype(np.float32),
                    np.arange(110),
                ),
            ),
            0,
        )
    )
    names = ("sun", "moon", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")
    layers.append(
        Layer(
            "bodies",
            (
                Bodies(
                    names,
                    somewhere(10),
                    np.array([9, 11, 4, 6, 5, 6, 5, 4, 4, 3], dtype=np.float32),
                    np.array([1, 0.3, 0.5, 0.8, 0.95, 1, 1, 1, 1, 1], dtype=np.float32),
                    rng.uniform(0, 6, 10).astype(np.float32),
                    np.zeros(10, dtype=bool),
                    np.arange(10),
                ),
            ),
            0,
        )
    )
    words = tuple(f"Star {i}" for i in range(labels - 10)) + tuple(n.title() for n in names)
    layers.append(
        Layer(
            "labels",
            (
                Labels("label.star", words[:-10], np.arange(labels - 10, dtype=np.int32), somewhere(labels - 10),
                       np.zeros(labels - 10, dtype=np.float32), 9.0, None, True),
                Labels("label.body", words[-10:], np.arange(10, dtype=np.int32), somewhere(10),
                       np.zeros(10, dtype=np.float32), 10.0, None, False, True),
            ),
            0,
        )
    )  # fmt: skip
    return Scene(width, height, ratio, frame, tuple(layers), Flat())
