"""Figures of overlays: a list of 100,000 rows panned across the chart, and matched to the catalogue."""

import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np

from colure import frames, tables
from colure.arrays import ARCSEC, DEG, spherical, unit
from colure.overlays import Overlay, matching, opening
from colure.overlays.store import STORE
from colure.stars import catalogue
from colure.tables import Column, Table
from colure_viewer.bench.frames import HD, Film
from colure_viewer.bench.measure import Accuracy, Figure, Target, in_turn

ROWS = 100_000
FRAME = "equator/fk4/B1950"


def _overlay(folder: Path) -> Overlay:
    """Return a list of catalogue stars in FK4, each 0.3″ off and a few of them no stars, declared as J2000."""
    random = np.random.default_rng(1950)
    rows = catalogue().rows(np.sort(random.choice(len(catalogue()), ROWS, replace=False)))
    there = frames.from_icrs(rows.directions(2000.0), FRAME, None, None, 2000.0)
    there = unit(there + random.normal(size=there.shape) * 0.3 * ARCSEC)
    wrong = ROWS * 3 // 100
    there[:wrong] = unit(random.normal(size=(wrong, 3)))
    lon, lat = spherical(there)
    path = folder / "list.fits"
    tables.write(Table((Column("ra", lon / DEG, "deg"), Column("dec", lat / DEG, "deg"))), path)
    return opening.open_file(path, frame="icrs", epoch=2000.0)


def overlay_pan_100k() -> Figure:
    """Frames a second while the whole sky with stars to V 8 and a list of 100,000 rows with arrows is panned."""
    with tempfile.TemporaryDirectory() as folder:
        overlay = replace(_overlay(Path(folder)), arrows=True)
        matching.match(overlay)
        film = Film(8.0, HD)
        film.session = replace(film.session, overlays=(overlay,))
        for _ in range(8):
            film.next_view()
        layer = film.chart.scene.layer("overlays")
        times = in_turn({"colure": film.next_view}, runs=60)
        parts = {"frame_ms": times["colure"], "marks": float(layer.shown), "rows": float(layer.total)}
        STORE.clear()
    return Figure(1e3 / times["colure"], "frames/s", (Target("min", 30.0),), parts=parts)


def overlay_match_100k() -> Figure:
    """A list of 100,000 rows in another equinox than declared, matched, fitted and read."""
    with tempfile.TemporaryDirectory() as folder:
        overlay = _overlay(Path(folder))
        found = matching.match(overlay)
        times = in_turn({"colure": lambda: matching.match(overlay, keep=False)}, runs=5)
        STORE.clear()
    best = found.readings[0]
    # Two coordinates of 0.3″ each: what is left when the right frame has been found.
    error = Accuracy(abs(best.rms_arcsec - 0.3 * 2.0**0.5), "arcsec", 0.02, f"the scatter put into {FRAME}")
    parts = {"matched": float(len(found)), "right_frame": float(best.frame == FRAME)}
    return Figure(times["colure"], "ms", (Target("max", 2000.0),), error, parts)
